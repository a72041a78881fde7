package terrain

import "slices"

// Cleaning judges a voxel isolated when fewer than isolatedNeighbours others
// lie within isolatedReach cells and it holds less than a third of the points
// that are usual around it.
const (
	isolatedNeighbours = 3
	isolatedReach      = 3  // cells
	usualReach         = 10 // cells: what "around it" means
	usualShare         = 3
)

// A Cleaned says what Clean dropped.
type Cleaned struct {
	Voxels int
	Points int64
}

// Clean returns v without its isolated voxels: those with fewer than three
// other occupied voxels within three cells (between centres), and fewer points
// than a third of the median of the voxels within ten cells, or of the whole
// survey where there are none. Birds, dust and multipath strays go; the edge
// of a thinly scanned face stays. v is not changed; it is returned itself when
// nothing is dropped.
func Clean(v *Voxels) (*Voxels, Cleaned) {
	x := NewIndex(v)
	var dropped Cleaned
	drop := make([]bool, v.Len())
	usual := medianPoints(v.Moments, nil)
	for i := range v.Cells {
		if !isolated(x, i, usual) {
			continue
		}
		drop[i] = true
		dropped.Voxels++
		dropped.Points += v.Moments[i].N
	}
	if dropped.Voxels == 0 {
		return v, dropped
	}
	return v.without(drop), dropped
}

func isolated(x *Index, i int, usual int64) bool {
	if len(x.around(i, isolatedReach, isolatedNeighbours)) >= isolatedNeighbours {
		return false
	}
	if near := x.around(i, usualReach, -1); len(near) > 0 {
		usual = medianPoints(x.voxels.Moments, near)
	}
	return usualShare*x.voxels.Moments[i].N < usual
}

// around returns the other voxels whose centres lie within reach cells of
// voxel i's, stopping at the given number of them (-1 for all).
func (x *Index) around(i int, reach int32, enough int) []int32 {
	c := x.voxels.Cells[i]
	var found []int32
	for k := c.K - reach; k <= c.K+reach; k++ {
		for j := c.J - reach; j <= c.J+reach; j++ {
			start, end := x.Row(j, k, c.I-reach, c.I+reach)
			for n := start; n < end; n++ {
				o := x.voxels.Cells[n]
				di, dj, dk := o.I-c.I, o.J-c.J, o.K-c.K
				if n == i || di*di+dj*dj+dk*dk > reach*reach {
					continue
				}
				if found = append(found, int32(n)); len(found) == enough {
					return found
				}
			}
		}
	}
	return found
}

// medianPoints is the lower median of the points per voxel, of the voxels
// listed or, if none are, of all.
func medianPoints(m []Moments, which []int32) int64 {
	var n []int64
	if which == nil {
		n = make([]int64, len(m))
		for i := range m {
			n[i] = m[i].N
		}
	} else {
		n = make([]int64, len(which))
		for i, w := range which {
			n[i] = m[w].N
		}
	}
	if len(n) == 0 {
		return 0
	}
	slices.Sort(n)
	return n[(len(n)-1)/2]
}

// without returns a copy of v that lacks the marked voxels.
func (v *Voxels) without(drop []bool) *Voxels {
	out := &Voxels{Lattice: v.Lattice}
	renumbered := make([]int32, v.Len())
	for i := range v.Cells {
		renumbered[i] = -1
		if drop[i] {
			continue
		}
		renumbered[i] = int32(out.Len())
		out.Cells = append(out.Cells, v.Cells[i])
		out.Moments = append(out.Moments, v.Moments[i])
		if v.Intensity != nil {
			out.Intensity = append(out.Intensity, v.Intensity[i])
		}
		if v.Red != nil {
			out.Red, out.Green, out.Blue = append(out.Red, v.Red[i]), append(out.Green, v.Green[i]), append(out.Blue, v.Blue[i])
		}
	}
	for _, c := range v.Classes {
		if n := renumbered[c.Voxel]; n >= 0 {
			out.Classes = append(out.Classes, ClassCount{n, c.Class, c.N})
		}
	}
	return out
}
