package export

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

const degree = math.Pi / 180

// quaternion is the unit quaternion w, x, y, z of the rotation that takes the
// unit vectors of the axes frame to the given right-handed orthonormal axes.
// Of the two that do, it is the one with w > 0, or with the first non-zero
// component positive. The largest component is found first, so that no digits
// are lost (Shepperd 1978, J. Guidance and Control 1:223-224).
func quaternion(axes [3]r3.Vec) [4]float64 {
	a, b, c := axes[0], axes[1], axes[2]
	// Four times the squares of the components.
	sq := [4]float64{
		1 + a.X + b.Y + c.Z,
		1 + a.X - b.Y - c.Z,
		1 - a.X + b.Y - c.Z,
		1 - a.X - b.Y + c.Z,
	}
	largest := 0
	for i := range sq {
		if sq[i] > sq[largest] {
			largest = i
		}
	}
	// Four times the products of the components.
	wx, wy, wz := b.Z-c.Y, c.X-a.Z, a.Y-b.X
	xy, xz, yz := a.Y+b.X, c.X+a.Z, b.Z+c.Y
	var q [4]float64
	switch s := sq[largest]; largest {
	case 0:
		q = [4]float64{s, wx, wy, wz}
	case 1:
		q = [4]float64{wx, s, xy, xz}
	case 2:
		q = [4]float64{wy, xy, s, yz}
	default:
		q = [4]float64{wz, xz, yz, s}
	}
	norm := math.Sqrt(q[0]*q[0] + q[1]*q[1] + q[2]*q[2] + q[3]*q[3])
	for _, v := range q {
		if v != 0 {
			norm = math.Copysign(norm, v)
			break
		}
	}
	for i := range q {
		q[i] /= norm
	}
	return q
}

// trendPlunge is the direction of a line along v: the azimuth of its downward
// end in degrees from grid north, and how far that end points below the
// horizontal, 0 to 90. A vertical line has trend 0; a horizontal one has the
// trend below 180.
func trendPlunge(v r3.Vec) (trendDeg, plungeDeg float64) {
	h := math.Hypot(v.X, v.Y)
	if v.Z > 0 || v.Z == 0 && (v.X < 0 || v.X == 0 && v.Y < 0) {
		v = r3.Scale(-1, v)
	}
	return azimuth(v), math.Atan2(-v.Z, h) / degree
}

// azimuth is that of the horizontal part of v in degrees from grid north, 0 to
// 360, and 0 without a horizontal part.
func azimuth(v r3.Vec) float64 {
	if v.X == 0 && v.Y == 0 {
		return 0
	}
	a := math.Atan2(v.X, v.Y) / degree
	if a < 0 {
		a += 360
	}
	if a >= 360 { // a tiny negative angle rounds up to the full circle
		a = 0
	}
	return a
}

// inclination is the angle in degrees between v and the vertical, 0 to 180. It
// takes the arc tangent, because the arc cosine loses half the digits of
// nearly flat ground.
func inclination(v r3.Vec) float64 {
	return math.Atan2(math.Hypot(v.X, v.Y), v.Z) / degree
}

// normalOf is the unit normal of a plane with the given inclination and dip
// direction in degrees.
func normalOf(inclinationDeg, dipDirectionDeg float64) r3.Vec {
	si, ci := math.Sincos(inclinationDeg * degree)
	sd, cd := math.Sincos(dipDirectionDeg * degree)
	return r3.Vec{X: si * sd, Y: si * cd, Z: ci}
}
