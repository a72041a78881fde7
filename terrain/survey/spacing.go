package survey

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"ledgework/terrain"
)

// spacingBudget bounds the points that MedianSpacing holds, 24 bytes each; 2^18
// of them give a median good to some thousandths.
const spacingBudget = 1 << 18

// MedianSpacing returns the survey's own point spacing in metres: the median,
// over a sample of its points, of the distance to the nearest point at another
// place. Of elevation grids it is the cell size (Frame.GridCell). It is 0 when
// no two points lie at different places.
//
// A thinned sample would have wider spacing than the survey. Hence all points
// are kept in a selection of cubes, by a hash of the cube's place: nested
// selections, each half of the one before, until the points kept number at
// most 2^18. The outcome therefore depends on the set of points only, not on
// their order or on the workers. Cubes are about 32 mean spacings wide, and
// only points an eighth of that away from the faces count, so that their
// neighbours are seen too.
//
// Limits: the median speaks of where most points are, so that the far side of
// a scan from one station is sparser; several returns or stations at one place
// count as one; the first pass over the survey takes as long as a second one.
// The filter applies as in Stream.
func MedianSpacing(ctx context.Context, frame *Frame, sources []Source, opts StreamOptions, progress Progress) (float64, error) {
	if frame.GridCell > 0 {
		return frame.GridCell, nil
	}
	opts.Columns = 0
	opts = opts.withWorkers()
	samples := make([]*sample, opts.Workers)
	for i := range samples {
		samples[i] = newSample(frame)
	}
	counts, err := Stream(ctx, frame, sources, opts, func(w int, b *terrain.Batch) error {
		samples[w].add(b)
		return nil
	}, progress)
	if err != nil {
		return 0, err
	}
	if err := counts.Err(); err != nil {
		return 0, err
	}
	for _, s := range samples[1:] {
		samples[0].merge(s)
	}
	return samples[0].median(), nil
}

// AutoSpacing returns the spacing of voxels for a footprint radius and a
// median point spacing, both in metres: the larger of a tenth of the one and
// one and a half times the other, rounded up to 1, 2 or 5 × 10^k m. It panics
// if both are zero or one is negative or not finite.
//
// It is meant for points. An elevation grid enters with Frame.GridCell.
func AutoSpacing(footprintRadius, medianSpacing float64) float64 {
	want := max(footprintRadius/10, 1.5*medianSpacing)
	if !(want > 0) || math.IsInf(want, 1) || footprintRadius < 0 || medianSpacing < 0 {
		panic(fmt.Sprintf("survey: no spacing for footprint %g m and points %g m apart", footprintRadius, medianSpacing))
	}
	// slack takes what exceeds a step by rounding alone for the step.
	const slack = 1 + 1e-9
	k := math.Floor(math.Log10(want))
	for ; ; k++ {
		for _, m := range [3]float64{1, 2, 5} {
			if v := decimal(m, int(k)); v*slack >= want {
				return v
			}
		}
	}
}

// decimal is m × 10^k, correctly rounded for |k| up to 22.
func decimal(m float64, k int) float64 {
	if k < 0 {
		return m / math.Pow10(-k)
	}
	return m * math.Pow10(k)
}

// A place is a point of a sample.
type place struct{ x, y, z float64 }

func (p place) compare(q place) int {
	return cmp.Or(cmp.Compare(p.x, q.x), cmp.Compare(p.y, q.y), cmp.Compare(p.z, q.z))
}

// A sample keeps the points of selected cubes.
type sample struct {
	edge   float64 // of the cubes at level 0
	thin   int     // levels before cubes shrink
	level  int
	points []place
}

// meanSpacings is the width of a cube in mean spacings of the survey: 1000
// points in a cube that a surface crosses.
const meanSpacings = 32

// maxLevel ends the selection: 2^-48 of the points are none.
const maxLevel = 48

// newSample returns an empty sample for a survey. The cubes' width follows
// from the number of points and the extent that the headers tell; where points
// fill a small part of it they are denser than that, and cubes shrink once the
// levels that the number of points asks for are used up.
func newSample(f *Frame) *sample {
	s := &sample{}
	var side [3]float64
	for i := range side {
		side[i] = max(0, f.Extent.Max[i]-f.Extent.Min[i])
	}
	// The largest face of the box is the least area of a surface that fills it.
	area := max(side[0]*side[1], side[0]*side[2], side[1]*side[2])
	n := float64(max(1, f.Points))
	s.edge = meanSpacings * math.Sqrt(area/n)
	if !(s.edge > 0) || math.IsInf(s.edge, 0) {
		s.edge = max(1, side[0], side[1], side[2]) // a line or a single point
	}
	s.thin = max(0, int(math.Ceil(math.Log2(n/spacingBudget)))) + 2
	return s
}

// edgeAt is the width of the cubes at a level.
func (s *sample) edgeAt(level int) float64 {
	return s.edge / float64(uint64(1)<<max(0, level-s.thin))
}

// add keeps the points of b that are selected so far.
func (s *sample) add(b *terrain.Batch) {
	for i, x := range b.X {
		p := place{x, b.Y[i], b.Z[i]}
		if s.selects(p, 0, s.level) {
			s.points = append(s.points, p)
			if len(s.points) > spacingBudget {
				s.halve()
			}
		}
	}
}

// selects reports whether p is in the selections of all levels after from up
// to to.
func (s *sample) selects(p place, from, to int) bool {
	if to <= from {
		return true
	}
	// While cubes keep their width one hash decides for all levels.
	if flat := min(to, s.thin); from < flat {
		h := cubeHash(p, s.edge)
		mask := (uint64(1)<<flat - 1) &^ (uint64(1)<<from - 1)
		if h&mask != 0 {
			return false
		}
		from = flat
	}
	for l := from + 1; l <= to; l++ {
		if cubeHash(p, s.edgeAt(l))>>63 != 0 {
			return false
		}
	}
	return true
}

// halve goes to the next levels until the points fit.
func (s *sample) halve() {
	for len(s.points) > spacingBudget {
		if s.level == maxLevel { // that many points at one place
			s.points = s.points[:spacingBudget]
			return
		}
		s.level++
		s.points = slices.DeleteFunc(s.points, func(p place) bool { return !s.selects(p, s.level-1, s.level) })
	}
}

// merge adds the points of o, which is used up.
func (s *sample) merge(o *sample) {
	level := max(s.level, o.level)
	for _, t := range [2]*sample{s, o} {
		t.points = slices.DeleteFunc(t.points, func(p place) bool { return !t.selects(p, t.level, level) })
		t.level = level
	}
	s.points = append(s.points, o.points...)
	s.halve()
}

// cubeHash mixes the indices of the cube of the given width that p lies in,
// with the finalizer of SplitMix64 (Steele, Lea & Flood 2014,
// doi:10.1145/2660193.2660195).
func cubeHash(p place, edge float64) uint64 {
	h := uint64(0)
	for _, v := range [3]float64{p.x, p.y, p.z} {
		h = (h ^ uint64(int64(math.Floor(v/edge)))) + 0x9e3779b97f4a7c15
		h = (h ^ h>>30) * 0xbf58476d1ce4e5b9
		h = (h ^ h>>27) * 0x94d049bb133111eb
		h ^= h >> 31
	}
	return h
}

// median returns the median nearest distance of the points in the inner part
// of their cubes; of all points when there are none, or no cube was left out.
func (s *sample) median() float64 {
	edge := s.edgeAt(s.level)
	if s.level == 0 {
		edge = math.Inf(1)
	}
	all := s.nearest(edge)
	if len(all) == 0 {
		all = s.nearest(math.Inf(1))
	}
	if len(all) == 0 {
		return 0
	}
	slices.Sort(all)
	return all[(len(all)-1)/2]
}

// nearest returns the distance to the nearest other place in the same cube for
// every point that is an eighth of edge away from the cube's faces.
func (s *sample) nearest(edge float64) []float64 {
	w := s.direction()
	at := func(p place) float64 { return p.x*w[0] + p.y*w[1] + p.z*w[2] }
	cube := func(p place) place {
		return place{math.Floor(p.x / edge), math.Floor(p.y / edge), math.Floor(p.z / edge)}
	}
	slices.SortFunc(s.points, func(a, b place) int {
		return cmp.Or(cube(a).compare(cube(b)), cmp.Compare(at(a), at(b)), a.compare(b))
	})
	s.points = slices.Compact(s.points)
	var all []float64
	for first := 0; first < len(s.points); {
		last, in := first+1, cube(s.points[first])
		for last < len(s.points) && cube(s.points[last]) == in {
			last++
		}
		points := s.points[first:last]
		first = last
		for i, p := range points {
			if !inner(p, edge) {
				continue
			}
			best := math.Inf(1)
			for _, step := range [2]int{-1, 1} {
				for j := i + step; j >= 0 && j < len(points); j += step {
					q := points[j]
					if d := at(q) - at(p); d*d >= best {
						break
					}
					dx, dy, dz := q.x-p.x, q.y-p.y, q.z-p.z
					best = min(best, dx*dx+dy*dy+dz*dz)
				}
			}
			if !math.IsInf(best, 1) {
				all = append(all, math.Sqrt(best))
			}
		}
	}
	return all
}

// inner reports whether p is an eighth of edge away from the faces of its cube.
func inner(p place, edge float64) bool {
	const margin = 1.0 / 8
	if math.IsInf(edge, 1) {
		return true
	}
	for _, v := range [3]float64{p.x, p.y, p.z} {
		f := v/edge - math.Floor(v/edge)
		if f < margin || f > 1-margin {
			return false
		}
	}
	return true
}

// direction is that along which neighbours are looked for: a vector a little
// shorter than 1, so that places are at least as far apart as along it. It is
// near the axis along which the points spread most, and askew to all of them:
// columns of a scan or walls of a building, which stand at one place of an axis
// with half of the points, would each be searched from end to end.
func (s *sample) direction() (w [3]float64) {
	e := terrain.EmptyExtent()
	for _, p := range s.points {
		e.Add(p.x, p.y, p.z)
	}
	axis := 0
	for i := range 3 {
		if e.Max[i]-e.Min[i] > e.Max[axis]-e.Min[axis] {
			axis = i
		}
	}
	w[axis], w[(axis+1)%3], w[(axis+2)%3] = 0.9, 0.37, 0.23
	return w
}
