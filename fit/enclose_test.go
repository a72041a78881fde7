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

// Data sets of R's packages datasets and cluster, and a scan of the Point Cloud
// Library, with values by R package cluster 2.1.4 and an independent solver;
// CGAL 5.5.1 agrees on the three-dimensional ones within its epsilon.
func TestEncloseDataSets(t *testing.T) {
	tests := []struct {
		file   string
		count  int
		centre r3.Vec
		axes   [3]float64
		volume float64
	}{
		{"trees.txt", 31, r3.Vec{X: 13.977342412, Y: 76.396073648, Z: 34.758994161},
			[3]float64{46.063576222, 12.799901006, 1.866916289}, 4610.81521193},
		{"iris3.txt", 150, r3.Vec{X: 5.87492565, Y: 3.04589412, Z: 3.85107727},
			[3]float64{4.4948913665, 1.7589126858, 0.7233065742}, 23.9538046247},
		{"stackloss3.txt", 21, r3.Vec{},
			[3]float64{22.140128891, 10.368679143, 3.606623046}, 3468.11063353},
		{"bun0.txt", 397, r3.Vec{X: -0.03865688724, Y: 0.105744350675, Z: 0.005675507309},
			[3]float64{0.121533113674, 0.081477770026, 0.052571542663}, 0.00218058534678},
	}
	for _, tt := range tests {
		points := readPoints(t, dataFile(t, "reference/"+tt.file))
		if len(points) != tt.count {
			t.Errorf("%s: %d points, want %d", tt.file, len(points), tt.count)
		}
		e, gap, err := Enclose(points, 0, 1e-10)
		if err != nil {
			t.Errorf("%s: %v", tt.file, err)
			continue
		}
		checkEnclosed(t, tt.file, e, gap, points, 1.1e-10)
		near(t, tt.file+" relative volume", e.Volume()/tt.volume, 1, 2e-9)
		for i, want := range tt.axes {
			near(t, tt.file+" semi-axis", e.SemiAxes[i], want, 2e-6*tt.axes[0])
		}
		if tt.centre != (r3.Vec{}) {
			near(t, tt.file+" centre", r3.Norm(r3.Sub(e.Centre, tt.centre)), 0, 2e-6*tt.axes[0])
		}
	}
}

// extrude puts each point of a plane at heights ±1. The least ellipsoid of such
// a prism is √(3/2) times the least ellipse across and √3 along, since the
// product of the two optimal weights is optimal.
func extrude(points []r3.Vec) []r3.Vec {
	var out []r3.Vec
	for _, p := range points {
		out = append(out, r3.Vec{X: p.X, Y: p.Y, Z: 1}, r3.Vec{X: p.X, Y: p.Y, Z: -1})
	}
	return out
}

// Ellipses of least area: closed forms, and R package cluster 2.1.4 for the
// data set ruspini of 75 points.
func TestEnclosePlanar(t *testing.T) {
	check := func(name string, points []r3.Vec, centre r3.Vec, area float64) {
		t.Helper()
		prism := extrude(points)
		for _, mode := range []string{"solid", "face"} {
			var e Ellipsoid
			var gap Gap
			var err error
			if mode == "solid" {
				e, gap, err = Enclose(prism, 0, 1e-10)
			} else {
				e, gap, err = EncloseOnFace(prism, r3.Vec{}, r3.Vec{Z: 2}, 0, 1e-10)
			}
			if err != nil {
				t.Fatalf("%s: %v", name, err)
			}
			checkEnclosed(t, name, e, gap, prism, 1.1e-10)
			// 4π/3·(3/2·ab)·√3 is 2√3 times πab.
			near(t, name+" relative area", e.Volume()/(2*math.Sqrt(3)*area), 1, 2e-9)
			near(t, name+" centre", r3.Norm(r3.Sub(e.Centre, centre)), 0, 2e-5*math.Sqrt(area))
		}
	}
	check("square", []r3.Vec{{}, {X: 1}, {Y: 1}, {X: 1, Y: 1}}, r3.Vec{X: .5, Y: .5}, math.Pi/2)
	check("triangle", []r3.Vec{{}, {X: 1}, {Y: 1}}, r3.Vec{X: 1. / 3, Y: 1. / 3}, 1.20919957616)
	ruspini := readPoints(t, dataFile(t, "reference/ruspini.txt"))
	check("ruspini", ruspini, r3.Vec{X: 60.512798455, Y: 83.948075619}, 15310.2838422)
}

// The conditions of optimality (Titterington 1975): weights that sum to one,
// their mean and covariance the ellipsoid's, every point within, and every
// weighted one on the surface.
func TestEncloseOptimality(t *testing.T) {
	points := minimalStandard(50)
	s := solver{points: slices.Clone(points)}
	s.solve(1e-12)
	want := map[int]float64{ // R package cluster 2.1.4 and an independent solver
		0: .200035567777, 8: .175521016618, 15: .095722307318,
		16: .109063590722, 19: .2175514585, 27: .202106059064,
	}
	sum := 0.0
	for i, w := range s.weights {
		sum += w
		p := s.points[i]
		d := r3.Sub(p, s.mean)
		form := r3.Dot(d, apply(s.inv, d))
		if form > 3*(1+1e-11) {
			t.Errorf("point %v at form %v", p, form)
		}
		if w > 1e-9 && form < 3*(1-1e-9) {
			t.Errorf("point %v with weight %g is inside, form %v", p, w, form)
		}
		if w > 1e-6 {
			near(t, "weight", w, want[slices.Index(points, p)], 1e-5)
		}
	}
	near(t, "sum of weights", sum, 1, 1e-14)
}

// Turning, moving and scaling the points turns, moves and scales the ellipsoid,
// along each axis by its own factor too.
func TestEncloseInvariance(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, kind := range []string{"normal", "cube", "lattice"} {
		points := randomPoints(rng, 300, kind)
		e, _, err := Enclose(points, 0, 1e-9)
		if err != nil {
			t.Fatal(err)
		}
		rot := r3.NewRotation(2, r3.Vec{X: 1, Y: -2, Z: 3})
		shift := r3.Vec{X: 400000, Y: 6500000, Z: 800}
		moved := make([]r3.Vec, len(points))
		stretched := make([]r3.Vec, len(points))
		for i, p := range points {
			moved[i] = r3.Add(shift, r3.Scale(7, rot.Rotate(p)))
			stretched[i] = r3.Vec{X: 100 * p.X, Y: 0.1 * p.Y, Z: 3 * p.Z}
		}
		m, _, err := Enclose(moved, 0, 1e-9)
		if err != nil {
			t.Fatal(err)
		}
		near(t, kind+" moved volume", m.Volume()/(343*e.Volume()), 1, 3e-8)
		near(t, kind+" moved centre", r3.Norm(r3.Sub(m.Centre, r3.Add(shift, r3.Scale(7, rot.Rotate(e.Centre))))), 0, 1e-3)
		s, _, err := Enclose(stretched, 0, 1e-9)
		if err != nil {
			t.Fatal(err)
		}
		near(t, kind+" stretched volume", s.Volume()/(30*e.Volume()), 1, 3e-9)
	}
}

func TestEncloseFlat(t *testing.T) {
	square := []r3.Vec{{}, {X: 1}, {Y: 1}, {X: 1, Y: 1}, {X: .3, Y: .4}}
	tilted := make([]r3.Vec, len(square))
	for i, p := range square {
		tilted[i] = r3.Add(r3.Vec{X: 500000, Y: 5200000, Z: 900}, r3.NewRotation(1, r3.Vec{X: 1, Y: 2, Z: 3}).Rotate(p))
	}
	tests := []struct {
		name   string
		points []r3.Vec
	}{
		{"one point", []r3.Vec{{X: 5, Y: 6, Z: 7}}},
		{"one point, twice", []r3.Vec{{X: 5, Y: 6, Z: 7}, {X: 5, Y: 6, Z: 7}}},
		{"two points", []r3.Vec{{X: 5, Y: 6, Z: 7}, {X: 6, Y: 8, Z: 7}}},
		{"line", []r3.Vec{{X: 1, Y: 1, Z: 1}, {X: 2, Y: 2, Z: 2}, {X: 5, Y: 5, Z: 5}}},
		{"square", square},
		{"square far away", tilted},
	}
	const least = 0.01
	for _, tt := range tests {
		if _, _, err := Enclose(tt.points, 0, 1e-6); !errors.Is(err, ErrFlat) {
			t.Errorf("%s without a least semi-axis: error %v", tt.name, err)
		}
		// The tilted square and its image are not flat together.
		_, _, err := EncloseOnFace(tt.points, tt.points[0], r3.Vec{Z: 1}, 0, 1e-6)
		if flat := tt.name != "square far away"; errors.Is(err, ErrFlat) != flat {
			t.Errorf("%s on a face without a least semi-axis: error %v", tt.name, err)
		}
		e, gap, err := Enclose(tt.points, least, 1e-6)
		if err != nil {
			t.Errorf("%s: %v", tt.name, err)
			continue
		}
		checkEnclosed(t, tt.name, e, gap, tt.points, 1.1e-6)
		if e.SemiAxes[2] < least {
			t.Errorf("%s: semi-axes %v", tt.name, e.SemiAxes)
		}
		e, gap, err = EncloseOnFace(tt.points, tt.points[0], r3.Vec{X: .1, Z: 1}, least, 1e-6)
		if err != nil {
			t.Errorf("%s on a face: %v", tt.name, err)
			continue
		}
		checkEnclosed(t, tt.name+" on a face", e, gap, tt.points, 1.1e-6)
		if e.SemiAxes[2] < least {
			t.Errorf("%s on a face: semi-axes %v", tt.name, e.SemiAxes)
		}
	}
}

func TestEncloseRefuses(t *testing.T) {
	if _, _, err := Enclose(nil, 1, 1e-6); err == nil {
		t.Error("no points: no error")
	}
	if _, _, err := Enclose([]r3.Vec{{X: math.NaN()}}, 1, 1e-6); err == nil {
		t.Error("NaN: no error")
	}
	if _, _, err := EncloseOnFace([]r3.Vec{{X: 1}}, r3.Vec{}, r3.Vec{}, 1, 1e-6); err == nil {
		t.Error("face without a normal: no error")
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
		t.Errorf("%s: gap %+v, want at most %g", name, gap, want)
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
