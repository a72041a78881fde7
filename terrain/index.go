package terrain

import (
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/spatial/r3"
)

// An Index finds voxels by cell and by distance. It is read-only after
// NewIndex and safe for concurrent use.
type Index struct {
	voxels *Voxels
	means  []r3.Vec
	rows   []indexRow
	table  []int32 // open addressing on (J, K): row number + 1
}

// An indexRow is a run of voxels with the same J and K, sorted by I.
type indexRow struct {
	j, k       int32
	start, end int32
}

// NewIndex builds the index of v, which must not change afterwards.
func NewIndex(v *Voxels) *Index {
	x := &Index{voxels: v, means: make([]r3.Vec, v.Len())}
	for i := range v.Cells {
		x.means[i] = v.Mean(i)
		c := v.Cells[i]
		if n := len(x.rows); n > 0 && x.rows[n-1].j == c.J && x.rows[n-1].k == c.K {
			x.rows[n-1].end++
			continue
		}
		x.rows = append(x.rows, indexRow{c.J, c.K, int32(i), int32(i) + 1})
	}
	size := 16
	for size < 2*len(x.rows) {
		size *= 2
	}
	x.table = make([]int32, size)
	for n := range x.rows {
		at := x.slot(x.rows[n].j, x.rows[n].k)
		for x.table[at] != 0 {
			at = (at + 1) & (len(x.table) - 1)
		}
		x.table[at] = int32(n) + 1
	}
	return x
}

func (x *Index) slot(j, k int32) int {
	h := (uint64(uint32(j))<<32 | uint64(uint32(k))) * 0x9E3779B97F4A7C15
	return int(h>>32) & (len(x.table) - 1)
}

// Voxels returns the indexed voxels.
func (x *Index) Voxels() *Voxels { return x.voxels }

// Mean is the mean of the points of voxel i, in the working CRS.
func (x *Index) Mean(i int) r3.Vec { return x.means[i] }

// Row returns the range of voxel indices whose cells lie in row (j, k) with
// lo ≤ I ≤ hi. It is empty (start == end) where none is occupied.
func (x *Index) Row(j, k, lo, hi int32) (start, end int) {
	at := x.slot(j, k)
	for {
		n := x.table[at]
		if n == 0 {
			return 0, 0
		}
		r := &x.rows[n-1]
		if r.j == j && r.k == k {
			return x.clip(r, lo, hi)
		}
		at = (at + 1) & (len(x.table) - 1)
	}
}

func (x *Index) clip(r *indexRow, lo, hi int32) (start, end int) {
	cells := x.voxels.Cells[r.start:r.end]
	s := sort.Search(len(cells), func(i int) bool { return cells[i].I >= lo })
	e := s
	if hi-lo < 16 {
		for e < len(cells) && cells[e].I <= hi {
			e++
		}
	} else {
		e += sort.Search(len(cells)-s, func(i int) bool { return cells[s+i].I > hi })
	}
	return int(r.start) + s, int(r.start) + e
}

// Find returns the index of cell c, or -1 if it is not occupied.
func (x *Index) Find(c Cell) int {
	if s, e := x.Row(c.J, c.K, c.I, c.I); s < e {
		return s
	}
	return -1
}

// Within appends to dst the indices, ascending, of the voxels whose mean lies
// within r metres of p, and returns the extended slice.
func (x *Index) Within(dst []int32, p r3.Vec, r float64) []int32 {
	lo := x.voxels.Lattice.CellOf(r3.Sub(p, r3.Vec{X: r, Y: r, Z: r}))
	hi := x.voxels.Lattice.CellOf(r3.Add(p, r3.Vec{X: r, Y: r, Z: r}))
	r2 := r * r
	for k := lo.K; k <= hi.K; k++ {
		dz := x.gap(p.Z, k)
		for j := lo.J; j <= hi.J; j++ {
			dy := x.gap(p.Y, j)
			if dy*dy+dz*dz > r2 {
				continue
			}
			start, end := x.Row(j, k, lo.I, hi.I)
			for i := start; i < end; i++ {
				if r3.Norm2(r3.Sub(x.means[i], p)) <= r2 {
					dst = append(dst, int32(i))
				}
			}
		}
	}
	return dst
}

// gap is the distance from coordinate v to the slab of cells with index c on
// the same axis, less a quantum for the rounding of either.
func (x *Index) gap(v float64, c int32) float64 {
	lo := x.voxels.Lattice.metres(c, 0)
	d := max(lo-v, v-lo-x.voxels.Lattice.SpacingM())
	return max(0, d-1.0/QuantaPerMetre)
}

// Nearest returns the voxel whose mean is nearest to p, among those within r
// metres; the lower index where two are equally near. It returns -1 if there
// is none.
func (x *Index) Nearest(p r3.Vec, r float64) int {
	best, bestD := -1, math.Inf(1)
	// Grow the search: most callers find one close by.
	for try := min(r, 1.5*x.voxels.Lattice.SpacingM()); ; try = min(2*try, r) {
		for _, i := range x.Within(nil, p, try) {
			if d := r3.Norm2(r3.Sub(x.means[i], p)); d < bestD {
				best, bestD = int(i), d
			}
		}
		if best >= 0 || try >= r {
			return best
		}
	}
}

// Rows calls f for each row of occupied voxels that meets the box of cells
// from lo to hi, with the range of voxel indices inside, in the order of
// Cell.Compare. It visits only rows that exist.
func (x *Index) Rows(lo, hi Cell, f func(start, end int)) {
	at := func(k, j int32) int {
		n, _ := slices.BinarySearchFunc(x.rows, Cell{J: j, K: k}, func(r indexRow, c Cell) int {
			return Cell{J: r.j, K: r.k}.Compare(c)
		})
		return n
	}
	for k := lo.K; k <= hi.K; k++ {
		for n := at(k, lo.J); n < len(x.rows) && x.rows[n].k == k && x.rows[n].j <= hi.J; n++ {
			if s, e := x.clip(&x.rows[n], lo.I, hi.I); s < e {
				f(s, e)
			}
		}
	}
}
