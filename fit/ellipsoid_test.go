package fit

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func axisAligned(a, b, c float64) Ellipsoid {
	return Ellipsoid{SemiAxes: [3]float64{a, b, c}, Axes: [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}}}
}

func randomEllipsoid(rng *rand.Rand, grade float64) Ellipsoid {
	n := NormalOf(180*rng.Float64(), 360*rng.Float64())
	u, v := orthonormal(n)
	e := Ellipsoid{Centre: r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}, Axes: [3]r3.Vec{u, v, n}}
	e.SemiAxes[0] = 3 * rng.Float64()
	e.SemiAxes[1] = e.SemiAxes[0] * math.Pow(grade, rng.Float64())
	e.SemiAxes[2] = e.SemiAxes[1] * math.Pow(grade, rng.Float64())
	return e
}

// at returns the surface point above the unit vector w of the axes' frame, and
// the outward unit normal there.
func (e Ellipsoid) at(w r3.Vec) (p, normal r3.Vec) {
	p = e.Centre
	for i, c := range [3]float64{w.X, w.Y, w.Z} {
		p = r3.Add(p, r3.Scale(c*e.SemiAxes[i], e.Axes[i]))
		normal = r3.Add(normal, r3.Scale(c/e.SemiAxes[i], e.Axes[i]))
	}
	return p, r3.Unit(normal)
}

func randomUnit(rng *rand.Rand) r3.Vec {
	return r3.Unit(r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()})
}

// Areas by Carlson's and Legendre's forms and by quadrature in SciPy.
func TestEllipsoidSurfaceArea(t *testing.T) {
	tests := []struct {
		a, b, c float64
		want    float64
	}{
		{3, 2, 1, 48.882146302582},
		{10, 5, 1, 333.946045070035},
		{4, 1.5, 0.6, 44.207945684322},
		{2, 1, 1, 21.478435327884},
		{2, 2, 1, 34.687530813380},
		{100, 1, 1, 987.009372919818},
		{100, 100, 1, 62865.1448891731},
		{1, 1, 1, 12.566370614359},
		{2, 1, 0, 4 * math.Pi}, // two sides
		{1, 0, 0, 0},
		{0, 0, 0, 0},
	}
	for _, tt := range tests {
		e := axisAligned(tt.a, tt.b, tt.c)
		near(t, "area", e.SurfaceArea(), tt.want, 1e-12*max(1, tt.want))
		e = axisAligned(1e-3*tt.a, 1e-3*tt.b, 1e-3*tt.c)
		near(t, "area in other units", 1e6*e.SurfaceArea(), tt.want, 1e-12*max(1, tt.want))
	}
}

// The closed forms of spheroids, prolate and oblate.
func TestEllipsoidSpheroids(t *testing.T) {
	for _, ratio := range []float64{0.01, 0.3, 0.9, 0.999} {
		e := math.Sqrt(1 - ratio*ratio)
		prolate := 2 * math.Pi * ratio * ratio * (1 + math.Asin(e)/(ratio*e))
		near(t, "prolate area", axisAligned(1, ratio, ratio).SurfaceArea(), prolate, 1e-12*prolate)
		oblate := 2 * math.Pi * (1 + ratio*ratio/e*math.Atanh(e))
		near(t, "oblate area", axisAligned(1, 1, ratio).SurfaceArea(), oblate, 1e-12*oblate)
	}
}

// Thomsen's approximation with p = 1.6075 errs by at most 1.061 % (from
// memory), so the exact area may not differ by more.
func TestEllipsoidThomsen(t *testing.T) {
	thomsen := func(a, b, c float64) float64 {
		const p = 1.6075
		return 4 * math.Pi * math.Pow((math.Pow(a*b, p)+math.Pow(a*c, p)+math.Pow(b*c, p))/3, 1/p)
	}
	near(t, "Thomsen's (3,2,1)", thomsen(3, 2, 1), 48.97193333, 1e-8)
	near(t, "Thomsen's (10,5,1)", thomsen(10, 5, 1), 336.58967124, 1e-8)
	near(t, "Thomsen's (2,1,1)", thomsen(2, 1, 1), 21.46564417, 1e-8)
	for i := range 41 {
		for j := range i + 1 {
			b, c := math.Pow(10, -float64(j)/10), math.Pow(10, -float64(i)/10)
			if d := thomsen(1, b, c)/axisAligned(1, b, c).SurfaceArea() - 1; math.Abs(d) > 0.010613 {
				t.Errorf("axes 1, %g, %g: Thomsen's area is off by %g", b, c, d)
			}
		}
	}
}

// The area of an ellipse with covariance [[3,1],[1,2]] at d² = 10 is 10π√5 (help
// of volume.ellipsoid in R package cluster); a unit height axis makes it 3-D.
func TestEllipsoidVolume(t *testing.T) {
	low, high, _, _ := rotate2(3, 1, 2)
	e := axisAligned(math.Sqrt(10*high), math.Sqrt(10*low), 1)
	near(t, "area of the section", e.Volume()*3/4, 70.2481473104, 1e-9)
	near(t, "unit ball", axisAligned(1, 1, 1).Volume(), 4.18879020479, 1e-11)
}

func TestEllipsoidDepth(t *testing.T) {
	e := axisAligned(3, 2, 1)
	e.Centre = r3.Vec{X: 10, Y: 20, Z: 30}
	for _, tt := range []struct {
		p    r3.Vec
		want float64
	}{
		{r3.Vec{X: 10, Y: 20, Z: 30}, 0},
		{r3.Vec{X: 13, Y: 20, Z: 30}, 1},
		{r3.Vec{X: 10, Y: 18, Z: 30}, 1},
		{r3.Vec{X: 10, Y: 20, Z: 32}, 4},
	} {
		if got := e.Depth(tt.p); got != tt.want {
			t.Errorf("Depth(%v) = %v, want %v", tt.p, got, tt.want)
		}
		if got := e.Contains(tt.p); got != (tt.want <= 1) {
			t.Errorf("Contains(%v) = %v", tt.p, got)
		}
	}
	flat := axisAligned(2, 1, 0)
	if got := flat.Depth(r3.Vec{X: 1}); got != 0.25 {
		t.Errorf("in the plane of a flat ellipsoid: depth %v", got)
	}
	if got := flat.Depth(r3.Vec{X: 1, Z: 1e-9}); !math.IsInf(got, 1) {
		t.Errorf("off the plane of a flat ellipsoid: depth %v", got)
	}
}

// The distance of a point straight out from the surface is how far out it went,
// up to the centre of curvature behind it and without end before it.
func TestEllipsoidDistance(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, grade := range []float64{1, 0.5, 1e-2, 1e-5} {
		for range 2000 {
			e := randomEllipsoid(rng, grade)
			p, normal := e.at(randomUnit(rng))
			want := math.Pow(10, 4*rng.Float64()-2)
			got := e.DistanceTo(r3.Add(p, r3.Scale(want, normal)))
			near(t, "distance", got, want, 1e-11*max(want, 1))
		}
	}
	e := axisAligned(3, 2, 1)
	for _, tt := range []struct {
		p    r3.Vec
		want float64
	}{
		{r3.Vec{}, 0},
		{r3.Vec{X: 2.9}, 0},
		{r3.Vec{X: 3}, 0},
		{r3.Vec{X: 5}, 2},
		{r3.Vec{Z: -1e6}, 1e6 - 1},
	} {
		near(t, "distance", e.DistanceTo(tt.p), tt.want, 1e-9)
	}
	near(t, "distance from a flat ellipsoid", axisAligned(2, 1, 0).DistanceTo(r3.Vec{X: 1, Y: 0.1, Z: 0.7}), 0.7, 1e-15)
	near(t, "distance from its rim", axisAligned(1, 1, 0).DistanceTo(r3.Vec{X: 4, Z: 4}), 5, 1e-12)
}

// Every point within the distance of the ellipsoid is inside the inflated one,
// for flat and needle shapes too, and a ball stays a ball.
func TestEllipsoidInflate(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, grade := range []float64{1, 0.3, 1e-2, 1e-6} {
		for range 300 {
			e := randomEllipsoid(rng, grade)
			by := math.Pow(10, 3*rng.Float64()-2)
			big := e.Inflate(by)
			slack := math.Inf(1)
			for range 200 {
				p, normal := e.at(randomUnit(rng))
				depth := big.Depth(r3.Add(p, r3.Scale(by, normal)))
				if depth > 1+1e-9 {
					t.Fatalf("%+v inflated by %v leaves a point at depth %v", e, by, depth)
				}
				slack = min(slack, 1-depth)
			}
			if grade == 1 {
				near(t, "inflated ball", big.SemiAxes[2], e.SemiAxes[2]+by, 1e-12*big.SemiAxes[2])
			}
			// No other member of the family has less volume. Its 1+1/p is the
			// ratio of differences of squared semi-axes.
			a, b := e.SemiAxes, big.SemiAxes
			p := 1 / ((b[0]*b[0]-b[2]*b[2])/(a[0]*a[0]-a[2]*a[2]) - 1)
			if !(p > 0 && a[0]-a[2] > 1e-3) {
				continue // a ball, or a distance too small to tell
			}
			for _, q := range []float64{0.5 * p, 0.9 * p, 1.1 * p, 2 * p} {
				other := e
				for i := range a {
					other.SemiAxes[i] = math.Sqrt((1+1/q)*a[i]*a[i] + (1+q)*by*by)
				}
				if other.Volume() < big.Volume()*(1-1e-9) {
					t.Errorf("%+v inflated by %v: volume %v, %v is possible", e, by, big.Volume(), other.Volume())
				}
			}
		}
	}
	e := axisAligned(3, 2, 1)
	if got := e.Inflate(0); got != e {
		t.Errorf("inflated by nothing: %+v", got)
	}
	if got := axisAligned(0, 0, 0).Inflate(2); got.SemiAxes != [3]float64{2, 2, 2} {
		t.Errorf("inflated point: %+v", got)
	}
	// Semi-axes plus distance, the obvious choice, would not contain it.
	naive := axisAligned(11, 2, 2)
	p, normal := axisAligned(10, 1, 1).at(r3.Unit(r3.Vec{X: 1, Y: 1}))
	if naive.Contains(r3.Add(p, normal)) {
		t.Error("the counterexample to adding the distance to the semi-axes is none")
	}
}

func TestEllipsoidQuaternion(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	check := func(e Ellipsoid) {
		t.Helper()
		w, x, y, z := e.Quaternion()
		near(t, "norm", w*w+x*x+y*y+z*z, 1, 1e-15)
		if w < 0 {
			t.Errorf("w = %v", w)
		}
		rot := r3.Rotation{Real: w, Imag: x, Jmag: y, Kmag: z}
		for i, v := range [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}} {
			if d := r3.Norm(r3.Sub(rot.Rotate(v), e.Axes[i])); d > 1e-14 {
				t.Errorf("axis %d off by %g", i, d)
			}
		}
	}
	for range 1000 {
		check(randomEllipsoid(rng, 0.5))
	}
	e := axisAligned(3, 2, 1)
	check(e)
	e.Axes = [3]r3.Vec{{X: -1}, {Y: -1}, {Z: 1}} // half turns have w = 0
	check(e)
	e.Axes = [3]r3.Vec{{X: -1}, {Y: 1}, {Z: -1}}
	check(e)
	e.Axes = [3]r3.Vec{{X: 1}, {Y: -1}, {Z: -1}}
	check(e)
	e.Axes = [3]r3.Vec{{Y: 1}, {Z: 1}, {X: 1}}
	check(e)
}

func TestEllipsoidBoundingBox(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 100 {
		e := randomEllipsoid(rng, 0.1)
		box := e.BoundingBox()
		reach := box
		for k := range 3 {
			reach.Min[k], reach.Max[k] = math.Inf(1), math.Inf(-1)
		}
		for range 5000 {
			p, _ := e.at(randomUnit(rng))
			reach.Add(p.X, p.Y, p.Z)
		}
		for k := range 3 {
			if reach.Min[k] < box.Min[k]-1e-12 || reach.Max[k] > box.Max[k]+1e-12 {
				t.Errorf("surface %v leaves the box %v", reach, box)
			}
			if size := box.Max[k] - box.Min[k]; reach.Max[k]-reach.Min[k] < 0.99*size {
				t.Errorf("box %v is larger than the surface %v", box, reach)
			}
		}
	}
}
