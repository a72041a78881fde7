package export

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"math"
	"math/bits"

	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/encoding/thrift"
	"github.com/parquet-go/parquet-go/format"

	"ledgework/terrain"
)

// checkRowGroups makes sure that the numbers of rows agree before memory is
// taken for them.
func checkRowGroups(f *parquet.File) error {
	if n := f.NumRows(); n < 0 || n > math.MaxInt32 {
		return voxelError("footer", fmt.Sprintf("%d voxels", n), nil)
	}
	var rows int64
	for i, rg := range f.RowGroups() {
		for _, c := range f.Metadata().RowGroups[i].Columns {
			if c.MetaData.Codec != format.Zstd {
				return voxelError(fmt.Sprintf("row group %d", i), fmt.Sprintf("compression %v, not zstd", c.MetaData.Codec), nil)
			}
		}
		n := rg.NumRows()
		if n < 1 || n > rowGroupRows {
			return voxelError(fmt.Sprintf("row group %d", i), fmt.Sprintf("%d rows, not 1 to %d", n, rowGroupRows), nil)
		}
		rows += n
		for _, chunk := range rg.ColumnChunks() {
			if repeated := chunk.NumValues() > n && chunk.NumValues() <= n*(maxClass+1); chunk.NumValues() != n && !repeated {
				return voxelError(fmt.Sprintf("row group %d", i), fmt.Sprintf("%d values for %d rows", chunk.NumValues(), n), nil)
			}
		}
	}
	if rows != f.NumRows() {
		return voxelError("footer", fmt.Sprintf("%d rows in row groups, %d in all", rows, f.NumRows()), nil)
	}
	return nil
}

// maxPageBytes bounds a page: WriteVoxels begins a new one at 256 kB.
const maxPageBytes = 4 << 20

// checkPages reads the header of every page and makes sure that it is one that
// WriteVoxels writes, before memory is taken by what the header says.
func checkPages(f *parquet.File, r io.ReaderAt, size int64) error {
	buffered := bufio.NewReaderSize(nil, 1<<12)
	for _, rg := range f.Metadata().RowGroups {
		for _, column := range rg.Columns {
			meta := &column.MetaData
			place := "column " + joinPath(meta.PathInSchema)
			from, n := meta.DataPageOffset, meta.TotalCompressedSize
			if from < 0 || n < 0 || from > size || n > size-from || meta.DictionaryPageOffset != 0 {
				return voxelError(place, fmt.Sprintf("%d bytes at %d in a file of %d", n, from, size), nil)
			}
			section := io.NewSectionReader(r, from, n)
			buffered.Reset(section)
			decoder := thrift.NewDecoder(new(thrift.CompactProtocol).NewReader(buffered))
			for {
				if _, err := buffered.Peek(1); errors.Is(err, io.EOF) {
					break
				}
				var page format.PageHeader
				if err := decoder.Decode(&page); err != nil {
					return voxelError(place, "damaged page header", err)
				}
				if page.Type == format.DictionaryPage || page.UncompressedPageSize < 0 || page.UncompressedPageSize > maxPageBytes ||
					page.CompressedPageSize < 0 || page.CompressedPageSize > maxPageBytes {
					return voxelError(place, fmt.Sprintf("%v of %d bytes, %d compressed", page.Type, page.UncompressedPageSize, page.CompressedPageSize), nil)
				}
				if _, err := buffered.Discard(int(page.CompressedPageSize)); err != nil {
					return voxelError(place, "page is cut off", err)
				}
			}
		}
	}
	return nil
}

// checkVoxels checks what arithmetic on voxels relies on.
func checkVoxels(v *terrain.Voxels) error {
	half, limit := v.Lattice.Quanta()/2, v.Lattice.MaxPoints()
	attributes := attributes()
	for i := range v.Cells {
		m := &v.Moments[i]
		if i > 0 && v.Cells[i-1].Compare(v.Cells[i]) >= 0 {
			return voxelError(fmt.Sprintf("row %d", i), "voxels are out of order or repeated", nil)
		}
		if m.N < 1 || m.N > limit {
			return voxelError(fmt.Sprintf("row %d", i), fmt.Sprintf("%d points, not 1 to %d", m.N, limit), nil)
		}
		if !plausible(m.N, half, m.X, m.XX) || !plausible(m.N, half, m.Y, m.YY) || !plausible(m.N, half, m.Z, m.ZZ) ||
			!within(m.XY, m.XX, m.YY) || !within(m.XZ, m.XX, m.ZZ) || !within(m.YZ, m.YY, m.ZZ) {
			return voxelError(fmt.Sprintf("row %d", i), "no points within the voxel have these sums", nil)
		}
		for _, a := range attributes {
			if c := *a.column(v); c != nil && c[i] > uint64(m.N)*maxAttribute {
				return voxelError(fmt.Sprintf("row %d", i), fmt.Sprintf("%s %d is too large for %d points", a.name, c[i], m.N), nil)
			}
		}
	}
	return checkClasses(v)
}

// checkClasses checks that class counts are in order and fit their voxels.
func checkClasses(v *terrain.Voxels) error {
	var sum int64
	for i, c := range v.Classes {
		if i > 0 && v.Classes[i-1].Voxel == c.Voxel {
			if v.Classes[i-1].Class >= c.Class {
				return voxelError(fmt.Sprintf("row %d", c.Voxel), "classes are out of order or repeated", nil)
			}
		} else {
			sum = 0
		}
		if n := v.Moments[c.Voxel].N; c.N < 1 || c.N > n-sum {
			return voxelError(fmt.Sprintf("row %d", c.Voxel), fmt.Sprintf("more points in classes than its %d", n), nil)
		}
		sum += c.N
	}
	return nil
}

// plausible reports whether n offsets of at most half can have the sum s and
// the sum of squares ss. With n at most Lattice.MaxPoints nothing overflows.
func plausible(n, half, s, ss int64) bool {
	return s >= -n*half && s <= n*half && ss >= 0 && ss <= n*half*half && within(s, n, ss)
}

// within reports whether x² ≤ a·b, for a and b that are not negative: the
// inequality of Cauchy and Schwarz, which sums of products obey exactly.
func within(x, a, b int64) bool {
	u := uint64(max(x, -x))
	if x == math.MinInt64 {
		return false
	}
	h1, l1 := bits.Mul64(u, u)
	h2, l2 := bits.Mul64(uint64(a), uint64(b))
	return h1 < h2 || h1 == h2 && l1 <= l2
}
