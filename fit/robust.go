package fit

const (
	// tukeyCutoff is the biweight's cutoff, in standard deviations, at which it
	// keeps 95 % efficiency on normal errors (Beaton & Tukey 1974,
	// Technometrics 16:147–185; Holland & Welsch 1977).
	tukeyCutoff = 4.685

	// meanToSigma turns a mean absolute residual into a standard deviation of
	// normal errors: √(π/2).
	meanToSigma = 1.2533141373155003
)

// tukeyWeight is Tukey's biweight (1−u²)² of a residual in units of the cutoff,
// 0 from the cutoff on.
func tukeyWeight(u float64) float64 {
	v := 1 - u*u
	if v <= 0 {
		return 0
	}
	return v * v
}
