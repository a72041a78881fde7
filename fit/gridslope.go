package fit

import "math"

// A Window is a cell of an elevation grid with its eight neighbours, in rows
// from north to south and from west to east; element 4 is the cell. A
// neighbour without data is NaN, and so is then every result that uses it: no
// height is invented at edges and holes.
type Window [9]float64

// Horn is the gradient east and north by Horn's method (1981, doi
// 10.1109/PROC.1981.11918), a weighted mean over the six neighbours on either
// side. The cell size has the unit of the heights and must be positive.
func (w *Window) Horn(cell float64) (east, north float64) {
	east = ((w[2] + 2*w[5] + w[8]) - (w[0] + 2*w[3] + w[6])) / (8 * cell)
	north = ((w[0] + 2*w[1] + w[2]) - (w[6] + 2*w[7] + w[8])) / (8 * cell)
	return east, north
}

// ZevenbergenThorne is the gradient east and north of the quartic through the
// window (Zevenbergen & Thorne 1987, doi 10.1002/esp.3290120107): the central
// difference of the four nearest neighbours, better than Horn's on smooth
// ground and worse on rough.
func (w *Window) ZevenbergenThorne(cell float64) (east, north float64) {
	return (w[5] - w[3]) / (2 * cell), (w[1] - w[7]) / (2 * cell)
}

// GradientSlopeDeg is the slope of a gradient in degrees, 0 to 90.
func GradientSlopeDeg(east, north float64) float64 {
	return degrees(math.Atan(math.Hypot(east, north)))
}

// GradientAspectDeg is the azimuth of steepest descent in degrees, in
// [0, 360). It is not ok on level ground and where the gradient is NaN.
func GradientAspectDeg(east, north float64) (deg float64, ok bool) {
	if math.IsNaN(east+north) || east == 0 && north == 0 {
		return 0, false
	}
	return azimuthDeg(-east, -north), true
}

// RuggednessRiley is the root of the sum of squared height differences to the
// eight neighbours (Riley, DeGloria & Elliot 1999, Intermountain J. Sci. 5:23).
func (w *Window) RuggednessRiley() float64 {
	var sum float64
	for _, v := range w {
		sum += (v - w[4]) * (v - w[4])
	}
	return math.Sqrt(sum)
}

// RuggednessWilson is the mean absolute height difference to the eight
// neighbours (Wilson et al. 2007, doi 10.1080/01490410701295962).
func (w *Window) RuggednessWilson() float64 {
	var sum float64
	for _, v := range w {
		sum += math.Abs(v - w[4])
	}
	return sum / 8
}

// Position is the height of the cell above the mean of its neighbours, the
// topographic position index of Wilson et al. 2007.
func (w *Window) Position() float64 {
	var sum float64
	for _, v := range w {
		sum += w[4] - v
	}
	return sum / 8
}

// Range is the greatest less the least height of the window, the roughness of
// Wilson et al. 2007.
func (w *Window) Range() float64 {
	lo, hi := w[0], w[0]
	for _, v := range w[1:] {
		lo, hi = min(lo, v), max(hi, v)
	}
	return hi - lo
}
