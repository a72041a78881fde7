package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Dimensions of the bare cliff, in the site frame.
const (
	faceDeg     = 70.0  // main face
	wallDeg     = 84.0  // west wall and the side face that joins it
	crestDeg    = 28.0  // slope above
	platformDeg = 3.0   // foot, dipping out to sea
	bendX       = 24.0  // east of here the main face is a plane, west of it a cone
	bendR       = 50.0  // plan radius of the cone at height 0, 41 m at the crest
	bendAngle   = 0.34  // radians that the cone turns before the corner
	wallY       = -12.0 // foot of the west wall, height 0
	crestZ      = 20.0  // top of the plane part of the main face
	platformY   = 12.0  // outer edge of the platform

	waveM     = 0.10 // amplitude of the undulation in the upper part of the cone
	waveAlong = 13.0 // its wavelengths
	waveUp    = 14.0
)

// The cliff is the rock without features.
//
// It is (((face ∩ side) ∪ wall) ∩ crest) ∪ platform, where the face is a plane
// that goes over into a cone of the same inclination and touches it, so that
// the surface bends without an edge.
type cliff struct {
	sin, cos float64 // of faceDeg
	cornerX  float64 // foot of the corner and of the side face
	side     halfSpace
	wall     halfSpace
	crest    halfSpace
	platform halfSpace
	edge     halfSpace
}

func newCliff() cliff {
	s, c := sincosDeg(faceDeg)
	k := cliff{sin: s, cos: c, cornerX: bendX + bendR*math.Sin(bendAngle)}
	k.side = through(r3.Vec{X: k.cornerX}, inclined(wallDeg, r3.Vec{X: 1}))
	k.wall = through(r3.Vec{Y: wallY}, inclined(wallDeg, r3.Vec{Y: 1}))
	k.crest = through(r3.Vec{Y: -crestZ * c / s, Z: crestZ}, inclined(crestDeg, r3.Vec{Y: 1}))
	k.platform = through(r3.Vec{}, inclined(platformDeg, r3.Vec{Y: 1}))
	k.edge = through(r3.Vec{Y: platformY}, r3.Vec{Y: 1})
	return k
}

// inclined is the unit normal of the given inclination towards a horizontal
// unit vector.
func inclined(deg float64, towards r3.Vec) r3.Vec {
	s, c := sincosDeg(deg)
	return r3.Add(r3.Scale(s, towards), r3.Vec{Z: c})
}

func sincosDeg(deg float64) (sin, cos float64) { return math.Sincos(deg * math.Pi / 180) }

func (k *cliff) eval(p r3.Vec) (d float64, surface int) {
	d, surface = k.face(p), onFace
	if e := k.side.distance(p); e > d {
		d, surface = e, onSide
	}
	if e := k.wall.distance(p); e < d {
		d, surface = e, onWall
	}
	if e := k.crest.distance(p); e > d {
		d, surface = e, onCrest
	}
	if e := max(k.platform.distance(p), k.edge.distance(p)); e < d {
		d, surface = e, onPlatform
	}
	return d, surface
}

// face is the main face's function: a plane, then a cone with undulation.
func (k *cliff) face(p r3.Vec) float64 {
	x := p.X - bendX
	if x <= 0 {
		return p.Y*k.sin + p.Z*k.cos
	}
	y := p.Y + bendR
	r := math.Sqrt(x*x + y*y)
	d := (r-bendR)*k.sin + p.Z*k.cos
	// Where the undulation cannot change the sign it is not evaluated: taking
	// its amplitude off instead keeps the function below the distance.
	if d > 2*waveM {
		return d - waveM
	}
	if d < -2*waveM {
		return d + waveM
	}
	return d - undulation(bendR*math.Atan2(x, y), p.Z)
}

// undulation is the distance by which the face lies further out, at arc length
// s west of the bend and height z. It fades to nothing within 3 m of its ends.
func undulation(s, z float64) float64 {
	w := fade(s-4) * fade(17.5-s) * fade(z-8) * fade(22-z)
	if w == 0 {
		return 0
	}
	return waveM * w * math.Sin(2*math.Pi*s/waveAlong) * math.Cos(2*math.Pi*z/waveUp)
}

// fade rises smoothly from 0 at 0 to 1 at 3 m.
func fade(x float64) float64 {
	x = min(max(x/3, 0), 1)
	return x * x * (3 - 2*x)
}

func (k *cliff) normal(p r3.Vec, surface int) r3.Vec {
	switch surface {
	case onSide:
		return k.side.normal
	case onWall:
		return k.wall.normal
	case onCrest:
		return k.crest.normal
	case onPlatform:
		if k.edge.distance(p) > k.platform.distance(p) {
			return k.edge.normal
		}
		return k.platform.normal
	}
	x, y := p.X-bendX, p.Y+bendR
	if x <= 0 {
		return r3.Vec{Y: k.sin, Z: k.cos}
	}
	r := math.Hypot(x, y)
	s := bendR * math.Atan2(x, y)
	// Central differences of a function that varies over metres: the error is
	// below 1e-9 with this step.
	const h = 1e-4
	ds := (undulation(s+h, p.Z) - undulation(s-h, p.Z)) / (2 * h) * bendR / r
	dz := (undulation(s, p.Z+h) - undulation(s, p.Z-h)) / (2 * h)
	out := r3.Vec{X: x / r, Y: y / r}
	west := r3.Vec{X: y / r, Y: -x / r}
	g := r3.Add(r3.Scale(k.sin, out), r3.Scale(-ds, west))
	return r3.Unit(r3.Add(g, r3.Vec{Z: k.cos - dz}))
}

// onMain is the frame on the main face at distance s west of the origin, along
// the foot, and height z.
func (k *cliff) onMain(s, z float64) frame {
	back := z * k.cos / k.sin
	t := max(s-bendX, 0) / bendR
	sin, cos := math.Sincos(t)
	f := frame{
		o: r3.Vec{X: s, Y: -back, Z: z},
		a: r3.Vec{X: cos, Y: -sin},
		b: r3.Vec{X: -k.cos * sin, Y: -k.cos * cos, Z: k.sin},
		n: r3.Vec{X: k.sin * sin, Y: k.sin * cos, Z: k.cos},
	}
	if t > 0 {
		r := bendR - back
		f.o = r3.Vec{X: bendX + r*sin, Y: r*cos - bendR, Z: z}
	}
	return f
}

// onPlane is the frame on a plane, its origin below or above the point.
func onPlane(h halfSpace, x, y, z float64) frame {
	p := r3.Vec{X: x, Y: y, Z: z}
	n := h.normal
	flat := r3.Unit(r3.Vec{X: n.X, Y: n.Y})
	a := r3.Vec{X: flat.Y, Y: -flat.X}
	b := r3.Cross(n, a)
	if b.Z < 0 {
		b = r3.Scale(-1, b)
	}
	// Steep planes are met at the given height, gentle ones at the given place.
	if n.Z < 0.5 {
		p = r3.Sub(p, r3.Scale(h.distance(p)/r3.Dot(n, flat), flat))
	} else {
		p.Z -= h.distance(p) / n.Z
	}
	return frame{o: p, a: a, b: b, n: n}
}
