package hazards

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

// Voxels all over a cube with normals in all directions: a gathered tile must
// find what a look at every voxel finds, for each of its footprints.
func TestFootprintAgainstBruteForce(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	var points []r3.Vec
	for range 12000 {
		points = append(points, r3.Vec{X: 3*rng.Float64() - 1, Y: 3 * rng.Float64(), Z: 3 * rng.Float64()})
	}
	v := newGround(t, 0.1, 0.5, r3.Vec{Z: 1}, points)
	n := v.surface.Voxels.Len()
	planes := &fit.LocalPlanes{RadiusM: 0.5, Normal: make([]r3.Vec, n), Offset: make([]float64, n)}
	axes := []r3.Vec{{X: 1}, {Y: 1}, {Z: 1}, {X: -1}, {Y: -1}, {Z: -1}}
	for i := range n {
		planes.Normal[i] = randomDirection(rng)
		if i%10 == 0 {
			planes.Normal[i] = axes[i/10%len(axes)]
		}
		planes.Offset[i] = 0.2 * (rng.Float64() - 0.5)
	}
	j := newJudge(v.surface, planes, nil, lenient(0.5))
	j.depth = 0.2
	g := &gathering{j: j}
	var all []int32
	for i := range n {
		all = append(all, int32(i))
	}
	for at, tile := range j.tiles(all) {
		if at%9 != 0 {
			continue
		}
		g.load(tile)
		for _, v := range tile[:min(len(tile), 25)] {
			var got, want []int32
			f := g.footprint(int(v), &got)
			normal, c := planes.Normal[v], j.centre(int(v))
			step := 0.0
			marked := occupancy{}
			u, w := frame(normal)
			for i := range n {
				d := r3.Sub(j.index.Mean(i), c)
				h := r3.Dot(d, normal)
				lateral := r3.Norm(r3.Sub(d, r3.Scale(h, normal)))
				if h < -0.2 || h > 0.5 || lateral > j.grid.reach {
					continue
				}
				// By way of the tile's origin: on the edge of a cell, as the centre
				// always is, rounding decides.
				d = r3.Sub(r3.Sub(j.index.Mean(i), g.origin), r3.Sub(c, g.origin))
				j.grid.mark(&marked, r3.Dot(u, d), r3.Dot(w, d))
				if lateral <= 0.5 {
					want = append(want, int32(i))
					step = max(step, h)
				}
			}
			slices.Sort(got)
			if !slices.Equal(got, want) {
				t.Fatalf("voxel %d, normal %v: %d voxels, want %d", v, normal, len(got), len(want))
			}
			near(t, "step", f.stepM, step, 1e-12)
			if f.data != marked {
				t.Errorf("voxel %d: other cells marked", v)
			}
			// Loaded alone, bit for bit the same.
			alone := &gathering{j: j}
			alone.load([]int32{v})
			if f2 := alone.footprint(int(v), nil); f2 != f {
				t.Errorf("voxel %d: %v alone, %v in its tile", v, f2, f)
			}
		}
	}
}

// Equal heights must not let the order of buckets show.
func TestFootprintTies(t *testing.T) {
	var points []r3.Vec
	for i := range 40 {
		for k := range 40 {
			z := 0.0
			if i%8 == 3 && k%8 == 3 {
				z = 0.25
			}
			points = append(points, r3.Vec{X: float64(i) + 0.5, Y: float64(k) + 0.5, Z: z})
		}
	}
	g := newGround(t, 1, 6, r3.Vec{Z: 1}, points)
	for i := range g.planes.Normal { // level, so that heights are equal
		g.planes.Normal[i] = r3.Vec{Z: 1}
		g.planes.Offset[i] = g.surface.Index.Mean(i).Z
	}
	j := newJudge(g.surface, g.planes, nil, lenient(6))
	h := &gathering{j: j}
	for v := range g.surface.Voxels.Len() {
		var inside []int32
		h.load([]int32{int32(v)})
		f := h.footprint(v, &inside)
		want := int32(math.MaxInt32)
		for _, i := range inside {
			if g.surface.Index.Mean(int(i)).Z > 0.1 {
				want = min(want, i)
			}
		}
		if f.highest != want {
			t.Fatalf("voxel %d: highest %d, want %d", v, f.highest, want)
		}
	}
}

// The judgement of a voxel allocates nothing.
func TestFootprintAllocatesNothing(t *testing.T) {
	g, obstacles := rubble(t, 1)
	p, _ := Example("ledge")
	j := newJudge(g.surface, g.planes, obstacles, &p)
	var all []int32
	for i := range g.surface.Voxels.Len() {
		all = append(all, int32(i))
	}
	scores := make([]float64, len(all))
	h := &gathering{j: j}
	tiles := j.tiles(all)
	for _, tile := range tiles { // grow the working space
		h.load(tile)
	}
	if n := testing.AllocsPerRun(3, func() {
		for _, tile := range tiles {
			j.scoreTile(context.Background(), scores, tile, h)
		}
	}); n != 0 {
		t.Errorf("%g allocations", n)
	}
}
