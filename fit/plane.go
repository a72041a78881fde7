package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// A Plane is the total least squares plane of a set of raw points (Pearson
// 1901, Phil. Mag. 2:559): it passes through their mean, along the two largest
// eigenvectors of their covariance.
type Plane struct {
	Centroid r3.Vec     // mean of the points, m
	Normal   r3.Vec     // unit; its sign is arbitrary until the outward side is known
	Points   int64      // raw points summed
	Voxels   int        // voxels they lie in
	Lambda   [3]float64 // eigenvalues of the covariance (divided by n), ascending, m²
}

// PlaneFromMoments returns the plane of the points summed in m, whose offsets
// are relative to centre and which lie in the given number of voxels. It is not
// ok for fewer than three points, for points on a line or nearly so, and for
// sets without a thinnest direction, such as the corners of a cube; the Plane
// then still holds counts, centroid and eigenvalues.
func PlaneFromMoments(m *terrain.Moments, centre r3.Vec, voxels int) (Plane, bool) {
	c := m.Covariance()
	return planeOf(&c, r3.Add(centre, m.Mean()), m.N, voxels)
}

// planeOf is PlaneFromMoments for a covariance that is known already.
func planeOf(c *terrain.Covariance, centroid r3.Vec, points int64, voxels int) (Plane, bool) {
	lambda, axes := EigenSym3(*c)
	p := Plane{Centroid: centroid, Normal: axes[0], Points: points, Voxels: voxels, Lambda: lambda}
	ok := points >= 3 &&
		lambda[1] >= minSpreadM2 &&
		lambda[1] >= minSpreadRatio*lambda[2] &&
		lambda[1]-lambda[0] > minNormalGap*lambda[2]
	return p, ok
}

// Flipped returns p with its normal turned to the other side.
func (p Plane) Flipped() Plane {
	p.Normal = r3.Scale(-1, p.Normal)
	return p
}

// Roughness is the RMS distance of the points to the plane in metres, with its
// n − 3 degrees of freedom. It is not ok for three points or fewer, which have
// none.
func (p Plane) Roughness() (rms float64, ok bool) {
	if p.Points <= 3 {
		return 0, false
	}
	n := float64(p.Points)
	return math.Sqrt(p.Lambda[0] * n / (n - 3)), true
}

// Variation is the surface variation λ0/(λ0+λ1+λ2) of Pauly, Gross & Kobbelt
// 2002 (doi 10.1109/VISUAL.2002.1183771): 0 for a plane, 1/3 for an isotropic
// cloud, and 0 for points that all coincide.
func (p Plane) Variation() float64 {
	sum := p.Lambda[0] + p.Lambda[1] + p.Lambda[2]
	if sum == 0 {
		return 0
	}
	return p.Lambda[0] / sum
}

// NormalSigmaDeg is the standard deviation of the normal's direction about its
// least certain axis, in degrees: atan √(λ0/(n·λ1)). Here n is the number of
// voxels, or of points where that is less, since raw points of one voxel are
// not independent. It is 90 where the points determine no direction.
func (p Plane) NormalSigmaDeg() float64 {
	n := min(float64(p.Points), float64(p.Voxels))
	if !(n > 0 && p.Lambda[1] > 0) {
		return 90
	}
	return degrees(math.Atan(math.Sqrt(p.Lambda[0] / (n * p.Lambda[1]))))
}

// Signed is the distance of q from the plane in metres, positive on the side
// that the normal points to.
func (p Plane) Signed(q r3.Vec) float64 { return r3.Dot(r3.Sub(q, p.Centroid), p.Normal) }

// InclinationDeg is InclinationDeg of the normal.
func (p Plane) InclinationDeg() float64 { return InclinationDeg(p.Normal) }

// DipDirectionDeg is DipDirectionDeg of the normal.
func (p Plane) DipDirectionDeg() (deg float64, ok bool) { return DipDirectionDeg(p.Normal) }

// InclinationDeg is the angle of an outward normal of any length from the
// vertical, in degrees: 0 for ground that is flat and faces up, 90 for a wall,
// more for an overhang, 180 for a roof. It keeps full relative precision near
// 0 and 180, where an arc cosine would lose half the digits. The zero vector
// gives 0.
func InclinationDeg(n r3.Vec) float64 {
	return degrees(math.Atan2(math.Hypot(n.X, n.Y), n.Z))
}

// DipDirectionDeg is the azimuth of an outward normal's horizontal part, in
// degrees clockwise from grid north, in [0, 360). It is not ok where the normal
// is vertical to within 0.1 mm per kilometre, and for the zero vector: level
// ground dips nowhere.
func DipDirectionDeg(n r3.Vec) (deg float64, ok bool) {
	if h := math.Hypot(n.X, n.Y); !(h > minTiltRad*math.Abs(n.Z)) {
		return 0, false
	}
	return azimuthDeg(n.X, n.Y), true
}

// azimuthDeg is the azimuth of (east, north) in [0, 360) degrees, 0 for none.
func azimuthDeg(east, north float64) float64 {
	if east == 0 && north == 0 { // signed zeros have a direction to Atan2
		return 0
	}
	a := degrees(math.Atan2(east, north))
	if a < 0 {
		a += 360
	}
	if a >= 360 || a == 0 { // a tiny negative angle rounds to 360; −0 to 0
		return 0
	}
	return a
}

func degrees(rad float64) float64 { return rad * (180 / math.Pi) }

func radians(deg float64) float64 { return deg * (math.Pi / 180) }
