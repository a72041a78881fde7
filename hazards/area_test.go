package hazards

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// areaOf sums columnArea over the voxels within the given distance of c, for a
// surface with unit normal n everywhere.
func areaOf(v *terrain.Voxels, n, c r3.Vec, within float64) float64 {
	x := terrain.NewIndex(v)
	in := func(i int) bool { return r3.Norm(r3.Sub(x.Mean(i), c)) <= within }
	var sum float64
	for i := range v.Cells {
		if in(i) {
			sum += columnArea(x, n, i, in)
		}
	}
	return sum
}

// The area of a disc on planes in all directions, smooth and noisy. Noise of
// the size of a voxel leaves gaps in some columns, which then count twice: 4 %
// at a fifth of the spacing, 17 % at four fifths, still far from the double and
// triple area of counting each voxel.
func TestColumnAreaOfPlanes(t *testing.T) {
	const g, radius = 0.1, 1.5
	want := math.Pi * radius * radius
	rng := rand.New(rand.NewPCG(1, 1))
	directions := []r3.Vec{{Z: 1}, {X: -1}, {Y: 1}, r3.Unit(r3.Vec{X: 1, Y: 1, Z: 1}), r3.Unit(r3.Vec{Y: -1, Z: 1})}
	for range 10 {
		directions = append(directions, randomDirection(rng))
	}
	for _, c := range []struct{ noise, single, mean float64 }{
		// The rim, of which half a voxel is in doubt: 2·(g/2)/radius of the area.
		{0, g / radius, 0.03},
		{0.02, g/radius + 0.04, 0.05},
		{0.08, g/radius + 0.30, 0.20},
	} {
		noise := c.noise
		var ratio float64
		for _, n := range directions {
			o := r3.Vec{X: 431000.33, Y: 5411000.27, Z: 100.11}
			points := sheet(rng, o, n, 1.7, 1.7, g/5, func(a, b float64) (float64, bool) { return noise * rng.NormFloat64(), true })
			got := areaOf(voxelise(t, g, points), n, o, radius)
			if math.Abs(got/want-1) > c.single {
				t.Errorf("noise %g, normal %.2f: area %.3f, want %.3f", noise, n, got, want)
			}
			ratio += got / want / float64(len(directions))
		}
		if math.Abs(ratio-1) > c.mean {
			t.Errorf("noise %g: area %.3f of the true one on average", noise, ratio)
		}
	}
}

// An elevation grid fills one voxel a column, however steep: the area is g²/cos
// of the slope up to 45°, beyond which columns along east or north are counted.
func TestColumnAreaOfElevationGrid(t *testing.T) {
	const g = 1.0
	for _, deg := range []float64{0, 10, 30, 44} {
		tan := math.Tan(deg * math.Pi / 180)
		var points []r3.Vec
		for i := range 40 {
			for k := range 40 {
				points = append(points, r3.Vec{X: float64(i) + 0.5, Y: float64(k) + 0.5, Z: tan * float64(k)})
			}
		}
		got := areaOf(voxelise(t, g, points), leaning(deg, 180), r3.Vec{X: 20, Y: 20}, 1000)
		want := 1600 / math.Cos(deg*math.Pi/180)
		near(t, fmt.Sprintf("area at %g°", deg), got, want, 1e-9*want)
	}
}

// Layers that touch share the area of their column; a gap starts another
// surface; what is not in the set does not count.
func TestColumnAreaLayers(t *testing.T) {
	l, err := terrain.NewLattice(0.5)
	if err != nil {
		t.Fatal(err)
	}
	v := &terrain.Voxels{Lattice: l}
	for _, k := range []int32{0, 1, 2, 5} {
		var m terrain.Moments
		m.AddPoint(0, 0, 0)
		v.Cells, v.Moments = append(v.Cells, terrain.Cell{K: k}), append(v.Moments, m)
	}
	x := terrain.NewIndex(v)
	all := func(int) bool { return true }
	up, slant := r3.Vec{Z: -1}, r3.Unit(r3.Vec{X: 3, Z: 4})
	for _, c := range []struct {
		name  string
		n     r3.Vec
		voxel int
		in    func(int) bool
		want  float64
	}{
		{"one of three layers", up, 0, all, 0.25 / 3},
		{"the middle of three", up, 1, all, 0.25 / 3},
		{"beyond a gap", up, 3, all, 0.25},
		{"neighbour not in the set", up, 2, func(i int) bool { return i != 1 }, 0.25},
		{"slanting", slant, 3, all, 0.25 / 0.8},
		{"along another axis", r3.Vec{X: 1}, 1, all, 0.25},
		{"without a normal", r3.Vec{}, 1, all, fit.CellArea(0.5, r3.Vec{})},
	} {
		near(t, c.name, columnArea(x, c.n, c.voxel, c.in), c.want, 1e-15)
	}
}
