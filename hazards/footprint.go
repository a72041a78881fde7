package hazards

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// tileRadii is a tile's edge in footprint radii. Gathering a tile's voxels with
// a halo of about 1.6 radii is spread over the footprints in it; larger tiles
// fall out of the cache.
const tileRadii = 2

// maxTileCells keeps the cells of a tile and its halo well within int32.
const maxTileCells = 1 << 20

// tiles groups voxels by tile, both in the order of the voxels. A tile is a cube
// of cells whose place on the lattice does not depend on what else there is.
func (j *judge) tiles(voxels []int32) [][]int32 {
	index := map[terrain.Cell]int{}
	var tiles [][]int32
	for _, v := range voxels {
		t := j.tileOf(v)
		n, ok := index[t]
		if !ok {
			n = len(tiles)
			tiles = append(tiles, nil)
			index[t] = n
		}
		tiles[n] = append(tiles[n], v)
	}
	return tiles
}

func (j *judge) tileOf(v int32) terrain.Cell {
	c := j.voxels.Cells[v]
	return terrain.Cell{I: floorDiv(c.I, j.tileCells), J: floorDiv(c.J, j.tileCells), K: floorDiv(c.K, j.tileCells)}
}

func floorDiv(a, b int32) int32 {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

// A gathering holds the voxels around the footprints of one tile, sorted into
// square buckets of their mean plane so that those of a disc lie in few runs. It
// is one goroutine's, and reused from tile to tile.
type gathering struct {
	j      *judge
	origin r3.Vec // corner of the tile; other positions are relative to it

	normal, u, w r3.Vec // of the buckets' plane
	a0, b0       float64
	cols, rows   int
	first        []int32 // by bucket, and the end: index into voxels
	voxels       []gathered
	unsorted     []gathered
}

type gathered struct {
	at    r3.Vec
	voxel int32
}

// load gathers what the footprints of the queries, all of one tile, can hold.
func (g *gathering) load(queries []int32) {
	j := g.j
	l := j.voxels.Lattice
	t := j.tileOf(queries[0])
	g.origin = l.Corner(terrain.Cell{I: t.I * j.tileCells, J: t.J * j.tileCells, K: t.K * j.tileCells})

	box := terrain.EmptyExtent()
	var sum r3.Vec
	for _, v := range queries {
		c := j.centre(int(v))
		box.Add(c.X, c.Y, c.Z)
		sum = r3.Add(sum, j.planes.Normal[v])
	}
	g.normal = j.planes.Normal[queries[0]]
	if r3.Norm(sum) > 0.5 { // else any will do
		g.normal = r3.Unit(sum)
	}
	g.u, g.w = frame(g.normal)

	reach := math.Hypot(j.grid.reach, max(j.depth, j.radius))
	low := l.CellOf(r3.Vec{X: box.Min[0] - reach, Y: box.Min[1] - reach, Z: box.Min[2] - reach})
	high := l.CellOf(r3.Vec{X: box.Max[0] + reach, Y: box.Max[1] + reach, Z: box.Max[2] + reach})
	g.unsorted = g.unsorted[:0]
	for k := low.K; k <= high.K; k++ {
		for jj := low.J; jj <= high.J; jj++ {
			start, end := j.index.Row(jj, k, low.I, high.I)
			for v := start; v < end; v++ {
				g.unsorted = append(g.unsorted, gathered{r3.Sub(j.index.Mean(v), g.origin), int32(v)})
			}
		}
	}
	g.sort(l.SpacingM())
}

// sort puts what was gathered into buckets of the given edge.
func (g *gathering) sort(edge float64) {
	a1, b1 := math.Inf(-1), math.Inf(-1)
	g.a0, g.b0 = math.Inf(1), math.Inf(1)
	for i := range g.unsorted {
		a, b := r3.Dot(g.u, g.unsorted[i].at), r3.Dot(g.w, g.unsorted[i].at)
		g.a0, a1 = min(g.a0, a), max(a1, a)
		g.b0, b1 = min(g.b0, b), max(b1, b)
	}
	g.cols, g.rows = int((a1-g.a0)/edge)+1, int((b1-g.b0)/edge)+1
	buckets := g.cols * g.rows
	if cap(g.first) < buckets+1 {
		g.first = make([]int32, buckets+1)
	}
	g.first = g.first[:buckets+1]
	clear(g.first)
	if cap(g.voxels) < len(g.unsorted) {
		g.voxels = make([]gathered, len(g.unsorted))
	}
	g.voxels = g.voxels[:len(g.unsorted)]

	// A counting sort: count, sum to the ends, fill from the back.
	bucket := func(at r3.Vec) int {
		return int((r3.Dot(g.w, at)-g.b0)/edge)*g.cols + int((r3.Dot(g.u, at)-g.a0)/edge)
	}
	for i := range g.unsorted {
		g.first[bucket(g.unsorted[i].at)]++
	}
	for i := 1; i < len(g.first); i++ {
		g.first[i] += g.first[i-1]
	}
	for i := len(g.unsorted) - 1; i >= 0; i-- {
		at := bucket(g.unsorted[i].at)
		g.first[at]--
		g.voxels[g.first[at]] = g.unsorted[i]
	}
}

// A footprint is what a disc's voxels say of it.
type footprint struct {
	data    occupancy // of the disc and its margin
	stepM   float64   // largest height of a mean of the disc above the plane, at least 0
	highest int32     // the voxel that has it, or −1
	lateral float64   // its distance from the axis
}

// footprint looks at the disc on the plane of voxel v, one of the queries of
// the last load. If inside is not nil, the voxels of the disc are appended to
// it. Its arithmetic depends on v alone, not on what else was loaded.
func (g *gathering) footprint(v int, inside *[]int32) footprint {
	j := g.j
	n := j.planes.Normal[v]
	u, w := frame(n)
	c := r3.Sub(j.centre(v), g.origin)
	edge := j.voxels.Lattice.SpacingM()
	reach2, radius2 := j.grid.reach*j.grid.reach, j.radius*j.radius
	f := footprint{highest: -1}

	// Seen along the buckets' normal, the disc and what stands on it lie in a
	// circle, wider by the slant of its axis.
	slant := r3.Norm(r3.Cross(n, g.normal))
	reach := j.grid.reach + slant*max(j.depth, j.radius) + bucketSlack*edge
	a, b := r3.Dot(g.u, c)-g.a0, r3.Dot(g.w, c)-g.b0
	lastRow := min(g.rows-1, int((b+reach)/edge))
	for row := max(0, int((b-reach)/edge)); row <= lastRow; row++ {
		off := max(0, float64(row)*edge-b, b-float64(row+1)*edge)
		if off > reach {
			continue
		}
		half := math.Sqrt(reach*reach - off*off)
		from, to := max(0, int((a-half)/edge)), min(g.cols-1, int((a+half)/edge))
		if from > to {
			continue
		}
		run := g.voxels[g.first[row*g.cols+from]:g.first[row*g.cols+to+1]]
		for i := range run {
			d := r3.Sub(run[i].at, c)
			height := r3.Dot(n, d)
			if height < -j.depth || height > j.radius {
				continue
			}
			du, dw := r3.Dot(u, d), r3.Dot(w, d)
			lateral2 := du*du + dw*dw
			if lateral2 > reach2 {
				continue
			}
			j.grid.mark(&f.data, du, dw)
			if lateral2 > radius2 {
				continue
			}
			if inside != nil {
				*inside = append(*inside, run[i].voxel)
			}
			// Equal heights go to the earlier voxel, whatever the buckets' order.
			if height > f.stepM || height == f.stepM && run[i].voxel < f.highest {
				f.stepM, f.highest, f.lateral = height, run[i].voxel, math.Sqrt(lateral2)
			}
		}
	}
	return f
}

// bucketSlack widens a search, in spacings, by more than positions in a tile
// can be off by rounding.
const bucketSlack = 1e-6
