package fit

import (
	"context"
	"errors"
	"math"
	"slices"
	"sync"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// LocalPlanes are the local planes of one radius at every voxel of a survey,
// column by column. A voxel without a plane (fewer than minPlaneVoxels around
// it, or nearly all on a line) has a zero Normal and zeros in every other column
// but Points and Voxels.
type LocalPlanes struct {
	RadiusM   float64
	Normal    []r3.Vec  // unit; outward after Orient, before that of either sign
	Offset    []float64 // signed distance of the voxel's mean from its plane along Normal, m
	Roughness []float32 // RMS distance of the raw points with its degrees of freedom, m
	Variation []float32 // surface variation (Pauly, Gross & Kobbelt 2002)
	SigmaDeg  []float32 // 1σ of the normal's direction
	Points    []int64   // raw points summed
	Voxels    []int32   // member voxels summed
}

// Fitted reports whether voxel i has a plane.
func (p *LocalPlanes) Fitted(i int) bool { return p.Normal[i] != r3.Vec{} }

// ErrCrowded says that the points within a radius are too many for exact sums.
var ErrCrowded = errors.New("fit: too many points within the radius for exact sums; give a larger spacing or a smaller radius")

// FitLocal fits a plane around the mean of every voxel of at, to all raw points
// of those voxels of members whose mean lies within radiusM of it. Members may
// be the same voxels or a coarser level of the pyramid: the sums are exact
// either way, only the edge of the neighbourhood is rougher. workers goroutines
// share the work; the result does not depend on their number.
//
// Cost per voxel is one pass over the members within reach, whose sums have
// been shifted, exactly, to one common centre per tile beforehand.
func FitLocal(ctx context.Context, at *terrain.Voxels, members *terrain.Index, radiusM float64, workers int) (*LocalPlanes, error) {
	n := at.Len()
	out := &LocalPlanes{
		RadiusM: radiusM, Normal: make([]r3.Vec, n), Offset: make([]float64, n),
		Roughness: make([]float32, n), Variation: make([]float32, n), SigmaDeg: make([]float32, n),
		Points: make([]int64, n), Voxels: make([]int32, n),
	}
	tiles := tilesOf(at, radiusM)
	err := inParallel(ctx, len(tiles), workers, func() func(int) error {
		w := &localWorker{at: at, members: members, out: out, radius: radiusM}
		return func(i int) error { return w.tile(tiles[i]) }
	})
	if err != nil {
		return nil, err
	}
	return out, nil
}

// What a local plane needs. Three points always have a plane, and points along
// one scan line any: neither says anything of the surface.
const (
	minPlaneVoxels = 5
	minStripRatio  = 0.02 // of the variances across and along: a strip seven times as long as wide
)

// tileRadii is a tile's edge in neighbourhood radii. The halo makes a tile
// gather (1+2/tileRadii)² times the members of its own area; larger tiles fall
// out of the cache.
const tileRadii = 4

// tilesOf groups the voxels of v into cubes of about tileRadii radii. Within a
// tile voxels keep their order.
func tilesOf(v *terrain.Voxels, radiusM float64) [][]int32 {
	side := int32(max(4, math.Ceil(tileRadii*radiusM/v.Lattice.SpacingM())))
	index := map[terrain.Cell]int{}
	var tiles [][]int32
	var last terrain.Cell
	at := -1
	for i, c := range v.Cells {
		t := terrain.Cell{I: floorDiv(c.I, side), J: floorDiv(c.J, side), K: floorDiv(c.K, side)}
		if at < 0 || t != last {
			n, ok := index[t]
			if !ok {
				n = len(tiles)
				tiles = append(tiles, nil)
				index[t] = n
			}
			at, last = n, t
		}
		tiles[at] = append(tiles[at], int32(i))
	}
	return tiles
}

func floorDiv(a, b int32) int32 {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

// inParallel calls the function that newWorker returns for every i in [0, n),
// from workers goroutines, until one fails or ctx ends.
func inParallel(ctx context.Context, n, workers int, newWorker func() func(i int) error) error {
	var (
		wg    sync.WaitGroup
		mu    sync.Mutex
		next  int
		first error
	)
	take := func() int {
		mu.Lock()
		defer mu.Unlock()
		if first == nil {
			first = ctx.Err()
		}
		if first != nil || next == n {
			return -1
		}
		next++
		return next - 1
	}
	for range max(1, workers) {
		wg.Go(func() {
			work := newWorker()
			for i := take(); i >= 0; i = take() {
				if err := work(i); err != nil {
					mu.Lock()
					if first == nil {
						first = err
					}
					mu.Unlock()
				}
			}
		})
	}
	wg.Wait()
	return first
}

// member is one voxel of a tile and its halo: its mean relative to the tile's
// centre in metres and its sums relative to that centre in quanta.
type member struct {
	x, y, z float64
	i       int32
	sums    terrain.Moments
}

// localWorker holds what one goroutine reuses from tile to tile.
type localWorker struct {
	at      *terrain.Voxels
	members *terrain.Index
	out     *LocalPlanes
	radius  float64

	gathered []member
	rows     []int32 // start of row (j, k) in gathered; one more at the end
	cursor   []int32
	lo, hi   terrain.Cell // gathered box, member cells
	nj       int32
}

func (w *localWorker) tile(queries []int32) error {
	centre, err := w.gather(queries)
	if err != nil {
		return err
	}
	var row terrain.Cell
	for n, q := range queries {
		p := r3.Sub(w.at.Mean(int(q)), centre)
		if c := w.at.Cells[q]; n == 0 || c.J != row.J || c.K != row.K {
			row = c
			w.resetCursors()
		}
		sum, count := w.sum(p, centre)
		w.finish(int(q), p, centre, &sum, count)
	}
	return nil
}

// gather copies the members that can be within reach of the queries, shifted to
// the tile's centre, which it returns. The centre is a member cell's, so all
// shifts are whole quanta.
func (w *localWorker) gather(queries []int32) (r3.Vec, error) {
	box := terrain.EmptyExtent()
	for _, q := range queries {
		m := w.at.Mean(int(q))
		box.Add(m.X, m.Y, m.Z)
	}
	v := w.members.Voxels()
	l := v.Lattice
	reach := r3.Vec{X: w.radius, Y: w.radius, Z: w.radius}
	lower := r3.Vec{X: box.Min[0], Y: box.Min[1], Z: box.Min[2]}
	upper := r3.Vec{X: box.Max[0], Y: box.Max[1], Z: box.Max[2]}
	w.lo, w.hi = l.CellOf(r3.Sub(lower, reach)), l.CellOf(r3.Add(upper, reach))
	mid := terrain.Cell{I: w.lo.I + (w.hi.I-w.lo.I)/2, J: w.lo.J + (w.hi.J-w.lo.J)/2, K: w.lo.K + (w.hi.K-w.lo.K)/2}
	centre := l.Centre(mid)
	w.nj = w.hi.J - w.lo.J + 1
	nk := w.hi.K - w.lo.K + 1
	w.gathered = w.gathered[:0]
	w.rows = slices.Grow(w.rows[:0], int(w.nj*nk)+1)[:w.nj*nk+1]
	clear(w.rows)

	half := int64(max(w.hi.I-mid.I, w.hi.J-mid.J, w.hi.K-mid.K)+1) * l.Quanta()
	room := int64(math.MaxInt64/2) / half / half // points that fit exact sums
	filled := int32(0)
	w.members.Rows(w.lo, w.hi, func(start, end int) {
		c := v.Cells[start]
		at := (c.K-w.lo.K)*w.nj + c.J - w.lo.J
		for ; filled <= at; filled++ {
			w.rows[filled] = int32(len(w.gathered))
		}
		for i := start; i < end; i++ {
			c := v.Cells[i]
			m := r3.Sub(w.members.Mean(i), centre)
			room -= v.Moments[i].N
			w.gathered = append(w.gathered, member{m.X, m.Y, m.Z, c.I,
				v.Moments[i].Shifted(int64(c.I-mid.I)*l.Quanta(), int64(c.J-mid.J)*l.Quanta(), int64(c.K-mid.K)*l.Quanta())})
		}
	})
	if room < 0 {
		return centre, ErrCrowded
	}
	for ; int(filled) < len(w.rows); filled++ {
		w.rows[filled] = int32(len(w.gathered))
	}
	return centre, nil
}

func (w *localWorker) resetCursors() {
	n := len(w.rows) - 1
	w.cursor = slices.Grow(w.cursor[:0], n)[:n]
	copy(w.cursor, w.rows)
}

// sum adds up the members within the radius of p, which is relative to the
// tile's centre. Queries of one row must come in order: cursors only advance.
func (w *localWorker) sum(p, centre r3.Vec) (sum terrain.Moments, count int32) {
	l := w.members.Voxels().Lattice
	abs := r3.Add(p, centre)
	reach := r3.Vec{X: w.radius, Y: w.radius, Z: w.radius}
	lo, hi := l.CellOf(r3.Sub(abs, reach)), l.CellOf(r3.Add(abs, reach))
	g, r2 := l.SpacingM(), w.radius*w.radius
	corner := r3.Sub(l.Corner(lo), abs)
	for k := lo.K; k <= hi.K; k++ {
		dz := slabGap(corner.Z+g*float64(k-lo.K), g)
		left := r2 - dz*dz
		for j := lo.J; j <= hi.J; j++ {
			dy := slabGap(corner.Y+g*float64(j-lo.J), g)
			if dy*dy > left {
				continue
			}
			row := (k-w.lo.K)*w.nj + j - w.lo.J
			at, end := w.cursor[row], w.rows[row+1]
			for at < end && w.gathered[at].i < lo.I {
				at++
			}
			w.cursor[row] = at
			for ; at < end; at++ {
				m := &w.gathered[at]
				if m.i > hi.I {
					break
				}
				dx, dy, dz := m.x-p.X, m.y-p.Y, m.z-p.Z
				if dx*dx+dy*dy+dz*dz <= r2 {
					sum.Add(&m.sums)
					count++
				}
			}
		}
	}
	return sum, count
}

// slabGap is the distance of 0 from the interval [lo, lo+g], less the rounding
// of means to quanta.
func slabGap(lo, g float64) float64 {
	return max(0, max(lo, -lo-g)-1.0/terrain.QuantaPerMetre)
}

func (w *localWorker) finish(q int, p, centre r3.Vec, sum *terrain.Moments, count int32) {
	o := w.out
	o.Points[q], o.Voxels[q] = sum.N, count
	if count < minPlaneVoxels {
		return
	}
	plane, ok := PlaneFromMoments(sum, r3.Vec{}, int(count))
	if !ok || plane.Lambda[1] < minStripRatio*plane.Lambda[2] {
		return
	}
	// Five voxels hold five points at least.
	rms, _ := plane.Roughness()
	o.Normal[q] = plane.Normal
	o.Offset[q] = r3.Dot(r3.Sub(p, plane.Centroid), plane.Normal)
	o.Roughness[q] = float32(rms)
	o.Variation[q] = float32(plane.Variation())
	o.SigmaDeg[q] = float32(plane.NormalSigmaDeg())
}
