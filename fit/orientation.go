package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// TrendPlunge is the direction of a line along v, which need not be a unit
// vector: trend is the azimuth of its downward end in degrees clockwise from
// grid north, in [0, 360), plunge its angle below the horizontal, 0 to 90. The
// trend of a vertical line is 0; a horizontal line keeps the sense of v.
func TrendPlunge(v r3.Vec) (trendDeg, plungeDeg float64) {
	if v.Z > 0 {
		v = r3.Scale(-1, v)
	}
	return azimuthDeg(v.X, v.Y), degrees(math.Atan2(-v.Z, math.Hypot(v.X, v.Y)))
}

// NormalOf is the unit outward normal of ground of the given inclination and
// dip direction, in degrees: the inverse of InclinationDeg and DipDirectionDeg.
// The pole of the plane, its downward normal, has the trend dip direction + 180
// and the plunge 90 − inclination.
func NormalOf(inclinationDeg, dipDirectionDeg float64) r3.Vec {
	si, ci := math.Sincos(radians(inclinationDeg))
	sd, cd := math.Sincos(radians(dipDirectionDeg))
	return r3.Vec{X: sd * si, Y: cd * si, Z: ci}
}

// Directions sums unit vectors, with weights if need be, into the statistics of
// a Fisher distribution (Fisher 1953, doi 10.1098/rspa.1953.0064). The zero
// value is an empty sample. It keeps sums only, so that samples of any size
// cost the same.
type Directions struct {
	n     float64 // sum of weights
	sum   r3.Vec
	outer terrain.Covariance // sum of v·vᵀ
}

// Add takes one direction with a weight; a mean weight of 1 keeps sample sizes
// meaningful. The vector must be a unit vector.
func (d *Directions) Add(v r3.Vec, weight float64) {
	d.n += weight
	d.sum = r3.Add(d.sum, r3.Scale(weight, v))
	d.outer.XX += weight * v.X * v.X
	d.outer.XY += weight * v.X * v.Y
	d.outer.XZ += weight * v.X * v.Z
	d.outer.YY += weight * v.Y * v.Y
	d.outer.YZ += weight * v.Y * v.Z
	d.outer.ZZ += weight * v.Z * v.Z
}

// Mean is the mean direction and the resultant length R, at most the sum of
// weights. It is not ok where the directions cancel: R is then 0 or rounding.
func (d *Directions) Mean() (mean r3.Vec, resultant float64, ok bool) {
	r := r3.Norm(d.sum)
	if !(r > 8*epsilon*d.n) {
		return r3.Vec{}, r, false
	}
	return r3.Scale(1/r, d.sum), r, true
}

// Concentration is Fisher's estimate k = (N−1)/(N−R) of the precision. It is
// not ok for one direction or for directions that are all the same. The
// difference N−R rounds, so that k has a relative error of about epsilon·k.
func (d *Directions) Concentration() (k float64, ok bool) {
	spread := d.n - r3.Norm(d.sum)
	if !(d.n > 1 && spread > 4*epsilon*d.n) {
		return 0, false
	}
	return (d.n - 1) / spread, true
}

// LikelyConcentration is the maximum likelihood estimate of Fisher's κ, the
// root of coth κ − 1/κ = R/N, to a relative 1e-12. It is not ok where
// Concentration is not, and 0 for directions that cancel.
func (d *Directions) LikelyConcentration() (kappa float64, ok bool) {
	if _, ok := d.Concentration(); !ok {
		return 0, false
	}
	return inverseLangevin(r3.Norm(d.sum) / d.n), true
}

// ConfidenceDeg is the half angle, in degrees, of the cone about the mean that
// holds the true mean direction with probability 1−p: α95 for p = 0.05. It is
// not ok where there is no mean or no concentration, or where the sample does
// not bound the direction at all.
func (d *Directions) ConfidenceDeg(p float64) (alphaDeg float64, ok bool) {
	r := r3.Norm(d.sum)
	if _, ok := d.Concentration(); !ok || r == 0 {
		return 0, false
	}
	// 1 − cos α, so that small angles keep their digits.
	versine := (d.n - r) / r * math.Expm1(-math.Log(p)/(d.n-1))
	if !(versine <= 2) {
		return 0, false
	}
	return degrees(2 * math.Asin(math.Sqrt(versine/2))), true
}

// Tensor is the orientation tensor Σv·vᵀ/N (Scheidegger 1965): its eigenvalues,
// ascending and summing to 1, and its axes. Opposite directions count as one,
// so it describes poles and axes. An empty sample gives zeros.
func (d *Directions) Tensor() (lambda [3]float64, axes [3]r3.Vec) {
	c := d.outer
	if d.n > 0 {
		s := 1 / d.n
		c = terrain.Covariance{XX: s * c.XX, XY: s * c.XY, XZ: s * c.XZ, YY: s * c.YY, YZ: s * c.YZ, ZZ: s * c.ZZ}
	}
	return EigenSym3(c)
}

// inverseLangevin solves coth κ − 1/κ = r for κ, 0 ≤ r < 1.
func inverseLangevin(r float64) float64 {
	// Cohen's rational approximation (1991, Rheologica Acta 30:270) is within
	// 5 %; Newton's iteration does the rest.
	k := r * (3 - r*r) / (1 - r*r)
	if k < 1e-3 {
		return k // the next term is 9/5·r³ against Cohen's 2·r³
	}
	for range 20 {
		s := math.Sinh(min(k, 300))
		slope := 1/(k*k) - 1/(s*s)
		next := k - (1/math.Tanh(k)-1/k-r)/slope
		if math.Abs(next-k) <= 1e-14*k {
			return next
		}
		k = next
	}
	return k
}

// CircularMean is the mean of azimuths in degrees, in [0, 360), and the mean
// resultant length, 0 to 1. It is not ok for no azimuths or where they cancel.
func CircularMean(azimuthsDeg []float64) (meanDeg, resultant float64, ok bool) {
	return circularMean(azimuthsDeg, 1)
}

// AxialMean is CircularMean of lines without a sense: angles are doubled for
// the average (Krumbein 1939), and the mean lies in [0, 180).
func AxialMean(azimuthsDeg []float64) (meanDeg, resultant float64, ok bool) {
	m, r, ok := circularMean(azimuthsDeg, 2)
	return m / 2, r, ok
}

func circularMean(azimuthsDeg []float64, fold float64) (meanDeg, resultant float64, ok bool) {
	var east, north float64
	for _, a := range azimuthsDeg {
		s, c := math.Sincos(radians(fold * a))
		east, north = east+s, north+c
	}
	n := float64(len(azimuthsDeg))
	r := math.Hypot(east, north)
	if !(r > 8*epsilon*n) {
		return 0, 0, false
	}
	return azimuthDeg(east, north), r / n, true
}

// CircularDeviationDeg is the circular standard deviation √(−2·ln R̄), in
// degrees, of a mean resultant length.
func CircularDeviationDeg(resultant float64) float64 {
	return degrees(math.Sqrt(-2 * math.Log(min(resultant, 1))))
}
