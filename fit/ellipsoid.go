package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// An Ellipsoid has its semi-axes along three orthonormal right-handed unit
// vectors. A semi-axis may be zero; the ellipsoid is then flat.
type Ellipsoid struct {
	Centre   r3.Vec     // m
	SemiAxes [3]float64 // descending, m
	Axes     [3]r3.Vec  // unit vectors of the semi-axes, right-handed
}

// Volume is 4π/3 times the product of the semi-axes, in m³.
func (e Ellipsoid) Volume() float64 {
	return 4 * math.Pi / 3 * e.SemiAxes[0] * e.SemiAxes[1] * e.SemiAxes[2]
}

// SurfaceArea is the area in m² to a relative 1e-12, by Carlson's symmetric
// integral: S = 4π·R_G(a²b², b²c², c²a²) (DLMF 19.33.1). A flat ellipsoid has
// two sides.
func (e Ellipsoid) SurfaceArea() float64 {
	a := e.SemiAxes[0]
	if a == 0 {
		return 0
	}
	// In units of a, so that no product of squares leaves the range.
	b, c := e.SemiAxes[1]/a, e.SemiAxes[2]/a
	if c == 0 {
		return 2 * math.Pi * a * a * b
	}
	return 4 * math.Pi * a * a * ellipticRG(b*b*c*c, c*c, b*b)
}

// Depth is the quadratic form of the ellipsoid at p: 0 at the centre, 1 on the
// surface, more outside, growing with the square of the distance from the
// centre. Where a semi-axis is zero it is +Inf off that axis' plane.
func (e Ellipsoid) Depth(p r3.Vec) float64 {
	x, y, z := p.X-e.Centre.X, p.Y-e.Centre.Y, p.Z-e.Centre.Z
	var sum float64
	for i := range e.Axes {
		// The conversions keep compilers from fusing multiply and add, so
		// that every machine and every caller rounds alike.
		a := &e.Axes[i]
		t := float64(a.X*x) + float64(a.Y*y) + float64(a.Z*z)
		if t != 0 {
			t /= e.SemiAxes[i]
			sum += float64(t * t)
		}
	}
	return sum
}

// Contains reports whether Depth(p) ≤ 1, in floating point as it stands, with
// no tolerance.
func (e Ellipsoid) Contains(p r3.Vec) bool { return e.Depth(p) <= 1 }

// Inflate returns an ellipsoid about the same centre and axes that contains
// every point within the given distance of e. It panics if by is negative.
//
// Adding the distance to the semi-axes would not do: by Minkowski's inequality
// the support function √Σ(aᵢ+d)²uᵢ² is at most √Σaᵢ²uᵢ² + d, so that ellipsoid
// lies within the body asked for. For every p > 0 the semi-axes
// √((1+1/p)·aᵢ² + (1+p)·d²) do contain it, since
// (s+d)² ≤ (1+1/p)·s² + (1+p)·d². The p here gives the least volume of that
// family: the root of Σ (p²−λᵢ)/(p+λᵢ) = 0 with λᵢ = aᵢ²/d² (Kurzhanski & Vályi
// 1997, Ellipsoidal Calculus for Estimation and Control), found by the fixed
// point iteration of Halder 2018, On the parameterized
// computation of minimum volume outer ellipsoid of Minkowski sum of ellipsoids.
func (e Ellipsoid) Inflate(by float64) Ellipsoid {
	if !(by >= 0) {
		panic("fit: ellipsoid inflated by a negative length")
	}
	if by == 0 {
		return e
	}
	var lambda [3]float64
	for i, a := range e.SemiAxes {
		lambda[i] = (a / by) * (a / by)
	}
	p := math.Sqrt(lambda[0])
	if p == 0 { // a point becomes a ball
		e.SemiAxes = [3]float64{by, by, by}
		return e
	}
	// Any p keeps the promise; 50 steps bring the volume within rounding of
	// its least even for a needle.
	for range 50 {
		var upper, lower float64
		for _, l := range lambda {
			upper += l / (p + l)
			lower += 1 / (p + l)
		}
		next := math.Sqrt(upper / lower)
		if math.Abs(next-p) <= 4*epsilon*p {
			break
		}
		p = next
	}
	for i, a := range e.SemiAxes {
		// Rounded up, so that the promise holds for the numbers too.
		e.SemiAxes[i] = math.Sqrt((1+1/p)*a*a+(1+p)*by*by) * (1 + 8*epsilon)
	}
	return e
}

// DistanceTo is the Euclidean distance from p to the ellipsoid in metres, 0
// inside, accurate to about 1e-15 of the larger of the distance and the
// semi-axes.
//
// The nearest point solves Σ (aᵢyᵢ/(t+aᵢ²))² = 1 for t ≥ 0 (Eberly 2013,
// Distance from a point to an ellipse, an ellipsoid, or a hyperellipsoid). The
// inverse root of that sum is concave in t, so that Newton's iteration on it
// rises to the root from the left and never passes it.
func (e Ellipsoid) DistanceTo(p r3.Vec) float64 {
	if e.Contains(p) {
		return 0
	}
	d := r3.Sub(p, e.Centre)
	var y, a2 [3]float64
	t := 0.0
	for i, a := range e.SemiAxes {
		y[i] = math.Abs(r3.Dot(e.Axes[i], d))
		a2[i] = a * a
		t = max(t, a*y[i]-a2[i]) // no term alone may exceed 1 at the root
	}
	for range 100 { // fewer than ten are needed but on needles
		var sum, slope float64
		for i, a := range e.SemiAxes {
			if a > 0 {
				z := a * y[i] / (t + a2[i])
				sum += z * z
				slope += z * z / (t + a2[i])
			}
		}
		if !(sum > 1) {
			break
		}
		next := t + (math.Sqrt(sum)-1)*sum/slope
		if !(next > t) {
			break
		}
		t = next
	}
	var sum float64
	for i := range y {
		g := y[i]
		if a2[i] > 0 {
			g *= t / (t + a2[i])
		}
		sum += g * g
	}
	return math.Sqrt(sum)
}

// Quaternion is the unit quaternion, w ≥ 0, of the rotation that takes the
// frame of the axes into east, north and height: it turns (1,0,0) into Axes[0].
func (e Ellipsoid) Quaternion() (w, x, y, z float64) {
	a, b, c := e.Axes[0], e.Axes[1], e.Axes[2]
	// Shepperd 1978 (doi 10.2514/3.55767b): divide by the largest of the four.
	switch m := max(a.X, b.Y, c.Z, a.X+b.Y+c.Z); {
	case m == a.X+b.Y+c.Z:
		w, x, y, z = 1+m, b.Z-c.Y, c.X-a.Z, a.Y-b.X
	case m == a.X:
		w, x, y, z = b.Z-c.Y, 1+a.X-b.Y-c.Z, a.Y+b.X, c.X+a.Z
	case m == b.Y:
		w, x, y, z = c.X-a.Z, a.Y+b.X, 1+b.Y-a.X-c.Z, b.Z+c.Y
	default:
		w, x, y, z = a.Y-b.X, c.X+a.Z, b.Z+c.Y, 1+c.Z-a.X-b.Y
	}
	s := 1 / math.Sqrt(w*w+x*x+y*y+z*z)
	if w < 0 {
		s = -s
	}
	return s * w, s * x, s * y, s * z
}

// TrendPlunge is TrendPlunge of axis i.
func (e Ellipsoid) TrendPlunge(i int) (trendDeg, plungeDeg float64) {
	return TrendPlunge(e.Axes[i])
}

// BoundingBox is the smallest axis-aligned box around the ellipsoid.
func (e Ellipsoid) BoundingBox() terrain.Extent {
	var x, y, z float64
	for i, s := range e.SemiAxes {
		a := r3.Scale(s, e.Axes[i])
		x, y, z = x+a.X*a.X, y+a.Y*a.Y, z+a.Z*a.Z
	}
	x, y, z = math.Sqrt(x), math.Sqrt(y), math.Sqrt(z)
	c := e.Centre
	return terrain.Extent{
		Min: [3]float64{c.X - x, c.Y - y, c.Z - z},
		Max: [3]float64{c.X + x, c.Y + y, c.Z + z},
	}
}
