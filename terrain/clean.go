package terrain

import "slices"

// Cleaning judges a voxel isolated when fewer than isolatedNeighbours others
// lie within isolatedReach cells, and around it either three times as many
// points a voxel, or three times as many neighbours, are usual.
const (
	isolatedNeighbours = 3
	isolatedReach      = 3  // cells
	usualReach         = 10 // cells: what "around it" means
	usualTimes         = 3
	usualSample        = 2000 // voxels that the usual of a whole survey is taken from
)

// A Cleaned says what Clean dropped.
type Cleaned struct {
	Voxels int
	Points int64
}

// Clean returns v without its isolated voxels: those with fewer than three
// other occupied voxels within three cells (between centres) where more is
// usual. It is usual, by the median of the voxels within ten cells, or of the
// whole survey where there are none, to hold more than three times as many
// points, or to have three times as many neighbours. Birds, dust and multipath
// strays go; the edge of a thinly scanned face stays, and so does a wire. v is
// not changed; it is returned itself when nothing is dropped.
//
// Points alone would not do: where a survey has one or two points a voxel, a
// stray has as many as the surface.
func Clean(v *Voxels) (*Voxels, Cleaned) {
	x := NewIndex(v)
	var dropped Cleaned
	drop := make([]bool, v.Len())
	survey := x.usualOf(sample(v.Len()))
	near := make([]int32, 0, isolatedNeighbours)
	for i := range v.Cells {
		if !x.isolated(i, survey, near) {
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

// usual is what the median voxel of some has.
type usual struct {
	points     int64
	neighbours int // within isolatedReach cells, counted no further than needed
}

// sample lists about usualSample of n voxels, evenly.
func sample(n int) []int32 {
	var s []int32
	for i := 0; i < n; i += 1 + n/usualSample {
		s = append(s, int32(i))
	}
	return s
}

func (x *Index) usualOf(which []int32) usual {
	points, neighbours := make([]int64, len(which)), make([]int, len(which))
	near := make([]int32, 0, usualTimes*isolatedNeighbours)
	for i, w := range which {
		points[i] = x.voxels.Moments[w].N
		neighbours[i] = len(x.around(near, int(w), isolatedReach, usualTimes*isolatedNeighbours))
	}
	return usual{lowerMedian(points), lowerMedian(neighbours)}
}

// lowerMedian sorts v. It is zero without values.
func lowerMedian[T int | int64](v []T) T {
	if len(v) == 0 {
		return 0
	}
	slices.Sort(v)
	return v[(len(v)-1)/2]
}

// isolated uses the room for isolatedNeighbours in near.
func (x *Index) isolated(i int, u usual, near []int32) bool {
	if len(x.around(near, i, isolatedReach, isolatedNeighbours)) >= isolatedNeighbours {
		return false
	}
	if near := x.around(nil, i, usualReach, -1); len(near) > 0 {
		u = x.usualOf(near)
	}
	return usualTimes*x.voxels.Moments[i].N < u.points || u.neighbours >= usualTimes*isolatedNeighbours
}

// around appends to dst, which is empty, the other voxels whose centres lie
// within reach cells of voxel i's, stopping at the given number of them (-1 for
// all).
func (x *Index) around(dst []int32, i int, reach int32, enough int) []int32 {
	c := x.voxels.Cells[i]
	for k := c.K - reach; k <= c.K+reach; k++ {
		for j := c.J - reach; j <= c.J+reach; j++ {
			start, end := x.Row(j, k, c.I-reach, c.I+reach)
			for n := start; n < end; n++ {
				o := x.voxels.Cells[n]
				di, dj, dk := o.I-c.I, o.J-c.J, o.K-c.K
				if n == i || di*di+dj*dj+dk*dk > reach*reach {
					continue
				}
				if dst = append(dst, int32(n)); len(dst) == enough {
					return dst
				}
			}
		}
	}
	return dst
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
