package terrain

import (
	"fmt"
	"math"
	"sync"
	"sync/atomic"

	"gonum.org/v1/gonum/spatial/r3"
)

// Geometry of the accumulator's table.
const (
	brickBits  = 2 // a brick is 4×4×4 cells
	brickCells = 1 << (3 * brickBits)
	shardBits  = 4
	shards     = 1 << shardBits

	// Brick coordinates relative to the first point, so that a cell's key, with
	// brickBits more on each axis, fits 64 bits: ±4 194 304 cells east and
	// north, ±131 072 up. At 5 mm that is ±21 km and ±655 m, at 5 cm ten times
	// as much; no worksite is larger.
	brickBitsIJ = 21
	brickBitsK  = 16
)

// An Accumulator sums points into voxels. Any number of Adders may feed it at
// the same time; since the sums are exact, the result does not depend on
// which of them saw which point, or when. Memory grows with the number of
// occupied voxels.
type Accumulator struct {
	lattice Lattice
	columns Columns
	shards  [shards]shard

	once   sync.Once
	origin Cell // brick that holds the first point

	adders atomic.Int32 // made so far
}

// NewAccumulator returns an empty accumulator on lattice l that keeps the sums
// of the given columns beside the moments; Returns are not summed.
func NewAccumulator(l Lattice, columns Columns) *Accumulator {
	a := &Accumulator{lattice: l, columns: columns &^ Returns}
	for i := range a.shards {
		a.shards[i].init(a)
	}
	return a
}

// An Adder feeds an Accumulator from one goroutine.
type Adder struct {
	to      *Accumulator
	inverse float64 // cells per quantum
	pending [shards][]located
}

// located is a point on its way into a shard.
type located struct {
	brick   uint64
	x, y, z int32  // offset from the voxel's centre, quanta
	cell    uint16 // within the brick
	point   uint16 // index in the batch
}

// NewAdder returns an Adder for one goroutine's use.
func (a *Accumulator) NewAdder() *Adder {
	a.adders.Add(1)
	return &Adder{to: a, inverse: 1 / float64(a.lattice.edge)}
}

// maxBatch is set by located.point.
const maxBatch = 1 << 16

// Add sums the points of b. Coordinates must be metres in the working CRS. It
// fails, having added nothing of b, when a coordinate is not finite or lies
// absurdly far from the first point. It panics if b holds more than 65 536
// points.
func (d *Adder) Add(b *Batch) error {
	n := b.Len()
	if n > maxBatch {
		panic("terrain: batch too large")
	}
	if n == 0 {
		return nil
	}
	if err := d.locateAll(b); err != nil {
		return err
	}
	for i := range d.pending {
		if len(d.pending[i]) == 0 {
			continue
		}
		if err := d.to.shards[i].add(d.pending[i], b); err != nil {
			return err
		}
	}
	return nil
}

func (d *Adder) locateAll(b *Batch) error {
	for i := range d.pending {
		d.pending[i] = d.pending[i][:0]
	}
	edge, half := d.to.lattice.edge, d.to.lattice.edge/2
	xs, ys, zs := b.X, b.Y[:len(b.X)], b.Z[:len(b.X)]
	for i := range xs {
		qx, qy, qz := math.Floor(xs[i]*QuantaPerMetre+0.5), math.Floor(ys[i]*QuantaPerMetre+0.5), math.Floor(zs[i]*QuantaPerMetre+0.5)
		// False for NaN too. Cell indices of such coordinates fit 32 bits.
		const reach = MinSpacingM * QuantaPerMetre * math.MaxInt32
		if !(math.Abs(qx) < reach && math.Abs(qy) < reach && math.Abs(qz) < reach) {
			return fmt.Errorf("terrain: point (%g, %g, %g) is not on the Earth; check the file's CRS and units", xs[i], ys[i], zs[i])
		}
		cx, rx := d.split(qx, edge)
		cy, ry := d.split(qy, edge)
		cz, rz := d.split(qz, edge)
		a := d.to
		a.once.Do(func() {
			a.origin = Cell{int32(cx >> brickBits), int32(cy >> brickBits), int32(cz >> brickBits)}
		})
		bi := uint64(cx>>brickBits-int64(a.origin.I)) + 1<<(brickBitsIJ-1)
		bj := uint64(cy>>brickBits-int64(a.origin.J)) + 1<<(brickBitsIJ-1)
		bk := uint64(cz>>brickBits-int64(a.origin.K)) + 1<<(brickBitsK-1)
		if bi>>brickBitsIJ != 0 || bj>>brickBitsIJ != 0 || bk>>brickBitsK != 0 {
			return a.tooFar(xs[i], ys[i], zs[i])
		}
		key := bk<<(2*brickBitsIJ) | bj<<brickBitsIJ | bi
		const low = 1<<brickBits - 1
		cell := uint16((cz&low)<<(2*brickBits) | (cy&low)<<brickBits | cx&low)
		s := shardOf(key)
		d.pending[s] = append(d.pending[s], located{key, int32(rx - half), int32(ry - half), int32(rz - half), cell, uint16(i)})
	}
	return nil
}

// split returns the cell index of a coordinate in whole quanta and its offset
// from the cell's lower face.
func (d *Adder) split(q float64, edge int64) (cell, offset int64) {
	c := int64(math.Floor(q * d.inverse))
	r := int64(q) - c*edge
	// The product can be off by one cell next to a face.
	if r < 0 {
		c--
		r += edge
	} else if r >= edge {
		c++
		r -= edge
	}
	return c, r
}

func (a *Accumulator) tooFar(x, y, z float64) error {
	return fmt.Errorf("terrain: point (%.3f, %.3f, %.3f) lies more than %.0f km from, or %.1f km above or below, the first point, too far for a spacing of %g m; take out the stray point, crop, or give a larger spacing",
		x, y, z, a.lattice.SpacingM()*float64(int(1)<<(brickBitsIJ+brickBits-1))/1000,
		a.lattice.SpacingM()*float64(int(1)<<(brickBitsK+brickBits-1))/1000, a.lattice.SpacingM())
}

// shardOf spreads neighbouring bricks over all shards.
func shardOf(brick uint64) int {
	return int(brick * 0x9E3779B97F4A7C15 >> (64 - shardBits))
}

// cellOf inverts the key of a brick and the place of a cell within it.
func (a *Accumulator) cellOf(brick uint64, cell int) Cell {
	const maskIJ, low = 1<<brickBitsIJ - 1, 1<<brickBits - 1
	axis := func(brick uint64, bits int, origin int32, cell int) int32 {
		return int32((int64(brick)-1<<(bits-1)+int64(origin))<<brickBits) + int32(cell&low)
	}
	return Cell{
		axis(brick&maskIJ, brickBitsIJ, a.origin.I, cell),
		axis(brick>>brickBitsIJ&maskIJ, brickBitsIJ, a.origin.J, cell>>brickBits),
		axis(brick>>(2*brickBitsIJ), brickBitsK, a.origin.K, cell>>(2*brickBits)),
	}
}

// Voxels returns the sums in the order of Cell.Compare and leaves the
// accumulator empty. No Adder may run meanwhile. As many goroutines as there
// are Adders share the work. The result does not depend on the order in which
// points came.
func (a *Accumulator) Voxels() *Voxels {
	var total int
	for i := range a.shards {
		total += a.shards[i].voxels
	}
	keys, refs := make([]uint64, 0, total), make([]uint32, 0, total)
	for i := range a.shards {
		s := &a.shards[i]
		s.each(func(brick uint64, cell int, at uint32) {
			keys = append(keys, sortKey(brick, cell))
			refs = append(refs, at<<shardBits|uint32(i))
		})
		// What is not needed any more makes room: memory peaks here.
		s.table, s.bricks = nil, arena[brick]{}
	}
	keys, refs = sortPairs(keys, refs)
	v := &Voxels{Lattice: a.lattice, Cells: make([]Cell, total), Moments: make([]Moments, total)}
	a.share(total, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			v.Cells[i] = a.cellOf(unsortKey(keys[i]))
			v.Moments[i] = *a.shards[refs[i]&(shards-1)].moments.at(refs[i] >> shardBits)
		}
	})
	for i := range a.shards {
		a.shards[i].moments = arena[Moments]{}
	}
	a.gatherAttributes(v, refs)
	for i := range a.shards {
		a.shards[i].init(a)
	}
	return v
}

// share calls f for parts of [0, n), one for each Adder, at the same time.
// Gathering mostly waits for memory, which goroutines can do side by side.
func (a *Accumulator) share(n int, f func(lo, hi int)) {
	parts := max(1, int(a.adders.Load()))
	var wg sync.WaitGroup
	for p := range parts {
		wg.Go(func() { f(n*p/parts, n*(p+1)/parts) })
	}
	wg.Wait()
}

// sortKey orders cells as Cell.Compare does.
func sortKey(brick uint64, cell int) uint64 {
	const maskIJ, low = 1<<brickBitsIJ - 1, 1<<brickBits - 1
	i := (brick&maskIJ)<<brickBits | uint64(cell&low)
	j := (brick>>brickBitsIJ&maskIJ)<<brickBits | uint64(cell>>brickBits&low)
	k := brick>>(2*brickBitsIJ)<<brickBits | uint64(cell>>(2*brickBits))
	return k<<(2*(brickBitsIJ+brickBits)) | j<<(brickBitsIJ+brickBits) | i
}

func unsortKey(key uint64) (brick uint64, cell int) {
	const bits = brickBitsIJ + brickBits
	const mask, low = 1<<bits - 1, 1<<brickBits - 1
	i, j, k := key&mask, key>>bits&mask, key>>(2*bits)
	return k>>brickBits<<(2*brickBitsIJ) | j>>brickBits<<brickBitsIJ | i>>brickBits,
		int(k&low<<(2*brickBits) | j&low<<brickBits | i&low)
}

func (a *Accumulator) gatherAttributes(v *Voxels, refs []uint32) {
	n := len(refs)
	if a.columns.Has(Intensity) {
		v.Intensity = make([]uint64, n)
		a.share(n, func(lo, hi int) {
			for i, r := range refs[lo:hi] {
				v.Intensity[lo+i] = *a.shards[r&(shards-1)].intensity.at(r >> shardBits)
			}
		})
	}
	if a.columns.Has(Color) {
		v.Red, v.Green, v.Blue = make([]uint64, n), make([]uint64, n), make([]uint64, n)
		a.share(n, func(lo, hi int) {
			for i, r := range refs[lo:hi] {
				c := a.shards[r&(shards-1)].colour.at(r >> shardBits)
				v.Red[lo+i], v.Green[lo+i], v.Blue[lo+i] = c[0], c[1], c[2]
			}
		})
	}
	if a.columns.Has(Class) {
		v.Classes = make([]ClassCount, 0, n) // most voxels have one class
		for i, r := range refs {
			v.Classes = a.shards[r&(shards-1)].appendClasses(v.Classes, int32(i), r>>shardBits)
		}
		if len(v.Classes) == 0 {
			v.Classes = nil
		}
	}
}

// SumPoints is a convenience for small sets: the voxels of the given points.
func SumPoints(l Lattice, points []r3.Vec) (*Voxels, error) {
	a := NewAccumulator(l, 0)
	d := a.NewAdder()
	b := NewBatch(BatchPoints, 0)
	for len(points) > 0 {
		n := min(len(points), BatchPoints)
		b.Resize(n)
		for i, p := range points[:n] {
			b.X[i], b.Y[i], b.Z[i] = p.X, p.Y, p.Z
		}
		if err := d.Add(b); err != nil {
			return nil, err
		}
		points = points[n:]
	}
	return a.Voxels(), nil
}
