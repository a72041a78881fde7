package fit

// Limits of arithmetic. What a user may choose stands in the options of the
// function concerned, not here.
const (
	// epsilon is the spacing of float64 at 1.
	epsilon = 1.0 / (1 << 52)

	// quantumM is the resolution of all moments, 0.1 mm.
	quantumM = 1e-4

	// minSpreadM2 is the least second eigenvalue of a covariance, in m², that
	// determines a plane. Coordinates are rounded to quantumM, which adds
	// quantumM²/12 to the variance across a line; twelve times that is spread
	// that was measured, not made by rounding.
	minSpreadM2 = quantumM * quantumM

	// minSpreadRatio is the least ratio of the second to the third eigenvalue
	// that determines a plane: a strip a thousand times as long as it is wide
	// turns about its length at the touch of one point.
	minSpreadRatio = 1e-6

	// minNormalGap is the least difference of the two smallest eigenvalues,
	// relative to the largest, that determines a normal. EigenSym3 errs by up
	// to 8·epsilon; below that its choice of axis is rounding alone.
	minNormalGap = 8 * epsilon

	// minTiltRad is the least angle between a normal and the vertical that has
	// an azimuth: one quantum of height, 0.1 mm, over a kilometre.
	minTiltRad = 1e-7
)

// flatSize is the least half extent of a point set, relative to the larger of
// its size and its coordinates, that is not made by rounding: each of the
// steps that turn coordinates into the set's own frame adds an epsilon or two.
const flatSize = 16 * epsilon
