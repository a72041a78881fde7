package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// A solver maximises the determinant of the covariance of weighted points,
// which is the dual of the least enclosing ellipsoid: that ellipsoid is
// {x : (x−mean)ᵀ·cov⁻¹·(x−mean) ≤ 3}, and its points with a weight lie on it.
//
// With mirrored every point stands for itself and its image in the plane z = 0
// at half the weight each, so that mean.Z, cov.XZ and cov.YZ are zero.
type solver struct {
	points   []r3.Vec // reordered at will
	weights  []float64
	active   int // points[:active] may still touch the ellipsoid
	mirrored bool

	mean r3.Vec
	cov  terrain.Covariance
	inv  terrain.Covariance // of cov
}

const (
	// liftedDim is the number of dimensions with the constant coordinate that
	// turns the free centre into a fixed one.
	liftedDim = 4

	// maxEncloseSteps stops a solver that rounding keeps from its goal.
	maxEncloseSteps = 100000

	// refreshSteps is the number of steps after which the sums are formed anew
	// from the weights, against drift, and points are dropped.
	refreshSteps = 32
)

// solve iterates until the ellipsoid that reaches the furthest point has at
// most 1+gap times the volume of the least, and returns the number of steps.
func (s *solver) solve(gap float64) int {
	s.start()
	// Volume goes with the 3/2 power of the form's greatest value over 3.
	goal := 3 * math.Pow(1+gap, 2./3)
	for step := 0; ; step++ {
		far, near := s.extremes()
		if far.form <= goal || step%refreshSteps == refreshSteps-1 {
			s.refresh()
			far, near = s.extremes()
		}
		switch {
		case step == maxEncloseSteps:
			return step
		case far.form <= goal:
			// Dropped points touch no optimal ellipsoid, but one that is only
			// nearly optimal may leave one out.
			if s.furthest(len(s.points)) <= goal {
				return step
			}
			s.active = len(s.points)
		case step%polishSteps == polishSteps-1:
			s.polish(goal)
		case step%refreshSteps == refreshSteps-1:
			s.drop(far.form) // moves points, so that far and near are void
		case far.form-3 >= 3-near.form:
			s.step(far.index, s.length(far))
		default:
			s.step(near.index, max(s.length(near), -s.weights[near.index]))
		}
	}
}

// A touch is a point and the value of the quadratic form there, in the plane
// of a mirror and across it, and together.
type touch struct {
	index  int
	across float64
	form   float64
}

// start gives equal weights to the extreme points along directions that are
// chosen to span the set (Kumar & Yıldırım 2005, doi 10.1007/s10957-005-2653-6).
func (s *solver) start() {
	s.active = len(s.points)
	s.weights = make([]float64, len(s.points))
	pick := func(dir r3.Vec) r3.Vec {
		lo, hi := 0, 0
		for i, p := range s.points {
			t := r3.Dot(dir, p)
			if t < r3.Dot(dir, s.points[lo]) {
				lo = i
			}
			if t > r3.Dot(dir, s.points[hi]) {
				hi = i
			}
		}
		s.weights[lo] += 1. / 6
		s.weights[hi] += 1. / 6
		return r3.Sub(s.points[hi], s.points[lo])
	}
	first := pick(r3.Vec{X: 1})
	if s.mirrored {
		pick(r3.Vec{X: -first.Y, Y: first.X})
		pick(r3.Vec{Z: 1})
	} else {
		u, _ := orthonormal(r3.Unit(first))
		second := pick(u)
		pick(r3.Cross(first, second))
	}
	s.refresh()
}

// refresh forms mean, covariance and its inverse from the weights.
func (s *solver) refresh() {
	var sum float64
	var mean r3.Vec
	for i, w := range s.weights[:s.active] {
		sum += w
		mean = r3.Add(mean, r3.Scale(w, s.points[i]))
	}
	mean = r3.Scale(1/sum, mean)
	if s.mirrored {
		mean.Z = 0
	}
	var c terrain.Covariance
	for i := range s.weights[:s.active] {
		s.weights[i] /= sum
		w := s.weights[i]
		if w == 0 {
			continue
		}
		d := r3.Sub(s.points[i], mean)
		c.XX += w * d.X * d.X
		c.XY += w * d.X * d.Y
		c.XZ += w * d.X * d.Z
		c.YY += w * d.Y * d.Y
		c.YZ += w * d.Y * d.Z
		c.ZZ += w * d.Z * d.Z
	}
	if s.mirrored {
		c.XZ, c.YZ = 0, 0
	}
	s.mean, s.cov, s.inv = mean, c, inverse(c)
}

// extremes returns the point furthest out and, of those with a weight, the one
// furthest in.
func (s *solver) extremes() (far, near touch) {
	far.form, near.form = -1, math.Inf(1)
	m, a := s.mean, s.inv
	for i, p := range s.points[:s.active] {
		x, y, z := p.X-m.X, p.Y-m.Y, p.Z-m.Z
		form := x*(a.XX*x+2*(a.XY*y+a.XZ*z)) + y*(a.YY*y+2*a.YZ*z) + a.ZZ*z*z
		if form > far.form {
			far.index, far.form = i, form
		}
		if form < near.form && s.weights[i] > 0 {
			near.index, near.form = i, form
		}
	}
	z := s.points[far.index].Z - m.Z
	far.across = a.ZZ * z * z
	z = s.points[near.index].Z - m.Z
	near.across = a.ZZ * z * z
	return far, near
}

// furthest is the greatest value of the form among the first n points.
func (s *solver) furthest(n int) float64 {
	m, a := s.mean, s.inv
	far := 0.0
	for _, p := range s.points[:n] {
		x, y, z := p.X-m.X, p.Y-m.Y, p.Z-m.Z
		far = max(far, x*(a.XX*x+2*(a.XY*y+a.XZ*z))+y*(a.YY*y+2*a.YZ*z)+a.ZZ*z*z)
	}
	return far
}

// length is the step l along a point that maximises the determinant when the
// weights become (w + l·[the point])/(1+l).
func (s *solver) length(t touch) float64 {
	if !s.mirrored {
		// log det grows by −4·log(1+l) + log(1+l·g).
		g := t.form + 1
		return (g - liftedDim) / ((liftedDim - 1) * g)
	}
	// By −4·log(1+l) + log(1+l·α) + log(1+l·β): the mirror splits the lifted
	// matrix into two blocks. Its derivative is zero at a root of
	// −2αβ·l² + (2αβ−3(α+β))·l + α+β−4, the one next to 0.
	beta := t.across
	alpha := t.form - beta + 1
	b := 2*alpha*beta - 3*(alpha+beta)
	c := alpha + beta - liftedDim
	d := b*b + 8*alpha*beta*c
	switch {
	case d < 0: // decreasing without end: leave the point
		return -1
	case b <= 0:
		return 2 * c / (math.Sqrt(d) - b)
	}
	return (b + math.Sqrt(d)) / (4 * alpha * beta)
}

// step moves the weights by length l along point j.
func (s *solver) step(j int, l float64) {
	f := 1 / (1 + l)
	for i := range s.weights[:s.active] {
		s.weights[i] *= f
	}
	s.weights[j] = max(s.weights[j]+l*f, 0)
	if l < 0 && s.weights[j] < epsilon {
		s.weights[j] = 0
	}
	t := l * f // share of the point
	d := r3.Sub(s.points[j], s.mean)
	c := &s.cov
	if s.mirrored {
		c.ZZ = f*c.ZZ + t*d.Z*d.Z
	} else {
		c.XZ = f * (c.XZ + t*d.X*d.Z)
		c.YZ = f * (c.YZ + t*d.Y*d.Z)
		c.ZZ = f * (c.ZZ + t*d.Z*d.Z)
	}
	c.XX = f * (c.XX + t*d.X*d.X)
	c.XY = f * (c.XY + t*d.X*d.Y)
	c.YY = f * (c.YY + t*d.Y*d.Y)
	if s.mirrored {
		d.Z = 0
	}
	s.mean = r3.Add(s.mean, r3.Scale(t, d))
	s.inv = inverse(*c)
}

// drop moves points that cannot touch the least ellipsoid behind the active
// ones: those whose form is below the bound of Harman & Pronzato 2007, given
// the greatest form of all. A point with a weight stays until a step takes it.
func (s *solver) drop(far float64) {
	const m = liftedDim
	e := far + 1 - m // excess over the optimum
	if e < 0 {
		return
	}
	bound := m*(1+e/2-math.Sqrt(e*(4+e-4./m))/2) - 1
	bound -= 1e-9 // rounding of the forms
	a, c := s.inv, s.mean
	for i := s.active - 1; i >= 0; i-- {
		if s.weights[i] > 0 {
			continue
		}
		x, y, z := s.points[i].X-c.X, s.points[i].Y-c.Y, s.points[i].Z-c.Z
		if x*(a.XX*x+2*(a.XY*y+a.XZ*z))+y*(a.YY*y+2*a.YZ*z)+a.ZZ*z*z < bound {
			s.active--
			s.points[i], s.points[s.active] = s.points[s.active], s.points[i]
			s.weights[i], s.weights[s.active] = s.weights[s.active], 0
		}
	}
}

// certify compares the volume of e with the dual bound: no ellipsoid around
// the points has less than 4π/3·√(27·det cov).
func (s *solver) certify(e Ellipsoid, f frame, steps int) Gap {
	least := 4 * math.Pi / 3 * math.Sqrt(27*determinant(s.cov)) * f.half[0] * f.half[1] * f.half[2]
	return Gap{Volume: max(e.Volume()/least-1, 0), Steps: steps}
}

func determinant(c terrain.Covariance) float64 {
	return c.XX*(c.YY*c.ZZ-c.YZ*c.YZ) - c.XY*(c.XY*c.ZZ-c.YZ*c.XZ) + c.XZ*(c.XY*c.YZ-c.YY*c.XZ)
}

func inverse(c terrain.Covariance) terrain.Covariance {
	f := 1 / determinant(c)
	return terrain.Covariance{
		XX: f * (c.YY*c.ZZ - c.YZ*c.YZ),
		XY: f * (c.XZ*c.YZ - c.XY*c.ZZ),
		XZ: f * (c.XY*c.YZ - c.XZ*c.YY),
		YY: f * (c.XX*c.ZZ - c.XZ*c.XZ),
		YZ: f * (c.XY*c.XZ - c.XX*c.YZ),
		ZZ: f * (c.XX*c.YY - c.XY*c.XY),
	}
}
