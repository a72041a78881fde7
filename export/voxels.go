package export

import (
	"bufio"
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"hash"
	"io"
	"strconv"
	"strings"

	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/compress/zstd"

	"ledgework/terrain"
)

// VoxelsName is the name of the voxel file in a run folder.
const VoxelsName = "voxels.parquet"

// voxelFormat is the version of the file's columns and keys.
const voxelFormat = "1"

// Keys of the file's metadata.
const (
	keyFormat  = "ledgework.format"
	keyEdge    = "ledgework.edge_quanta"      // edge of a voxel in quanta
	keyQuanta  = "ledgework.quanta_per_metre" // resolution of all sums
	keyMeta    = "ledgework.meta"             // VoxelMeta as JSON
	keyCaution = "ledgework.caution"
	keySum     = "ledgework.sha256" // of the whole file with this sum's digits set to 0
)

// rowGroupRows bounds the memory of writing and reading: a row group of all
// columns takes about 25 MB.
const rowGroupRows = 1 << 18

// VoxelMeta says where voxels come from, as far as a later run needs it.
type VoxelMeta struct {
	Site        string           `json:"site"`
	CRS         CRS              `json:"crs"`
	Conversions string           `json:"conversions,omitempty"` // see Site
	Dates       []string         `json:"dates,omitempty"`
	Sensors     [][3]float64     `json:"sensors,omitempty"`    // scanner positions in the working CRS, m
	AccuracyM   float64          `json:"accuracy_m,omitempty"` // 1 sigma of a point, 0 if unknown
	Sources     []Input          `json:"sources"`
	Counts      map[string]int64 `json:"counts,omitempty"` // of points read and dropped, by reason
}

// A voxelColumn is a column of integers with its place in terrain.Voxels.
type voxelColumn struct {
	name string
	bits int // 32 or 64
	get  func(v *terrain.Voxels, i int) int64
	set  func(v *terrain.Voxels, i int, value int64)
}

// voxelColumns are the columns that every file has.
func voxelColumns() []voxelColumn {
	cell := func(name string, at func(*terrain.Cell) *int32) voxelColumn {
		return voxelColumn{
			name: name, bits: 32,
			get: func(v *terrain.Voxels, i int) int64 { return int64(*at(&v.Cells[i])) },
			set: func(v *terrain.Voxels, i int, value int64) { *at(&v.Cells[i]) = int32(value) },
		}
	}
	sum := func(name string, at func(*terrain.Moments) *int64) voxelColumn {
		return voxelColumn{
			name: name, bits: 64,
			get: func(v *terrain.Voxels, i int) int64 { return *at(&v.Moments[i]) },
			set: func(v *terrain.Voxels, i int, value int64) { *at(&v.Moments[i]) = value },
		}
	}
	return []voxelColumn{
		cell("i", func(c *terrain.Cell) *int32 { return &c.I }),
		cell("j", func(c *terrain.Cell) *int32 { return &c.J }),
		cell("k", func(c *terrain.Cell) *int32 { return &c.K }),
		sum("n", func(m *terrain.Moments) *int64 { return &m.N }),
		sum("sum_x", func(m *terrain.Moments) *int64 { return &m.X }),
		sum("sum_y", func(m *terrain.Moments) *int64 { return &m.Y }),
		sum("sum_z", func(m *terrain.Moments) *int64 { return &m.Z }),
		sum("sum_xx", func(m *terrain.Moments) *int64 { return &m.XX }),
		sum("sum_xy", func(m *terrain.Moments) *int64 { return &m.XY }),
		sum("sum_xz", func(m *terrain.Moments) *int64 { return &m.XZ }),
		sum("sum_yy", func(m *terrain.Moments) *int64 { return &m.YY }),
		sum("sum_yz", func(m *terrain.Moments) *int64 { return &m.YZ }),
		sum("sum_zz", func(m *terrain.Moments) *int64 { return &m.ZZ }),
	}
}

// attribute is an attribute column of a file, or of voxels that have it.
type attribute struct {
	name   string
	column func(v *terrain.Voxels) *[]uint64
}

func attributes() []attribute {
	return []attribute{
		{"sum_intensity", func(v *terrain.Voxels) *[]uint64 { return &v.Intensity }},
		{"sum_red", func(v *terrain.Voxels) *[]uint64 { return &v.Red }},
		{"sum_green", func(v *terrain.Voxels) *[]uint64 { return &v.Green }},
		{"sum_blue", func(v *terrain.Voxels) *[]uint64 { return &v.Blue }},
	}
}

func (a attribute) voxelColumn() voxelColumn {
	return voxelColumn{
		name: a.name, bits: 64,
		get: func(v *terrain.Voxels, i int) int64 { return int64((*a.column(v))[i]) },
		set: func(v *terrain.Voxels, i int, value int64) { (*a.column(v))[i] = uint64(value) },
	}
}

// The repeated group of class counts, and its two leaves.
const (
	classesName  = "classes"
	className    = "class"
	classN       = "n"
	classesPath  = classesName + "." + className
	classesNPath = classesName + "." + classN
	maxClass     = 255
	maxAttribute = 65535 // of one point: attributes have 16 bits
)

// WriteVoxels writes voxels as an Apache Parquet file, compressed by zstd: a
// row for each voxel, in their order, with the cell's index and the exact sums
// of terrain.Moments. Attribute columns are there when v has them. The same
// voxels and meta give the same bytes.
func WriteVoxels(w io.Writer, v *terrain.Voxels, meta VoxelMeta) error {
	if err := writeVoxels(w, v, meta); err != nil {
		return fmt.Errorf("export: %s: %w", VoxelsName, err)
	}
	return nil
}

func writeVoxels(w io.Writer, v *terrain.Voxels, meta VoxelMeta) error {
	columns := voxelColumns()
	for _, a := range attributes() {
		if *a.column(v) != nil {
			columns = append(columns, a.voxelColumn())
		}
	}
	group := parquet.Group{}
	for _, c := range columns {
		group[c.name] = parquet.Encoded(parquet.Int(c.bits), &parquet.DeltaBinaryPacked)
	}
	if v.Classes != nil {
		group[classesName] = parquet.Repeated(parquet.Group{className: parquet.Int(32), classN: parquet.Int(64)})
	}
	metaJSON, err := json.Marshal(meta)
	if err != nil {
		return err
	}
	buffered := bufio.NewWriterSize(w, 1<<18)
	sealed := &sealingWriter{w: buffered, sum: sha256.New()}
	schema := parquet.NewSchema("voxels", group)
	pw := parquet.NewGenericWriter[any](sealed, schema,
		parquet.Compression(&zstd.Codec{}),
		parquet.CreatedBy(Program, voxelFormat, ""),
		parquet.DataPageStatistics(false))
	scratch := make([]parquet.Value, 0, 4096)
	classes := v.Classes
	for from := 0; from < v.Len(); from += rowGroupRows {
		to := min(from+rowGroupRows, v.Len())
		rg := pw.BeginRowGroup()
		leaves := make(map[string]*parquet.ColumnWriter)
		for i, path := range schema.Columns() {
			leaves[joinPath(path)] = rg.ColumnWriters()[i]
		}
		for _, c := range columns {
			if err := writeColumn(leaves[c.name], v, c, from, to, scratch); err != nil {
				return err
			}
		}
		if v.Classes != nil {
			if classes, err = writeClasses(leaves, classes, from, to, scratch); err != nil {
				return err
			}
		}
		if _, err := rg.Commit(); err != nil {
			return err
		}
	}
	for _, kv := range [...][2]string{
		{keyFormat, voxelFormat},
		{keyEdge, strconv.FormatInt(v.Lattice.Quanta(), 10)},
		{keyQuanta, strconv.Itoa(terrain.QuantaPerMetre)},
		{keyMeta, string(metaJSON)},
		{keyCaution, Caution},
		{keySum, unsealed()},
	} {
		pw.SetKeyValueMetadata(kv[0], kv[1])
	}
	// What follows is small: the indexes of the pages and the footer.
	sealed.hold = true
	if err := pw.Close(); err != nil {
		return err
	}
	if err := sealed.seal(); err != nil {
		return err
	}
	return buffered.Flush()
}

// writeColumn writes rows from to to of one column.
func writeColumn(w *parquet.ColumnWriter, v *terrain.Voxels, c voxelColumn, from, to int, scratch []parquet.Value) error {
	for at := from; at < to; {
		values := scratch[:0]
		for ; at < to && len(values) < cap(values); at++ {
			if c.bits == 32 {
				values = append(values, parquet.Int32Value(int32(c.get(v, at))))
			} else {
				values = append(values, parquet.Int64Value(c.get(v, at)))
			}
		}
		if _, err := w.WriteRowValues(values); err != nil {
			return fmt.Errorf("column %s: %w", c.name, err)
		}
	}
	return nil
}

// writeClasses writes the class counts of voxels from to to, which counts
// begins with, and returns those of later voxels.
func writeClasses(leaves map[string]*parquet.ColumnWriter, counts []terrain.ClassCount, from, to int, scratch []parquet.Value) ([]terrain.ClassCount, error) {
	class, n := scratch[:0], make([]parquet.Value, 0, cap(scratch))
	flush := func() error {
		if _, err := leaves[classesPath].WriteRowValues(class); err != nil {
			return fmt.Errorf("column %s: %w", classesPath, err)
		}
		if _, err := leaves[classesNPath].WriteRowValues(n); err != nil {
			return fmt.Errorf("column %s: %w", classesNPath, err)
		}
		class, n = class[:0], n[:0]
		return nil
	}
	for row := from; row < to; row++ {
		// A row is never split between two calls: 256 classes fit always.
		if len(class)+maxClass+1 > cap(class) && len(class) > 0 {
			if err := flush(); err != nil {
				return nil, err
			}
		}
		if len(counts) == 0 || int(counts[0].Voxel) > row {
			class = append(class, parquet.NullValue().Level(0, 0, 0))
			n = append(n, parquet.NullValue().Level(0, 0, 0))
		}
		for repetition := 0; len(counts) > 0 && int(counts[0].Voxel) == row; repetition = 1 {
			class = append(class, parquet.Int32Value(int32(counts[0].Class)).Level(repetition, 1, 0))
			n = append(n, parquet.Int64Value(counts[0].N).Level(repetition, 1, 0))
			counts = counts[1:]
		}
	}
	return counts, flush()
}

// joinPath names a leaf column.
func joinPath(path []string) string {
	s := path[0]
	for _, p := range path[1:] {
		s += "." + p
	}
	return s
}

// A sealingWriter sums what goes through it. What comes while hold is set is
// kept until seal.
type sealingWriter struct {
	w    io.Writer
	sum  hash.Hash
	hold bool
	held []byte
}

func (s *sealingWriter) Write(p []byte) (int, error) {
	if s.hold {
		s.held = append(s.held, p...)
		return len(p), nil
	}
	n, err := s.w.Write(p)
	s.sum.Write(p[:n])
	return n, err
}

// seal puts the sum over all bytes, its own digits set to 0, into its place and
// writes what was held.
func (s *sealingWriter) seal() error {
	at := sealAt(s.held)
	if at < 0 {
		panic("export: the Parquet footer has no place for the checksum")
	}
	s.sum.Write(s.held)
	hex.Encode(s.held[at:], s.sum.Sum(nil))
	_, err := s.w.Write(s.held)
	return err
}

// unsealed holds the place of the sum's digits.
func unsealed() string { return strings.Repeat("0", 2*sha256.Size) }

// sealAt finds the digits of the sum in the raw bytes of a footer, or returns
// -1. There the key is followed by a field header and the length of the value,
// a byte each (Apache Thrift compact protocol).
func sealAt(footer []byte) int {
	at := bytes.LastIndex(footer, []byte(keySum))
	if at < 0 {
		return -1
	}
	at += len(keySum) + 2
	if at+2*sha256.Size > len(footer) || footer[at-1] != 2*sha256.Size {
		return -1
	}
	return at
}
