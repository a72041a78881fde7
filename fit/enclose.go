package fit

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// ErrFlat says that points lie in a plane, on a line or in one place, so that
// no ellipsoid of least volume exists, and that no least semi-axis was given.
var ErrFlat = errors.New("fit: points are flat and no least semi-axis is given")

// A Gap certifies an enclosing ellipsoid.
type Gap struct {
	// Volume bounds the relative excess: the ellipsoid as returned has at most
	// 1+Volume times the least possible volume. The bound comes from a dual
	// solution, not from the course of the iteration, and covers the scaling
	// that brings every point inside.
	Volume float64
	Steps  int // of the iteration
}

// Enclose returns the ellipsoid of least volume around the points, and the
// certificate of how near to the least it is: gap is the relative excess of
// volume to stop at, 1e-6 for instance, and must be positive. Every point
// satisfies Contains exactly. The points are not changed.
//
// A set thinner than minSemiAxisM in some direction is thickened first: each
// point becomes an octahedron large enough that no semi-axis is shorter than
// minSemiAxisM. The certificate is then about the thickened set. Without a
// least semi-axis (zero) a flat set is ErrFlat. Other errors are an empty set
// and a coordinate that is not finite.
//
// The method is Khachiyan's with the away steps of Todd & Yıldırım 2007 (doi
// 10.1016/j.dam.2007.02.013) from the start of Kumar & Yıldırım 2005, dropping
// points that cannot touch the result by the bound of Harman & Pronzato 2007
// (doi 10.1016/j.spl.2006.05.014). Sets that are hard for it, with many points
// almost on the ellipsoid, are finished by Newton's method on the weights.
// Points are standardised along their principal axes before, so neither large
// coordinates nor thin sets lose digits. If rounding stops it early, as for a
// set thinner than a thousand times the last digit of its coordinates, Gap says
// what was reached.
func Enclose(points []r3.Vec, minSemiAxisM, gap float64) (Ellipsoid, Gap, error) {
	if err := checkEnclose(points, minSemiAxisM, gap); err != nil {
		return Ellipsoid{}, Gap{}, err
	}
	f := principalFrame(points)
	std, err := f.standardise(points, minSemiAxisM)
	if err != nil {
		return Ellipsoid{}, Gap{}, err
	}
	s := solver{points: std}
	steps := s.solve(gap)

	// The covariance of the weights, scaled to reach the furthest point.
	c, reach := s.cov, s.furthest(len(s.points))
	h := f.half
	lambda, axes := EigenSym3(terrain.Covariance{
		XX: c.XX * h[0] * h[0], XY: c.XY * h[0] * h[1], XZ: c.XZ * h[0] * h[2],
		YY: c.YY * h[1] * h[1], YZ: c.YZ * h[1] * h[2], ZZ: c.ZZ * h[2] * h[2],
	})
	e := Ellipsoid{Centre: f.point(s.mean)}
	for i := range 3 {
		e.SemiAxes[i] = math.Sqrt(lambda[2-i] * reach)
		e.Axes[i] = f.direction(axes[2-i])
	}
	e.Axes[2] = r3.Scale(-1, e.Axes[2]) // reversing the order turned the hand
	e.cover(points, minSemiAxisM)
	return e, s.certify(e, f, steps), nil
}

// EncloseOnFace returns the ellipsoid of least volume around the points and
// their mirror images in the plane through origin with the given normal, whose
// half is a dome that stands on the plane. By symmetry its centre lies in the
// plane and one axis is the normal; here they do so exactly, up to the rounding
// of coordinates. Every point satisfies Contains exactly. The normal need not
// be a unit vector but must not be zero. All else is as for Enclose.
func EncloseOnFace(points []r3.Vec, origin, normal r3.Vec, minSemiAxisM, gap float64) (Ellipsoid, Gap, error) {
	if err := checkEnclose(points, minSemiAxisM, gap); err != nil {
		return Ellipsoid{}, Gap{}, err
	}
	if n := r3.Norm(normal); !(n > 0) || math.IsInf(n, 1) {
		return Ellipsoid{}, Gap{}, fmt.Errorf("fit: face normal %v has no direction", normal)
	}
	f := faceFrame(points, origin, r3.Unit(normal))
	std, err := f.standardise(points, minSemiAxisM)
	if err != nil {
		return Ellipsoid{}, Gap{}, err
	}
	s := solver{points: std, mirrored: true}
	steps := s.solve(gap)

	c, reach := s.cov, s.furthest(len(s.points))
	h := f.half
	low, high, cos, sin := rotate2(c.XX*h[0]*h[0], c.XY*h[0]*h[1], c.YY*h[1]*h[1])
	e := Ellipsoid{
		Centre: f.point(s.mean),
		SemiAxes: [3]float64{
			math.Sqrt(reach * high), math.Sqrt(max(reach*low, 0)), h[2] * math.Sqrt(reach*c.ZZ),
		},
		Axes: [3]r3.Vec{f.direction(r3.Vec{X: sin, Y: -cos}), f.direction(r3.Vec{X: cos, Y: sin}), f.axes[2]},
	}
	// The normal's place in the order; cyclic moves keep the hand.
	for i := 2; i > 0 && e.SemiAxes[i] > e.SemiAxes[i-1]; i-- {
		e.SemiAxes[i], e.SemiAxes[i-1] = e.SemiAxes[i-1], e.SemiAxes[i]
		e.Axes[i], e.Axes[i-1] = e.Axes[i-1], r3.Scale(-1, e.Axes[i])
	}
	e.cover(points, minSemiAxisM)
	return e, s.certify(e, f, steps), nil
}

func checkEnclose(points []r3.Vec, minSemiAxisM, gap float64) error {
	switch {
	case !(gap > 0):
		panic("fit: enclosing ellipsoid to a gap that is not positive")
	case !(minSemiAxisM >= 0):
		panic("fit: least semi-axis is negative")
	case len(points) == 0:
		return errors.New("fit: no points to enclose")
	}
	for i, p := range points {
		if s := p.X + p.Y + p.Z; math.IsNaN(s) || math.IsInf(s, 0) {
			return fmt.Errorf("fit: point %d to enclose, %v, is not finite", i, p)
		}
	}
	return nil
}

// cover raises semi-axes to the least and grows the ellipsoid until it
// contains every point by its own inequality.
func (e *Ellipsoid) cover(points []r3.Vec, minSemiAxisM float64) {
	for i := range e.SemiAxes {
		e.SemiAxes[i] = max(e.SemiAxes[i], minSemiAxisM)
	}
	for {
		depth := 0.0
		for _, p := range points {
			depth = max(depth, e.Depth(p))
		}
		if depth <= 1 {
			return
		}
		grow := math.Sqrt(depth) * (1 + 2*epsilon) // never stalls on rounding
		for i := range e.SemiAxes {
			e.SemiAxes[i] *= grow
		}
	}
}

// A frame standardises points: coordinates along three axes from a centre, in
// units of the half extents.
type frame struct {
	centre r3.Vec
	axes   [3]r3.Vec // right-handed
	half   [3]float64
	onFace bool
}

// principalFrame is the frame of the points' principal axes, centred on their
// extent.
func principalFrame(points []r3.Vec) frame {
	// Offsets from a point of the set: coordinates of a national grid squared
	// would leave few digits for the set's own size.
	var sum r3.Vec
	first := points[0]
	for _, p := range points {
		sum = r3.Add(sum, r3.Sub(p, first))
	}
	n := float64(len(points))
	f := frame{centre: r3.Add(first, r3.Scale(1/n, sum))}
	_, f.axes = EigenSym3(scatter(points, f.centre))
	f.fitExtents(points)
	return f
}

// faceFrame is the frame of a face: its third axis is the normal, its centre
// lies in the plane.
func faceFrame(points []r3.Vec, origin, normal r3.Vec) frame {
	f := frame{centre: origin, onFace: true}
	u, v := orthonormal(normal)
	var sum r3.Vec
	for _, p := range points {
		sum = r3.Add(sum, r3.Sub(p, origin))
	}
	mean := r3.Add(origin, r3.Scale(1/float64(len(points)), sum))
	c := scatter(points, mean)
	cu, cv := apply(c, u), apply(c, v)
	_, _, cos, sin := rotate2(r3.Dot(u, cu), r3.Dot(u, cv), r3.Dot(v, cv))
	f.axes = [3]r3.Vec{
		r3.Add(r3.Scale(cos, u), r3.Scale(sin, v)),
		r3.Sub(r3.Scale(cos, v), r3.Scale(sin, u)),
		normal,
	}
	f.fitExtents(points)
	return f
}

// scatter is the mean square matrix of the points about a place.
func scatter(points []r3.Vec, about r3.Vec) terrain.Covariance {
	var c terrain.Covariance
	s := 1 / float64(len(points))
	for _, p := range points {
		d := r3.Sub(p, about)
		c.XX += s * d.X * d.X
		c.XY += s * d.X * d.Y
		c.XZ += s * d.X * d.Z
		c.YY += s * d.Y * d.Y
		c.YZ += s * d.Y * d.Z
		c.ZZ += s * d.Z * d.Z
	}
	return c
}

// fitExtents moves the centre to the middle of the points' extent along each
// axis, except along the normal of a face, and measures the half extents.
func (f *frame) fitExtents(points []r3.Vec) {
	inf := math.Inf(1)
	lo, hi := [3]float64{inf, inf, inf}, [3]float64{-inf, -inf, -inf}
	for _, p := range points {
		d := r3.Sub(p, f.centre)
		for i, a := range f.axes {
			t := r3.Dot(a, d)
			lo[i], hi[i] = min(lo[i], t), max(hi[i], t)
		}
	}
	if f.onFace {
		hi[2] = max(hi[2], -lo[2])
		lo[2] = -hi[2]
	}
	centre := f.centre
	for i, a := range f.axes {
		centre = r3.Add(centre, r3.Scale((lo[i]+hi[i])/2, a))
		f.half[i] = (hi[i] - lo[i]) / 2
	}
	f.centre = centre
}

// standardise returns the points in the frame, thickened where they are
// thinner than minSemiAxisM. It widens the half extents accordingly.
func (f *frame) standardise(points []r3.Vec, minSemiAxisM float64) ([]r3.Vec, error) {
	// Rounding of coordinates makes a flat set this thick.
	size := max(f.half[0], f.half[1], f.half[2])
	noise := flatSize * max(size, math.Abs(f.centre.X), math.Abs(f.centre.Y), math.Abs(f.centre.Z))
	thin := min(f.half[0], f.half[1], f.half[2])
	var spike float64
	switch {
	case thin < minSemiAxisM:
		// An octahedron's inscribed ball is √3 times smaller than its spikes.
		spike = minSemiAxisM * math.Sqrt(3)
	case thin <= noise:
		return nil, ErrFlat
	}
	for i := range f.half {
		f.half[i] += spike
	}
	std := make([]r3.Vec, 0, len(points))
	for _, p := range points {
		d := r3.Sub(p, f.centre)
		s := r3.Vec{
			X: r3.Dot(f.axes[0], d) / f.half[0],
			Y: r3.Dot(f.axes[1], d) / f.half[1],
			Z: r3.Dot(f.axes[2], d) / f.half[2],
		}
		if spike == 0 {
			std = append(std, s)
			continue
		}
		x, y, z := spike/f.half[0], spike/f.half[1], spike/f.half[2]
		std = append(std,
			r3.Vec{X: s.X - x, Y: s.Y, Z: s.Z}, r3.Vec{X: s.X + x, Y: s.Y, Z: s.Z},
			r3.Vec{X: s.X, Y: s.Y - y, Z: s.Z}, r3.Vec{X: s.X, Y: s.Y + y, Z: s.Z},
			r3.Vec{X: s.X, Y: s.Y, Z: s.Z - z}, r3.Vec{X: s.X, Y: s.Y, Z: s.Z + z})
	}
	return std, nil
}

// point takes standardised coordinates back.
func (f *frame) point(s r3.Vec) r3.Vec {
	return r3.Add(f.centre, f.direction(r3.Vec{X: s.X * f.half[0], Y: s.Y * f.half[1], Z: s.Z * f.half[2]}))
}

// direction takes a vector along the axes into the working frame.
func (f *frame) direction(v r3.Vec) r3.Vec {
	return r3.Add(r3.Scale(v.X, f.axes[0]), r3.Add(r3.Scale(v.Y, f.axes[1]), r3.Scale(v.Z, f.axes[2])))
}
