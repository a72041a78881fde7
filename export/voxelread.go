package export

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"slices"
	"strconv"

	"github.com/parquet-go/parquet-go"

	"ledgework/terrain"
)

// ReadVoxels reads what WriteVoxels wrote, exactly. Everything that later
// arithmetic relies on is checked: a checksum over all bytes, before any is
// decoded; order; limits of every sum. Damage, and Parquet files of other origin, are a
// terrain.FormatError; files of a later version a terrain.UnsupportedError.
func ReadVoxels(r io.ReaderAt, size int64) (v *terrain.Voxels, meta VoxelMeta, err error) {
	// The Parquet package panics on some kinds of damaged footer.
	defer func() {
		if p := recover(); p != nil {
			v, meta, err = nil, VoxelMeta{}, voxelError("footer", fmt.Sprintf("damaged: %v", p), nil)
		}
	}()
	if err := checkSeal(r, size); err != nil {
		return nil, meta, err
	}
	f, err := parquet.OpenFile(r, size, parquet.SkipPageIndex(true), parquet.SkipBloomFilters(true), parquet.ReadBufferSize(1<<18))
	if err != nil {
		return nil, meta, voxelError("footer", "not a readable Parquet file", err)
	}
	lattice, meta, err := readVoxelKeys(f)
	if err != nil {
		return nil, meta, err
	}
	v = &terrain.Voxels{Lattice: lattice}
	columns, hasClasses, err := matchSchema(f, v)
	if err != nil {
		return nil, meta, err
	}
	if err := checkRowGroups(f); err != nil {
		return nil, meta, err
	}
	if err := checkPages(f, r, size); err != nil {
		return nil, meta, err
	}
	n := int(f.NumRows())
	v.Cells, v.Moments = make([]terrain.Cell, n), make([]terrain.Moments, n)
	for _, a := range attributes() {
		if c := a.column(v); *c != nil {
			*c = make([]uint64, n)
		}
	}
	if hasClasses {
		v.Classes = []terrain.ClassCount{}
	}
	from := 0
	for _, rg := range f.RowGroups() {
		to := from + int(rg.NumRows())
		for i, chunk := range rg.ColumnChunks() {
			if columns[i] == nil {
				continue
			}
			if err := readColumn(chunk, v, columns[i], from, to); err != nil {
				return nil, meta, err
			}
		}
		if hasClasses {
			if err := readClasses(f, rg, v, from, to); err != nil {
				return nil, meta, err
			}
		}
		from = to
	}
	if err := checkVoxels(v); err != nil {
		return nil, meta, err
	}
	return v, meta, nil
}

// checkSeal compares the checksum over the whole file, so that damage is found
// before any of it is decoded.
func checkSeal(r io.ReaderAt, size int64) error {
	const tail = 8 // length of the footer, then the magic "PAR1"
	if size < tail+4 {
		return voxelError("", fmt.Sprintf("%d bytes are too few for a Parquet file", size), nil)
	}
	var b [tail]byte
	if _, err := r.ReadAt(b[:], size-tail); err != nil {
		return fmt.Errorf("export: %s: %w", VoxelsName, err)
	}
	n := int64(binary.LittleEndian.Uint32(b[:]))
	if string(b[4:]) != "PAR1" || n > min(size-tail-4, maxFooterBytes) {
		return voxelError(fmt.Sprintf("byte %d", size-tail), "no Parquet footer: the file is cut off or of another kind", nil)
	}
	footer := make([]byte, n+tail)
	if _, err := r.ReadAt(footer, size-n-tail); err != nil {
		return fmt.Errorf("export: %s: %w", VoxelsName, err)
	}
	at := sealAt(footer)
	if at < 0 {
		return voxelError("footer", "key "+keySum+" is missing: this Parquet file holds no voxels", nil)
	}
	want := string(footer[at : at+2*sha256.Size])
	copy(footer[at:], unsealed())
	sum := sha256.New()
	if _, err := io.CopyBuffer(sum, io.NewSectionReader(r, 0, size-n-tail), make([]byte, 1<<16)); err != nil {
		return fmt.Errorf("export: %s: %w", VoxelsName, err)
	}
	sum.Write(footer)
	if hex.EncodeToString(sum.Sum(nil)) != want {
		return voxelError(fmt.Sprintf("bytes 0 to %d", size), "the checksum does not match: the file was damaged or changed", nil)
	}
	return nil
}

// maxFooterBytes is the largest footer: 1 kB for each column of the 8 192 row
// groups that 2^31 voxels need, and the meta.
const maxFooterBytes = 256 << 20

// voxelError is a terrain.FormatError of the voxel file.
func voxelError(place, reason string, err error) error {
	return &terrain.FormatError{
		Format: VoxelsName, Place: place, Reason: reason, Err: err,
		Remedy: "build again from the survey files",
	}
}

// readVoxelKeys reads what the file says of itself.
func readVoxelKeys(f *parquet.File) (l terrain.Lattice, meta VoxelMeta, err error) {
	version, _ := f.Lookup(keyFormat)
	if version != voxelFormat {
		return l, meta, &terrain.UnsupportedError{Format: VoxelsName, Feature: "format " + strconv.Quote(version), Remedy: "use the version of ledgework that wrote it, or a later one"}
	}
	number := func(key string) (n int64) {
		text, ok := f.Lookup(key)
		n, parseErr := strconv.ParseInt(text, 10, 64)
		if err == nil && (!ok || parseErr != nil) {
			err = voxelError("footer", fmt.Sprintf("key %s is %q, not a whole number", key, text), nil)
		}
		return n
	}
	edge, quanta := number(keyEdge), number(keyQuanta)
	if err != nil {
		return l, meta, err
	}
	if quanta != terrain.QuantaPerMetre {
		return l, meta, &terrain.UnsupportedError{Format: VoxelsName, Feature: fmt.Sprintf("a resolution of %d per metre", quanta)}
	}
	l, err = terrain.NewLattice(float64(edge) / terrain.QuantaPerMetre)
	if err != nil || l.Quanta() != edge {
		return l, meta, voxelError("footer", fmt.Sprintf("voxels cannot have an edge of %d quanta", edge), err)
	}
	text, _ := f.Lookup(keyMeta)
	if err := json.Unmarshal([]byte(text), &meta); err != nil {
		return l, meta, voxelError("footer", "key "+keyMeta+" is damaged", err)
	}
	return l, meta, nil
}

// matchSchema finds the place of each leaf column, nil for the leaves of the
// classes, and marks the attributes that the file has in v.
func matchSchema(f *parquet.File, v *terrain.Voxels) (columns []*voxelColumn, hasClasses bool, err error) {
	known := make(map[string]voxelColumn)
	missing := make(map[string]bool)
	for _, c := range voxelColumns() {
		known[c.name], missing[c.name] = c, true
	}
	for _, a := range attributes() {
		known[a.name] = a.voxelColumn()
	}
	classLeaves := 0
	for _, path := range f.Schema().Columns() {
		name := joinPath(path)
		leaf, _ := f.Schema().Lookup(path...)
		kind, repeated := leaf.Node.Type().Kind(), leaf.MaxRepetitionLevel
		if name == classesPath && kind == parquet.Int32 && repeated == 1 || name == classesNPath && kind == parquet.Int64 && repeated == 1 {
			classLeaves++
			columns = append(columns, nil)
			continue
		}
		c, ok := known[name]
		want := parquet.Int64
		if c.bits == 32 {
			want = parquet.Int32
		}
		if !ok || kind != want || leaf.MaxRepetitionLevel != 0 || leaf.MaxDefinitionLevel != 0 {
			return nil, false, voxelError("schema", fmt.Sprintf("column %s is not one of a voxel file", name), nil)
		}
		for _, a := range attributes() {
			if a.name == name {
				*a.column(v) = []uint64{}
			}
		}
		delete(missing, name)
		columns = append(columns, &c)
	}
	if len(missing) > 0 {
		names := make([]string, 0, len(missing))
		for name := range missing {
			names = append(names, name)
		}
		return nil, false, voxelError("schema", "column "+slices.Min(names)+" is missing", nil)
	}
	if classLeaves == 1 {
		return nil, false, voxelError("schema", "one of the columns of "+classesName+" is missing", nil)
	}
	return columns, classLeaves == 2, nil
}

// readColumn reads rows from to to of one column.
func readColumn(chunk parquet.ColumnChunk, v *terrain.Voxels, c *voxelColumn, from, to int) error {
	place := "column " + c.name
	pages := chunk.Pages()
	defer pages.Close()
	for {
		page, err := pages.ReadPage()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return voxelError(place, "damaged page", err)
		}
		if page.Dictionary() != nil || page.NumValues() > int64(to-from) {
			return voxelError(place, fmt.Sprintf("page of %d values where %d are left", page.NumValues(), to-from), nil)
		}
		if data := page.Data(); c.bits == 32 {
			for _, x := range data.Int32() {
				c.set(v, from, int64(x))
				from++
			}
		} else {
			for _, x := range data.Int64() {
				c.set(v, from, x)
				from++
			}
		}
		parquet.Release(page)
	}
	if from != to {
		return voxelError(place, fmt.Sprintf("%d values are missing", to-from), nil)
	}
	return nil
}

// readClasses appends the class counts of rows from to to.
func readClasses(f *parquet.File, rg parquet.RowGroup, v *terrain.Voxels, from, to int) error {
	leaf := func(name string) parquet.Pages {
		column, _ := f.Schema().Lookup(classesName, name)
		return rg.ColumnChunks()[column.ColumnIndex].Pages()
	}
	first := len(v.Classes)
	row := from - 1
	err := eachValue(leaf(className), func(x parquet.Value) error {
		if x.RepetitionLevel() == 0 {
			row++
		}
		if row < from || row >= to {
			return voxelError("column "+classesPath, fmt.Sprintf("row %d is not one of %d to %d", row, from, to-1), nil)
		}
		if x.IsNull() {
			return nil
		}
		if x.Int32() < 0 || x.Int32() > maxClass {
			return voxelError("column "+classesPath, fmt.Sprintf("row %d: class %d is not one of 0 to %d", row, x.Int32(), maxClass), nil)
		}
		v.Classes = append(v.Classes, terrain.ClassCount{Voxel: int32(row), Class: uint8(x.Int32())})
		return nil
	})
	if err != nil {
		return err
	}
	at := first
	err = eachValue(leaf(classN), func(x parquet.Value) error {
		if x.IsNull() {
			return nil
		}
		if at == len(v.Classes) {
			return voxelError("column "+classesNPath, "more values than in "+classesPath, nil)
		}
		v.Classes[at].N = x.Int64()
		at++
		return nil
	})
	if err != nil {
		return err
	}
	if at != len(v.Classes) || row != to-1 {
		return voxelError("column "+classesNPath, "fewer values than rows", nil)
	}
	return nil
}

// eachValue calls use for the values of a column and closes its pages.
func eachValue(pages parquet.Pages, use func(parquet.Value) error) error {
	defer pages.Close()
	values := make([]parquet.Value, 4096)
	for {
		page, err := pages.ReadPage()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return voxelError("column "+classesName, "damaged page", err)
		}
		r := page.Values()
		for {
			n, err := r.ReadValues(values)
			for _, x := range values[:n] {
				if err := use(x); err != nil {
					return err
				}
			}
			if errors.Is(err, io.EOF) {
				break
			}
			if err != nil {
				return voxelError("column "+classesName, "damaged page", err)
			}
		}
		parquet.Release(page)
	}
}
