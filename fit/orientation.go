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
