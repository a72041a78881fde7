package hazards

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// coverageAt is the coverage of the disc of the given radius at the origin of
// points on a plane through it.
func coverageAt(t *testing.T, g, radius float64, n r3.Vec, points []r3.Vec) float64 {
	t.Helper()
	s := newGround(t, g, radius, n, points)
	j := newJudge(s.surface, s.planes, nil, lenient(radius))
	u, w := frame(n)
	var o occupancy
	for i := range s.surface.Voxels.Len() {
		m := s.surface.Index.Mean(i)
		if r3.Norm(m) > j.grid.reach {
			continue
		}
		j.grid.mark(&o, r3.Dot(u, m), r3.Dot(w, m))
	}
	return j.grid.share(&o).value
}

// A fully scanned plane is covered whatever its direction, densely scanned or
// at the least density that the automatic spacing allows: 2.25 points per cell.
func TestCoverageOfWholePlanes(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const g, radius = 0.05, 0.5
	directions := []r3.Vec{{Z: 1}, {X: 1}, {Y: -1}, r3.Unit(r3.Vec{X: 1, Y: 1, Z: 1}), r3.Unit(r3.Vec{X: 1, Z: 1})}
	for range 20 {
		directions = append(directions, randomDirection(rng))
	}
	sparse := 0.0
	for _, n := range directions {
		if c := coverageAt(t, g, radius, n, sheet(rng, r3.Vec{}, n, 0.7, 0.7, g/6, flat)); c != 1 {
			t.Errorf("normal %v: dense plane covers %g", n, c)
		}
		c := coverageAt(t, g, radius, n, sheet(rng, r3.Vec{}, n, 0.7, 0.7, g/1.5, flat))
		if c < 0.96 {
			t.Errorf("normal %v: plane at the least density covers %g", n, c)
		}
		sparse += c / float64(len(directions))
	}
	if sparse < 0.99 {
		t.Errorf("planes at the least density cover %g on average", sparse)
	}
}

// The bound that the rule rests on: every point of a plane is within √3/2
// spacings of the mean of its own voxel's piece, less than the 1 that a block
// has room for.
func TestCoverageBound(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const g = 0.05
	worst := 0.0
	for range 25 {
		n := randomDirection(rng)
		o := r3.Vec{X: g * rng.Float64(), Y: g * rng.Float64(), Z: g * rng.Float64()}
		points := sheet(rng, o, n, 0.3, 0.3, g/30, flat)
		v := voxelise(t, g, points)
		for _, p := range points {
			// Away from the sheet's edge, which cuts pieces short.
			if r3.Norm(r3.Sub(p, o)) > 0.2 {
				continue
			}
			i := v.Find(v.Lattice.CellOf(p))
			worst = max(worst, r3.Norm(r3.Sub(p, v.Mean(i)))/g)
		}
	}
	// The mean of a piece is known to a few thousandths of the spacing.
	if worst > math.Sqrt(3)/2+0.02 {
		t.Errorf("a point lies %g spacings from its piece's mean", worst)
	}
}

// Missing parts count for what they are, less half a cell along each edge.
func TestCoverageOfParts(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const g, radius = 0.05, 0.5
	for _, c := range []struct {
		name string
		has  func(a, b float64) bool
		want float64
		tol  float64
	}{
		{"half", func(a, b float64) bool { return a < 0 }, 0.5, 0.05},
		{"other half", func(a, b float64) bool { return b > 0 }, 0.5, 0.05},
		{"oblique half", func(a, b float64) bool { return a < 0.7*b }, 0.5, 0.05},
		{"quarter", func(a, b float64) bool { return a < 0 && b < 0 }, 0.25, 0.05},
		{"hole of a third", func(a, b float64) bool { return math.Hypot(a, b) > radius/3 }, 8. / 9, 0.04},
		{"slit of one cell", func(a, b float64) bool { return math.Abs(a) > g/2 }, 1, 0.02},
		{"slit of three cells", func(a, b float64) bool { return math.Abs(a) > 1.5*g }, 1 - 2*(3-1)*g*radius/(math.Pi*radius*radius), 0.03},
		{"slit of five cells", func(a, b float64) bool { return math.Abs(a) > 2.5*g }, 1 - 2*(5-1)*g*radius/(math.Pi*radius*radius), 0.04},
		{"nothing but a point", func(a, b float64) bool { return math.Hypot(a, b) < g/2 }, 0, 0.03},
	} {
		sum := 0.0
		const directions = 12
		for range directions {
			n := randomDirection(rng)
			got := coverageAt(t, g, radius, n, sheet(rng, r3.Vec{}, n, 0.7, 0.7, g/5, func(a, b float64) (float64, bool) { return 0, c.has(a, b) }))
			near(t, c.name, got, c.want, c.tol+0.02)
			sum += got / directions
		}
		near(t, c.name+", mean", sum, c.want, c.tol)
	}
}

// An elevation grid has one sample per column, however steep the ground.
func TestCoverageOfElevationGrid(t *testing.T) {
	const g, radius = 1.0, 10.0
	for _, lean := range []float64{0, 10, 30, 45, 55, 59} {
		for _, dip := range []float64{0, 20, 45, 77} {
			n := leaning(lean, dip)
			var points []r3.Vec
			for i := -14; i < 14; i++ {
				for j := -14; j < 14; j++ {
					x, y := (float64(i)+0.5)*g, (float64(j)+0.5)*g
					points = append(points, r3.Vec{X: x, Y: y, Z: -(n.X*x + n.Y*y) / n.Z})
				}
			}
			if c := coverageAt(t, g, radius, n, points); c < 0.99 {
				t.Errorf("%g° towards %g°: elevation grid covers %g", lean, dip, c)
			}
		}
	}
	// Steeper, the samples are too far apart along the dip.
	n := leaning(80, 0)
	var points []r3.Vec
	for i := -14; i < 14; i++ {
		for j := -14; j < 14; j++ {
			x, y := (float64(i)+0.5)*g, (float64(j)+0.5)*g
			points = append(points, r3.Vec{X: x, Y: y, Z: -(n.X*x + n.Y*y) / n.Z})
		}
	}
	if c := coverageAt(t, g, radius, n, points); c > 0.7 {
		t.Errorf("80°: elevation grid covers %g", c)
	}
}

func TestCoverageGridSizes(t *testing.T) {
	for _, c := range []struct{ r, g float64 }{{0.4, 0.05}, {0.6, 0.6}, {0.4, 10}, {1.5, 0.01}, {30, 1}, {1, 1.0 / 31}, {1, 0.0332}} {
		grid := newCoverageGrid(c.r, c.g)
		if grid.half < 1 || 2*grid.half > maxCoverageRows || grid.cell < c.g {
			t.Errorf("radius %g, spacing %g: %d rows of %g m", c.r, c.g, 2*grid.half, grid.cell)
		}
		area := float64(grid.cells) * grid.cell * grid.cell
		if c.r > 3*c.g {
			near(t, "area of the disc", area/(math.Pi*c.r*c.r), 1, 0.05)
		}
		// Nothing marked, nothing covered; all marked, all covered.
		var o occupancy
		if e := grid.share(&o); e.value != 0 || e.sigma != 0 {
			t.Errorf("radius %g, spacing %g: empty grid covers %v", c.r, c.g, e)
		}
		for i := range o {
			o[i] = ^uint64(0)
		}
		if e := grid.share(&o); grid.cells > 0 && (e.value != 1 || e.sigma != 0) {
			t.Errorf("radius %g, spacing %g: full grid covers %v", c.r, c.g, e)
		}
	}
}

// share works on words; the rule as written, cell by cell, is its oracle.
func TestCoverageRule(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, size := range []struct{ r, g float64 }{{0.5, 0.05}, {0.5, 0.01}, {0.5, 0.2}} {
		grid := newCoverageGrid(size.r, size.g)
		n := 2 * grid.half
		for _, density := range []float64{0.1, 0.3, 0.5} {
			var o occupancy
			for j := range n {
				for i := range n {
					if rng.Float64() < density {
						grid.mark(&o, (float64(i-grid.half)+rng.Float64())*grid.cell, (float64(j-grid.half)+rng.Float64())*grid.cell)
					}
				}
			}
			has := func(i, j int) bool { return o[j]>>i&1 != 0 }
			disc, held := 0, 0
			for j := 1; j < n-1; j++ {
				for i := 1; i < n-1; i++ {
					if math.Hypot(float64(i-grid.half)+0.5, float64(j-grid.half)+0.5)*grid.cell > size.r {
						continue
					}
					disc++
					missing := false
					for _, b := range [][2]int{{i, j}, {i - 1, j}, {i, j - 1}, {i - 1, j - 1}} {
						missing = missing || !has(b[0], b[1]) && !has(b[0]+1, b[1]) && !has(b[0], b[1]+1) && !has(b[0]+1, b[1]+1)
					}
					if !missing {
						held++
					}
				}
			}
			want := float64(held) / float64(disc)
			got := grid.share(&o)
			near(t, "share", got.value, want, 1e-12)
			near(t, "sigma", got.sigma, math.Sqrt(want*(1-want)*4/float64(disc)), 1e-12)
		}
	}
}
