package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
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

// Directions sums unit vectors into the statistics of a Fisher distribution
// (Fisher 1953, doi 10.1098/rspa.1953.0064). The zero value is an empty sample.
// It keeps sums only, so that samples of any size cost the same. Horizontal
// vectors give the circular statistics of their azimuths.
type Directions struct {
	n   float64
	sum r3.Vec
}

// Add takes one direction, which must be a unit vector.
func (d *Directions) Add(v r3.Vec) {
	d.n++
	d.sum = r3.Add(d.sum, v)
}

// Mean is the mean direction and the resultant length R, at most the number N of
// directions. It is not ok where they cancel: R is then 0 or rounding.
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

// DispersionDeg is the angle in degrees whose cosine is R/N, the mean cosine of
// the directions' angles to their mean: 0 for equal ones, 90 for ones that
// cancel, and for small angles their root mean square. An empty sample gives 0.
func (d *Directions) DispersionDeg() float64 {
	if d.n == 0 {
		return 0
	}
	return degrees(math.Acos(min(1, r3.Norm(d.sum)/d.n)))
}

// CircularDeviationDeg is the circular standard deviation √(−2·ln R/N), in
// degrees, of the azimuths of horizontal directions. It is not ok where there is
// no mean.
func (d *Directions) CircularDeviationDeg() (deg float64, ok bool) {
	_, r, ok := d.Mean()
	if !ok {
		return 0, false
	}
	return degrees(math.Sqrt(-2 * math.Log(min(1, r/d.n)))), true
}
