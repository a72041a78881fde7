package export

import (
	"math"
	"slices"

	"ledgework/terrain"
)

// A vertex is a corner of an outline in the working CRS, in metres.
type vertex struct {
	E, N, H float64
}

// A ring is closed: its last vertex is its first.
type ring []vertex

// A shape is the plan outline of a set of voxels: polygons that don't overlap
// and touch at most in corners, each an outer ring, counter-clockwise, followed
// by its holes, clockwise. No ring visits a corner twice.
type shape [][]ring

// An outliner makes plan outlines of sets of voxels. It reuses its arrays and
// is used by one goroutine at a time.
type outliner struct {
	voxels *terrain.Voxels
	tracer tracer
}

// maxSurveyCells bounds the cells of a survey's outline: 128 × 128 show the
// shape of a survey at the size of a page.
const maxSurveyCells = 1 << 14

// survey is the outline of all voxels, coarsened by halves until at most
// maxSurveyCells plan cells are left. See outline for dense.
func (o *outliner) survey(dense bool) shape {
	t := &o.tracer
	t.cells = t.cells[:0]
	for i := range o.voxels.Cells {
		t.cells = append(t.cells, o.planCell(i))
	}
	t.merge()
	edge := o.voxels.Lattice.Quanta()
	for len(t.cells) > maxSurveyCells {
		edge *= 2
		for i := range t.cells {
			c := &t.cells[i]
			c.key = planKey(c.i()>>1, c.j()>>1)
		}
		t.merge()
	}
	return t.trace(edge, dense)
}

// outline is the outline of the given voxels: with straight edges as long as
// maxRun allows, or dense, with a vertex at every cell.
func (o *outliner) outline(voxels []int32, dense bool) shape {
	t := &o.tracer
	t.cells = t.cells[:0]
	for _, v := range voxels {
		t.cells = append(t.cells, o.planCell(int(v)))
	}
	t.merge()
	return t.trace(o.voxels.Lattice.Quanta(), dense)
}

// planCell is the plan cell of a voxel, with the height of its mean.
func (o *outliner) planCell(i int) planCell {
	c := o.voxels.Cells[i]
	return planCell{
		key:    planKey(int64(c.I), int64(c.J)),
		height: int64(math.Round(o.voxels.Mean(i).Z * terrain.QuantaPerMetre)),
		n:      1,
	}
}

// maxRun is the number of cells that a straight edge may span without a
// vertex. A straight line of length L in a conformal plane bows from the
// straight line in longitude and latitude by about L²·tan(latitude)/(8·R). At
// tan = 6, latitude 80.5°, that stays below a tenth of a cell up to
// L = sqrt(0.8·R·cell/6), so no ring can cross its neighbour one cell away.
func maxRun(edge int64) int64 {
	const earthRadiusM, tanLatitude = 6.371e6, 6.0
	cell := float64(edge) / terrain.QuantaPerMetre
	return max(1, int64(math.Sqrt(0.8*earthRadiusM*cell/tanLatitude)/cell))
}

// A planCell is a column of voxels seen from above.
type planCell struct {
	key    uint64 // see planKey
	height int64  // sum of voxel heights, in quanta: integers add up in any order
	n      int64  // voxels summed
}

// planBias makes the halves of a key unsigned with their order kept.
const planBias = 1 << 31

// planKey orders plan cells by J, then I.
func planKey(i, j int64) uint64 {
	return uint64(j+planBias)<<32 | uint64(i+planBias)
}

func (c planCell) i() int64 { return int64(c.key&math.MaxUint32) - planBias }
func (c planCell) j() int64 { return int64(c.key>>32) - planBias }

// A tracer walks the boundary of a set of plan cells.
type tracer struct {
	cells        []planCell // sorted by key, without duplicates
	south, north []int32    // index of that neighbour, or -1
	parent       []int32    // forest of 4-connected cells
	done         []uint8    // bit d: the side with direction d was walked
	corners      []corner
}

// The directions of walking a side with its cell on the left.
const (
	eastward  = iota // along the south side
	northward        // along the east side
	westward         // along the north side
	southward        // along the west side
)

// A corner is a place on the lattice.
type corner struct {
	i, j   int64
	saddle bool // two cells of the set touch here by their corners only
}

// merge sorts the cells and sums those of the same place.
func (t *tracer) merge() {
	slices.SortFunc(t.cells, func(a, b planCell) int {
		switch {
		case a.key < b.key:
			return -1
		case a.key > b.key:
			return 1
		}
		return 0
	})
	n := 0
	for _, c := range t.cells {
		if n > 0 && t.cells[n-1].key == c.key {
			t.cells[n-1].height += c.height
			t.cells[n-1].n += c.n
			continue
		}
		t.cells[n] = c
		n++
	}
	t.cells = t.cells[:n]
}

// find returns the index of the cell with the key, or -1.
func (t *tracer) find(key uint64) int32 {
	i := t.lowerBound(key)
	if i < len(t.cells) && t.cells[i].key == key {
		return int32(i)
	}
	return -1
}

func (t *tracer) lowerBound(key uint64) int {
	lo, hi := 0, len(t.cells)
	for lo < hi {
		mid := int(uint(lo+hi) >> 1)
		if t.cells[mid].key < key {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return lo
}

// trace returns the outline of the cells, which have the given edge in quanta,
// with a vertex at every turn and at least every maxRun cells, or dense, at
// every cell. Polygons have the order of their first cells.
func (t *tracer) trace(edge int64, dense bool) shape {
	run := maxRun(edge)
	if dense {
		run = 1
	}
	t.link()
	var out shape
	polygonOf := make(map[int32]int) // root of the component to its place in out
	for c := range t.cells {
		for d := range 4 {
			if t.done[c]&(1<<d) != 0 || t.neighbour(int32(c), d+3) >= 0 {
				continue
			}
			p, ok := polygonOf[t.root(int32(c))]
			if !ok {
				// The side met first is that of the lowest, then westernmost
				// cell, so it is on the outer ring and a polygon starts with it.
				p = len(out)
				out = append(out, make([]ring, 1))
				polygonOf[t.root(int32(c))] = p
			}
			t.walk(int32(c), d, run)
			for _, loop := range simpleLoops(t.corners) {
				if r := t.place(loop, edge); turnsLeft(loop) {
					out[p][0] = r
				} else {
					out[p] = append(out[p], r)
				}
			}
		}
	}
	return out
}

// link finds the neighbours of all cells and joins the 4-connected ones.
func (t *tracer) link() {
	n := len(t.cells)
	t.south, t.north = resize(t.south, n), resize(t.north, n)
	t.parent, t.done = resize(t.parent, n), resize(t.done, n)
	for i := range n {
		t.south[i], t.north[i], t.parent[i], t.done[i] = -1, -1, int32(i), 0
	}
	below := 0
	for i, c := range t.cells {
		if i > 0 && t.cells[i-1].key+1 == c.key {
			t.join(int32(i-1), int32(i))
		}
		if c.key < 1<<32 {
			continue
		}
		for t.cells[below].key < c.key-1<<32 {
			below++
		}
		if t.cells[below].key == c.key-1<<32 {
			t.south[i], t.north[below] = int32(below), int32(i)
			t.join(int32(below), int32(i))
		}
	}
}

func resize[T any](s []T, n int) []T { return slices.Grow(s[:0], n)[:n] }

func (t *tracer) root(c int32) int32 {
	for t.parent[c] != c {
		t.parent[c] = t.parent[t.parent[c]]
		c = t.parent[c]
	}
	return c
}

func (t *tracer) join(a, b int32) {
	a, b = t.root(a), t.root(b)
	t.parent[max(a, b)] = min(a, b)
}

// neighbour is the cell next to c in direction d, counted modulo 4, or -1.
func (t *tracer) neighbour(c int32, d int) int32 {
	switch d & 3 {
	case eastward:
		if int(c)+1 < len(t.cells) && t.cells[c+1].key == t.cells[c].key+1 {
			return c + 1
		}
	case northward:
		return t.north[c]
	case westward:
		if c > 0 && t.cells[c-1].key+1 == t.cells[c].key {
			return c - 1
		}
	case southward:
		return t.south[c]
	}
	return -1
}

// walk goes round the boundary that holds the side of cell c with direction d,
// its cells on the left, and leaves the corners in t.corners. Where two cells
// meet by their corners only it stays with its own cell, so that what it goes
// round is 4-connected.
func (t *tracer) walk(c int32, d int, run int64) {
	t.corners = t.corners[:0]
	first, firstDir, last := c, d, -1
	for {
		t.done[c] |= 1 << d
		at := t.start(c, d)
		if along := [2]int64{at.i, at.j}[d&1]; d != last || along%run == 0 {
			t.corners = append(t.corners, at)
		}
		last = d
		if ahead := t.neighbour(c, d); ahead < 0 {
			d = (d + 1) & 3
		} else if right := t.neighbour(ahead, d+3); right < 0 {
			c = ahead
		} else {
			c, d = right, (d+3)&3
		}
		if c == first && d == firstDir {
			break
		}
	}
	// The walk may have begun within a straight edge.
	if at := t.corners[0]; last == firstDir && [2]int64{at.i, at.j}[firstDir&1]%run != 0 {
		t.corners = t.corners[1:]
	}
	for i := range t.corners {
		at := &t.corners[i]
		sw, se, nw, ne := t.around(at.i, at.j)
		at.saddle = (sw >= 0) == (ne >= 0) && (se >= 0) == (nw >= 0) && (sw >= 0) != (se >= 0)
	}
}

// start is the corner at which the side of cell c with direction d begins.
func (t *tracer) start(c int32, d int) corner {
	at := corner{i: t.cells[c].i(), j: t.cells[c].j()}
	if d == northward || d == westward {
		at.i++
	}
	if d == westward || d == southward {
		at.j++
	}
	return at
}

// around are the cells that meet in a corner, each -1 if not in the set.
func (t *tracer) around(i, j int64) (sw, se, nw, ne int32) {
	sw, se = t.find(planKey(i-1, j-1)), t.find(planKey(i, j-1))
	nw, ne = t.find(planKey(i-1, j)), t.find(planKey(i, j))
	return sw, se, nw, ne
}

// simpleLoops splits a closed walk where it comes back to a saddle: the parts
// visit no corner twice. Parts share the array of corners or own theirs.
func simpleLoops(corners []corner) [][]corner {
	var loops [][]corner
	var stack []corner
	at := make(map[[2]int64]int) // place of a saddle on the stack
	for _, c := range corners {
		if c.saddle {
			key := [2]int64{c.i, c.j}
			if from, ok := at[key]; ok {
				loops = append(loops, slices.Clone(stack[from:]))
				for _, gone := range stack[from+1:] {
					delete(at, [2]int64{gone.i, gone.j})
				}
				stack = stack[:from+1]
				continue
			}
			at[key] = len(stack)
		}
		stack = append(stack, c)
	}
	return append(loops, stack)
}

// turnsLeft reports whether a simple loop is counter-clockwise.
func turnsLeft(loop []corner) bool {
	var twice int64
	for i, a := range loop {
		b := loop[(i+1)%len(loop)]
		twice += (a.i-loop[0].i)*(b.j-loop[0].j) - (b.i-loop[0].i)*(a.j-loop[0].j)
	}
	return twice > 0
}

// place turns a loop into a closed ring. The height of a vertex is the mean of
// the cells that meet in it.
func (t *tracer) place(loop []corner, edge int64) ring {
	r := make(ring, 0, len(loop)+1)
	for _, c := range loop {
		var sum, n int64
		sw, se, nw, ne := t.around(c.i, c.j)
		for _, cell := range [4]int32{sw, se, nw, ne} {
			if cell >= 0 {
				sum += t.cells[cell].height
				n += t.cells[cell].n
			}
		}
		r = append(r, vertex{
			E: float64(c.i*edge) / terrain.QuantaPerMetre,
			N: float64(c.j*edge) / terrain.QuantaPerMetre,
			H: float64(sum) / float64(n) / terrain.QuantaPerMetre,
		})
	}
	return append(r, r[0])
}
