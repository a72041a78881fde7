package fit

import "math"

// Errors are the residuals of a survey at checkpoints along one axis: survey
// less checkpoint.
type Errors struct {
	N         int
	Mean      float64 // bias
	Deviation float64 // sample standard deviation, n−1; 0 for a single residual
	RMSE      float64 // root mean square, n
	Max       float64 // largest magnitude
}

// ErrorsOf summarises residuals, in their unit. None at all give zeros.
func ErrorsOf(residuals []float64) Errors {
	e := Errors{N: len(residuals)}
	if e.N == 0 {
		return e
	}
	n := float64(e.N)
	for _, r := range residuals {
		e.Mean += r / n
		e.Max = max(e.Max, math.Abs(r))
	}
	var about, squares float64 // about the mean: no cancellation
	for _, r := range residuals {
		about += (r - e.Mean) * (r - e.Mean)
		squares += r * r
	}
	if e.N > 1 {
		e.Deviation = math.Sqrt(about / (n - 1))
	}
	e.RMSE = math.Sqrt(squares / n)
	return e
}

// Vertical95 is the vertical accuracy at 95 % confidence, 1.9600·RMSE, of
// NSSDA (FGDC-STD-007.3-1998) and the ASPRS Positional Accuracy Standards of
// 2014, which calls it NVA on open ground. It supposes normal errors without
// bias.
func Vertical95(rmseH float64) float64 {
	const twoSided95 = 1.959963984540054 // Φ⁻¹(0.975)
	return twoSided95 * rmseH
}

// CombineRMSE adds independent errors: of two axes to one of the plane or of
// space, or of the survey against the checkpoints with that of the checkpoints
// themselves, which the ASPRS Positional Accuracy Standards Edition 2 (2023)
// require.
func CombineRMSE(rmse ...float64) float64 {
	var sum float64
	for _, r := range rmse {
		sum = math.Hypot(sum, r)
	}
	return sum
}
