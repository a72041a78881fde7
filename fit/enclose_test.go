package fit

import (
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// minimalStandard returns n triples of Park & Miller's generator x ← 48271·x
// mod 2³¹−1 from 1, as coordinates in (0, 1).
func minimalStandard(n int) []r3.Vec {
	const m = 1<<31 - 1
	x := uint64(1)
	next := func() float64 {
		v := float64(x) / m
		x = 48271 * x % m
		return v
	}
	next() // the seed itself is not used
	points := make([]r3.Vec, n)
	for i := range points {
		points[i] = r3.Vec{X: next(), Y: next(), Z: next()}
	}
	return points
}

func box(x, y, z float64) []r3.Vec {
	var p []r3.Vec
	for i := range 8 {
		s := func(bit int) float64 { return float64(i>>bit&1)*2 - 1 }
		p = append(p, r3.Vec{X: x * s(0), Y: y * s(1), Z: z * s(2)})
	}
	return p
}

func TestEnclosePublished(t *testing.T) {
	s3 := math.Sqrt(3)
	tests := []struct {
		name   string // and source
		points []r3.Vec
		centre r3.Vec
		axes   [3]float64
		volume float64
	}{
		{"cube, closed form", box(1, 1, 1), r3.Vec{}, [3]float64{s3, s3, s3}, 21.7655923708},
		{"box, closed form", box(1, 2, 3), r3.Vec{}, [3]float64{3 * s3, 2 * s3, s3}, 130.593554225},
		{"regular tetrahedron, closed form", []r3.Vec{{X: 1, Y: 1, Z: 1}, {X: 1, Y: -1, Z: -1}, {X: -1, Y: 1, Z: -1}, {X: -1, Y: -1, Z: 1}},
			r3.Vec{}, [3]float64{s3, s3, s3}, 21.7655923708},
		{"octahedron, closed form", []r3.Vec{{X: 1}, {X: -1}, {Y: 1}, {Y: -1}, {Z: 1}, {Z: -1}},
			r3.Vec{}, [3]float64{1, 1, 1}, 4.18879020479},
		{"corner simplex, R package cluster 2.1.4", []r3.Vec{{}, {X: 1}, {Y: 1}, {Z: 1}},
			r3.Vec{X: .25, Y: .25, Z: .25}, [3]float64{0.866025403784, 0.866025403784, 0.433012701892}, 1.36034952318},
		{"50 points of the minimal standard generator, R package cluster 2.1.4 and CGAL 5.5.1", minimalStandard(50),
			r3.Vec{X: 0.54648424661, Y: 0.498430274012, Z: 0.568564386684}, [3]float64{0.727036319859, 0.646518246652, 0.591213322467}, 1.16404485261},
	}
	for _, tt := range tests {
		e, gap, err := Enclose(tt.points, 0, 1e-9)
		if err != nil {
			t.Errorf("%s: %v", tt.name, err)
			continue
		}
		t.Logf("%s: %+v volume %.12g", tt.name, gap, e.Volume())
		if d := e.Volume()/tt.volume - 1; math.Abs(d) > 2e-9 {
			t.Errorf("%s: volume %.12g, want %.12g", tt.name, e.Volume(), tt.volume)
		}
		if d := r3.Norm(r3.Sub(e.Centre, tt.centre)); d > 2e-5 {
			t.Errorf("%s: centre %v, want %v", tt.name, e.Centre, tt.centre)
		}
		for i := range 3 {
			if math.Abs(e.SemiAxes[i]-tt.axes[i]) > 2e-5 {
				t.Errorf("%s: semi-axes %v, want %v", tt.name, e.SemiAxes, tt.axes)
			}
		}
	}
}

// checkEnclosed verifies what Enclose promises of any result.
func checkEnclosed(t *testing.T, name string, e Ellipsoid, gap Gap, points []r3.Vec, want float64) {
	t.Helper()
	for _, p := range points {
		if !e.Contains(p) {
			t.Errorf("%s: point %v at depth %v", name, p, e.Depth(p))
			break
		}
	}
	if !(gap.Volume <= want) {
		t.Errorf("%s: gap %+v, want at most %g, n %d axes %v", name, gap, want, len(points), e)
	}
	if !slices.IsSortedFunc(e.SemiAxes[:], func(a, b float64) int { return int(math.Copysign(1, b-a)) }) {
		t.Errorf("%s: semi-axes %v are not descending", name, e.SemiAxes)
	}
	if det := r3.Dot(e.Axes[0], r3.Cross(e.Axes[1], e.Axes[2])); math.Abs(det-1) > 1e-14 {
		t.Errorf("%s: determinant of axes %v", name, det)
	}
}

func randomPoints(rng *rand.Rand, n int, kind string) []r3.Vec {
	p := make([]r3.Vec, n)
	for i := range p {
		x, y, z := rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
		switch kind {
		case "normal":
			p[i] = r3.Vec{X: 3 * x, Y: y + x, Z: 0.5*z + y}
		case "cube":
			p[i] = r3.Vec{X: rng.Float64(), Y: 4 * rng.Float64(), Z: rng.Float64()}
		case "sphere":
			p[i] = r3.Unit(r3.Vec{X: x, Y: y, Z: z})
		case "lattice": // the corners of voxels of a bump
			a, b := 2*rng.Float64()-1, 2*rng.Float64()-1
			q := func(v float64) float64 { return math.Round(20*v) / 20 }
			p[i] = r3.Vec{X: q(a), Y: q(b), Z: q(0.5 * max(0, 1-a*a-b*b))}
		case "thin":
			p[i] = r3.Vec{X: 3 * x, Y: y, Z: 1e-5 * z}
		}
	}
	return p
}

func TestEncloseRandom(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, kind := range []string{"normal", "cube", "sphere", "lattice", "thin"} {
		most := 0
		for _, n := range []int{4, 5, 10, 50, 1000, 5000} {
			for _, offset := range []r3.Vec{{}, {X: 500000, Y: 5200000, Z: 1500}} {
				p := randomPoints(rng, n, kind)
				for i := range p {
					p[i] = r3.Add(p[i], offset)
				}
				e, gap, err := Enclose(p, 0, 1e-6)
				if errors.Is(err, ErrFlat) && kind == "lattice" && n < 10 {
					continue
				}
				if err != nil {
					t.Errorf("%s %d: %v", kind, n, err)
					continue
				}
				most = max(most, gap.Steps)
				checkEnclosed(t, kind, e, gap, p, 1.1e-6)
			}
		}
		t.Logf("%s: at most %d steps", kind, most)
	}
}

func TestEncloseOnFace(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, kind := range []string{"normal", "cube", "lattice"} {
		most := 0
		for _, n := range []int{4, 10, 100, 1000} {
			p := randomPoints(rng, n, kind)
			origin := r3.Vec{X: 0.3, Y: -0.2, Z: -0.1}
			normal := r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}
			e, gap, err := EncloseOnFace(p, origin, normal, 0, 1e-6)
			if err != nil {
				t.Errorf("%s %d: %v", kind, n, err)
				continue
			}
			most = max(most, gap.Steps)
			u := r3.Unit(normal)
			mirrored := slices.Clone(p)
			for _, v := range p {
				mirrored = append(mirrored, r3.Sub(v, r3.Scale(2*r3.Dot(u, r3.Sub(v, origin)), u)))
			}
			checkEnclosed(t, kind, e, gap, p, 1.1e-6)
			full, fullGap, err := Enclose(mirrored, 0, 1e-6)
			if err != nil {
				t.Fatal(err)
			}
			if d := e.Volume()/full.Volume() - 1; math.Abs(d) > 2e-6 {
				t.Errorf("%s %d: volume %v, of the mirrored set %v (%+v)", kind, n, e.Volume(), full.Volume(), fullGap)
			}
			if d := math.Abs(r3.Dot(u, r3.Sub(e.Centre, origin))); d > 1e-14 {
				t.Errorf("%s %d: centre %g off the face", kind, n, d)
			}
			if !slices.ContainsFunc(e.Axes[:], func(a r3.Vec) bool { return a == u || a == r3.Scale(-1, u) }) {
				t.Errorf("%s %d: no axis of %v is the normal %v", kind, n, e.Axes, u)
			}
		}
		t.Logf("%s: at most %d steps", kind, most)
	}
}

func BenchmarkEnclose1000(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, kind := range []string{"normal", "cube", "sphere", "lattice"} {
		p := randomPoints(rng, 1000, kind)
		b.Run(kind, func(b *testing.B) {
			b.ReportAllocs()
			var steps int
			for b.Loop() {
				_, gap, err := Enclose(p, 0, 1e-6)
				if err != nil || gap.Volume > 1.1e-6 {
					b.Fatal(gap, err)
				}
				steps = gap.Steps
			}
			b.ReportMetric(float64(steps), "steps")
		})
	}
	p := randomPoints(rng, 1000, "lattice")
	b.Run("face", func(b *testing.B) {
		b.ReportAllocs()
		for b.Loop() {
			if _, gap, err := EncloseOnFace(p, r3.Vec{}, r3.Vec{Z: 1}, 0, 1e-6); err != nil || gap.Volume > 1.1e-6 {
				b.Fatal(gap, err)
			}
		}
	})
}
