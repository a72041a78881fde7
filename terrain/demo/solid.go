package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// The solid is a function of position that is negative in rock, positive in
// air and never exceeds the distance to the surface by more than stepShare
// allows. Planes are exact. Adding rock takes the smaller of two such
// functions, cutting takes the larger of one and the other's negative.

// A halfSpace is the rock below a plane: normal·p < offset.
type halfSpace struct {
	normal r3.Vec
	offset float64
}

func (h halfSpace) distance(p r3.Vec) float64 { return r3.Dot(h.normal, p) - h.offset }

// through returns the half-space whose boundary holds the point.
func through(point, normal r3.Vec) halfSpace {
	return halfSpace{normal: normal, offset: r3.Dot(normal, point)}
}

// A frame stands on a face: a runs along it, b up it, n out of it.
type frame struct {
	o, a, b, n r3.Vec
}

// at is the point with the given coordinates in the frame.
func (f frame) at(a, b, n float64) r3.Vec {
	p := r3.Add(f.o, r3.Scale(a, f.a))
	p = r3.Add(p, r3.Scale(b, f.b))
	return r3.Add(p, r3.Scale(n, f.n))
}

// moved is the frame with its origin moved within itself.
func (f frame) moved(a, b, n float64) frame {
	f.o = f.at(a, b, n)
	return f
}

// A feature is one convex piece of rock that is added to the face or cut from
// it: an ellipsoid, or a prism when it has sides.
type feature struct {
	name   string
	cut    bool
	sides  []halfSpace
	frame  frame   // of an ellipsoid: its centre and axes
	semi   r3.Vec  // semi-axes along a, b, n
	least  float64 // the smallest of semi
	lo, hi r3.Vec  // bounding box
	tint   float64 // brightness of its rock against the face's
}

// newPrism is the convex profile, anticlockwise (b, n) pairs in the frame,
// extended by halfWidth to both sides along a.
func newPrism(name string, f frame, profile [][2]float64, halfWidth float64) feature {
	t := feature{name: name, frame: f, tint: 1}
	t.lo, t.hi = emptyBox()
	for i, p := range profile {
		q := profile[(i+1)%len(profile)]
		db, dn := q[0]-p[0], q[1]-p[1]
		out := r3.Unit(r3.Add(r3.Scale(dn, f.b), r3.Scale(-db, f.n)))
		t.sides = append(t.sides, through(f.at(0, p[0], p[1]), out))
		t.lo, t.hi = grow(t.lo, t.hi, f.at(-halfWidth, p[0], p[1]))
		t.lo, t.hi = grow(t.lo, t.hi, f.at(halfWidth, p[0], p[1]))
	}
	t.sides = append(t.sides,
		through(f.at(halfWidth, 0, 0), f.a),
		through(f.at(-halfWidth, 0, 0), r3.Scale(-1, f.a)))
	return t
}

// newEllipsoid has its centre in the frame's origin and semi-axes along it.
func newEllipsoid(name string, f frame, a, b, n float64) feature {
	half := r3.Vec{
		X: math.Sqrt(sq(f.a.X*a) + sq(f.b.X*b) + sq(f.n.X*n)),
		Y: math.Sqrt(sq(f.a.Y*a) + sq(f.b.Y*b) + sq(f.n.Y*n)),
		Z: math.Sqrt(sq(f.a.Z*a) + sq(f.b.Z*b) + sq(f.n.Z*n)),
	}
	return feature{
		name: name, frame: f, tint: 1,
		semi: r3.Vec{X: a, Y: b, Z: n}, least: min(a, b, n),
		lo: r3.Sub(f.o, half), hi: r3.Add(f.o, half),
	}
}

// distance is negative inside the feature.
func (t *feature) distance(p r3.Vec) float64 {
	if t.sides == nil {
		q := t.scaled(p)
		return (math.Sqrt(q.X*q.X+q.Y*q.Y+q.Z*q.Z) - 1) * t.least
	}
	d := math.Inf(-1)
	for i := range t.sides {
		d = max(d, t.sides[i].distance(p))
	}
	return d
}

// scaled maps the ellipsoid to the unit sphere.
func (t *feature) scaled(p r3.Vec) r3.Vec {
	q := r3.Sub(p, t.frame.o)
	return r3.Vec{
		X: r3.Dot(q, t.frame.a) / t.semi.X,
		Y: r3.Dot(q, t.frame.b) / t.semi.Y,
		Z: r3.Dot(q, t.frame.n) / t.semi.Z,
	}
}

// normal is the unit gradient of distance at p.
func (t *feature) normal(p r3.Vec) r3.Vec {
	if t.sides == nil {
		q := t.scaled(p)
		g := r3.Scale(q.X/t.semi.X, t.frame.a)
		g = r3.Add(g, r3.Scale(q.Y/t.semi.Y, t.frame.b))
		return r3.Unit(r3.Add(g, r3.Scale(q.Z/t.semi.Z, t.frame.n)))
	}
	best := 0
	for i := range t.sides {
		if t.sides[i].distance(p) > t.sides[best].distance(p) {
			best = i
		}
	}
	return t.sides[best].normal
}

// A solid is the cliff with its features, in the order they were made.
type solid struct {
	cliff    cliff
	features []feature
	all      []int // indices of every feature
}

// Surfaces other than features, as eval names them.
const (
	onFace = -1 - iota
	onSide
	onWall
	onCrest
	onPlatform
)

// eval is the solid's function at p and the surface that decides it, an index
// of features or one of the constants. Only the features listed take part.
func (s *solid) eval(p r3.Vec, features []int) (d float64, surface int) {
	d, surface = s.cliff.eval(p)
	for _, i := range features {
		t := &s.features[i]
		e := t.distance(p)
		switch {
		case t.cut && -e > d:
			d, surface = -e, i
		case !t.cut && e < d:
			d, surface = e, i
		}
	}
	return d, surface
}

// normal is the outward unit normal of the given surface at p.
func (s *solid) normal(p r3.Vec, surface int) r3.Vec {
	if surface < 0 {
		return s.cliff.normal(p, surface)
	}
	t := &s.features[surface]
	if t.cut {
		return r3.Scale(-1, t.normal(p))
	}
	return t.normal(p)
}

// Tracing a ray.
const (
	// stepShare is the share of the solid's function that a ray may advance
	// safely: undulation makes the face's function grow by up to 1.11 per
	// metre, everything else by at most 1.
	stepShare = 0.88

	// leastStepM keeps grazing rays going. A ray can pass through the corner
	// of a rock where it would travel less than this inside.
	leastStepM = 0.002

	// rootM is the accuracy along the ray at which a hit is accepted.
	rootM = 1e-9
)

// hit follows the ray from o in direction dir between the distances t0 and t1
// and returns the first entry into rock. Scratch is overwritten.
func (s *solid) hit(o, dir r3.Vec, t0, t1 float64, scratch []int) (t float64, surface int, ok bool) {
	near := s.crossed(o, dir, scratch[:0])
	t = t0
	d, _ := s.eval(along(o, dir, t), near)
	if d <= 0 {
		return 0, 0, false // starts in rock
	}
	for t < t1 {
		was, wasD := t, d
		t += max(stepShare*d, leastStepM)
		d, _ = s.eval(along(o, dir, t), near)
		if d <= 0 {
			t = s.root(o, dir, was, wasD, t, d, near)
			_, surface = s.eval(along(o, dir, t), near)
			return t, surface, t <= t1
		}
	}
	return 0, 0, false
}

// root finds the zero between lo (value dlo > 0) and hi (dhi <= 0) by the
// Illinois variant of false position, which is exact in one step on planes.
func (s *solid) root(o, dir r3.Vec, lo, dlo, hi, dhi float64, near []int) float64 {
	side := 0
	for range 100 {
		t := hi
		if dlo != dhi {
			t = (lo*dhi - hi*dlo) / (dhi - dlo)
		}
		d, _ := s.eval(along(o, dir, t), near)
		if math.Abs(d) < rootM || hi-lo < rootM {
			return t
		}
		if d > 0 {
			lo, dlo = t, d
			if side == 1 {
				dhi /= 2
			}
			side = 1
		} else {
			hi, dhi = t, d
			if side == -1 {
				dlo /= 2
			}
			side = -1
		}
	}
	return hi
}

// crossed appends the features whose bounding box the ray crosses: no other
// can change where it enters the rock.
func (s *solid) crossed(o, dir r3.Vec, near []int) []int {
	inv := r3.Vec{X: 1 / dir.X, Y: 1 / dir.Y, Z: 1 / dir.Z}
	for i := range s.features {
		t := &s.features[i]
		if in, out := slab(o, inv, t.lo, t.hi); in <= out {
			near = append(near, i)
		}
	}
	return near
}

// slab returns the ray's distances at entry to and exit from the box; exit
// comes before entry if it misses.
func slab(o, inv, lo, hi r3.Vec) (in, out float64) {
	x0, x1 := (lo.X-o.X)*inv.X, (hi.X-o.X)*inv.X
	y0, y1 := (lo.Y-o.Y)*inv.Y, (hi.Y-o.Y)*inv.Y
	z0, z1 := (lo.Z-o.Z)*inv.Z, (hi.Z-o.Z)*inv.Z
	in = max(min(x0, x1), min(y0, y1), min(z0, z1), 0)
	return in, min(max(x0, x1), max(y0, y1), max(z0, z1))
}

func along(o, dir r3.Vec, t float64) r3.Vec {
	return r3.Vec{X: o.X + t*dir.X, Y: o.Y + t*dir.Y, Z: o.Z + t*dir.Z}
}

func emptyBox() (lo, hi r3.Vec) {
	inf := math.Inf(1)
	return r3.Vec{X: inf, Y: inf, Z: inf}, r3.Vec{X: -inf, Y: -inf, Z: -inf}
}

func grow(lo, hi, p r3.Vec) (r3.Vec, r3.Vec) {
	return r3.Vec{X: min(lo.X, p.X), Y: min(lo.Y, p.Y), Z: min(lo.Z, p.Z)},
		r3.Vec{X: max(hi.X, p.X), Y: max(hi.Y, p.Y), Z: max(hi.Z, p.Z)}
}

func sq(x float64) float64 { return x * x }
