package fit

import (
	"context"
	"errors"
	"math"
	"slices"

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
// either way, only the edge of the neighbourhood is rougher. The result does not
// depend on how the work is shared; progress counts voxels of at.
//
// Cost per voxel is one pass over the members within reach, whose sums have
// been shifted, exactly, to one common centre per tile beforehand.
func FitLocal(ctx context.Context, at *terrain.Voxels, members *terrain.Index, radiusM float64, work Work) (*LocalPlanes, error) {
	if !(radiusM <= maxRadiusCells*members.Voxels().Lattice.SpacingM()) {
		return nil, ErrCrowded
	}
	n := at.Len()
	out := &LocalPlanes{
		RadiusM: radiusM, Normal: make([]r3.Vec, n), Offset: make([]float64, n),
		Roughness: make([]float32, n), Variation: make([]float32, n), SigmaDeg: make([]float32, n),
		Points: make([]int64, n), Voxels: make([]int32, n),
	}
	tiles := tilesOf(at, radiusM)
	size := func(i int) int { return len(tiles[i]) }
	err := work.Each(ctx, len(tiles), size, func() func(int) error {
		w := &localWorker{at: at, members: members, out: out, radius: radiusM}
		return func(i int) error { return w.tile(ctx, tiles[i]) }
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

// maxRadiusCells keeps the cells within a radius well within int32.
const maxRadiusCells = 1 << 20

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

// member is one voxel of a tile and its halo: its mean relative to the tile's
// centre in metres, on the axes of the tile's rows, and its sums relative to
// that centre in quanta.
type member struct {
	along, across, through float64
	sums                   terrain.Moments
}

// localWorker holds what one goroutine reuses from tile to tile.
//
// Gathered members are bucketed into columns of cells: square prisms through
// the tile along the axis in which it is thinnest, so that a surface puts few
// members into each. Columns that follow each other along a second axis follow
// each other in memory, and the members within reach of a query are one run of
// them for each step across.
type localWorker struct {
	at      *terrain.Voxels
	members *terrain.Index
	out     *LocalPlanes
	radius  float64

	found    []int32 // indices of the members
	gathered []member
	starts   []int32 // of each column in gathered, and one more at the end

	axes                  [3]int  // along, across, through: 0 east, 1 north, 2 up
	lowAlong, lowAcross   float64 // lower faces of the first column, relative to the centre
	columnsAlong, nAcross int
}

// contextEvery is how many voxels are looked at between two looks at the
// context: a tile of large neighbourhoods takes longer than a user waits.
const contextEvery = 256

func (w *localWorker) tile(ctx context.Context, queries []int32) error {
	centre, err := w.gather(queries)
	if err != nil {
		return err
	}
	for n, q := range queries {
		if n%contextEvery == contextEvery-1 && ctx.Err() != nil {
			return ctx.Err()
		}
		p := r3.Sub(w.at.Mean(int(q)), centre)
		sum, count := w.sum(w.turned(p))
		w.finish(int(q), p, &sum, count)
	}
	return nil
}

// turned returns p on the axes along, across and through.
func (w *localWorker) turned(p r3.Vec) [3]float64 {
	v := [3]float64{p.X, p.Y, p.Z}
	return [3]float64{v[w.axes[0]], v[w.axes[1]], v[w.axes[2]]}
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
	lo := l.CellOf(r3.Sub(r3.Vec{X: box.Min[0], Y: box.Min[1], Z: box.Min[2]}, reach))
	hi := l.CellOf(r3.Add(r3.Vec{X: box.Max[0], Y: box.Max[1], Z: box.Max[2]}, reach))
	mid := terrain.Cell{I: lo.I + (hi.I-lo.I)/2, J: lo.J + (hi.J-lo.J)/2, K: lo.K + (hi.K-lo.K)/2}
	centre := l.Centre(mid)

	w.found = w.found[:0]
	far := int64(max(hi.I-mid.I, hi.J-mid.J, hi.K-mid.K)+1) * l.Quanta()
	room := int64(math.MaxInt64/2) / far / far // points whose sums are exact
	w.members.Rows(lo, hi, func(start, end int) {
		for i := start; i < end; i++ {
			w.found = append(w.found, int32(i))
			if room >= 0 { // else it could wrap round
				room -= v.Moments[i].N
			}
		}
	})
	if room < 0 {
		return centre, ErrCrowded
	}
	lo, hi = boxOf(v.Cells, w.found)
	w.layOut(lo, hi, centre)
	// The starts count up while columns fill, and are each one's end after.
	for n := len(w.found) - 1; n >= 0; n-- {
		c := v.Cells[w.found[n]]
		at := &w.starts[w.column(c, lo)]
		*at--
		p := w.turned(r3.Sub(w.members.Mean(int(w.found[n])), centre))
		w.gathered[*at] = member{p[0], p[1], p[2], v.Moments[w.found[n]].Shifted(
			int64(c.I-mid.I)*l.Quanta(), int64(c.J-mid.J)*l.Quanta(), int64(c.K-mid.K)*l.Quanta())}
	}
	return centre, nil
}

// boxOf is the box of the listed cells, one cell without any. Columns are laid
// over it and not over all that is within reach, which for a radius larger than
// the survey is mostly empty.
func boxOf(cells []terrain.Cell, list []int32) (lo, hi terrain.Cell) {
	if len(list) == 0 {
		return lo, hi
	}
	lo, hi = cells[list[0]], cells[list[0]]
	for _, i := range list {
		c := cells[i]
		lo = terrain.Cell{I: min(lo.I, c.I), J: min(lo.J, c.J), K: min(lo.K, c.K)}
		hi = terrain.Cell{I: max(hi.I, c.I), J: max(hi.J, c.J), K: max(hi.K, c.K)}
	}
	return lo, hi
}

// layOut chooses the axes for the members found, and counts them so that starts
// holds the end of each column.
func (w *localWorker) layOut(lo, hi terrain.Cell, centre r3.Vec) {
	v := w.members.Voxels()
	var sum, squares [3]float64
	for _, i := range w.found {
		c := v.Cells[i]
		for a, d := range [3]float64{float64(c.I - lo.I), float64(c.J - lo.J), float64(c.K - lo.K)} {
			sum[a] += d
			squares[a] += d * d
		}
	}
	n := max(1, float64(len(w.found)))
	thin := 0
	variance := func(a int) float64 { return squares[a] - sum[a]*sum[a]/n }
	for a := 1; a < 3; a++ {
		if variance(a) < variance(thin) {
			thin = a
		}
	}
	w.axes = [3]int{(thin + 1) % 3, (thin + 2) % 3, thin}
	size := [3]int{int(hi.I-lo.I) + 1, int(hi.J-lo.J) + 1, int(hi.K-lo.K) + 1}
	w.columnsAlong, w.nAcross = size[w.axes[0]], size[w.axes[1]]
	low := w.turned(r3.Sub(v.Lattice.Corner(lo), centre))
	w.lowAlong, w.lowAcross = low[0], low[1]

	w.starts = slices.Grow(w.starts[:0], w.columnsAlong*w.nAcross+1)[:w.columnsAlong*w.nAcross+1]
	clear(w.starts)
	for _, i := range w.found {
		w.starts[w.column(v.Cells[i], lo)]++
	}
	end := int32(0)
	for i := range w.starts {
		end += w.starts[i]
		w.starts[i] = end
	}
	w.gathered = slices.Grow(w.gathered[:0], len(w.found))[:len(w.found)]
}

// column is the number of the column that holds cell c.
func (w *localWorker) column(c, lo terrain.Cell) int {
	d := [3]int{int(c.I - lo.I), int(c.J - lo.J), int(c.K - lo.K)}
	return d[w.axes[1]]*w.columnsAlong + d[w.axes[0]]
}

// sum adds up the members within the radius of p, which is relative to the
// tile's centre and on its axes.
func (w *localWorker) sum(p [3]float64) (sum terrain.Moments, count int32) {
	g := w.members.Voxels().Lattice.SpacingM()
	cells := 1 / g
	r2 := w.radius * w.radius
	first := max(0, int((p[1]-w.radius-w.lowAcross)*cells-slackCells))
	last := min(w.nAcross-1, int((p[1]+w.radius-w.lowAcross)*cells+slackCells))
	for row := first; row <= last; row++ {
		// The least distance of p from the row bounds how far along it the
		// sphere reaches.
		d := max(math.Abs(w.lowAcross+(float64(row)+0.5)*g-p[1])-(0.5+slackCells)*g, 0)
		left := r2 - d*d
		if left < 0 {
			continue
		}
		half := math.Sqrt(left)
		from := max(0, int((p[0]-half-w.lowAlong)*cells-slackCells))
		to := min(w.columnsAlong, int((p[0]+half-w.lowAlong)*cells+slackCells)+1)
		if from >= to {
			continue
		}
		run := w.gathered[w.starts[row*w.columnsAlong+from]:w.starts[row*w.columnsAlong+to]]
		for i := range run {
			m := &run[i]
			dx, dy, dz := m.along-p[0], m.across-p[1], m.through-p[2]
			if dx*dx+dy*dy+dz*dz <= r2 {
				sum.Add(&m.sums)
				count++
			}
		}
	}
	return sum, count
}

// slackCells widens the search for the rounding of means to quanta, which is at
// most 2 % of a cell, and of the arithmetic here.
const slackCells = 0.05

func (w *localWorker) finish(q int, p r3.Vec, sum *terrain.Moments, count int32) {
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
