package fit

import (
	"math"
	"testing"
)

// circular95 is the factor of NSSDA and ASPRS 2014 from a horizontal RMSE to the
// accuracy at 95 %, √(χ²₂(0.95)/2). Checkpoints tell heights only, so the program
// has no use for it; the published examples give it.
const circular95 = 1.7308183826022854

// Abdullah, Mapping Matters, Photogrammetric Engineering & Remote Sensing, May
// 2014, p. 397: sample deviations 0.075, 0.073 and 0.030; the digits beyond and
// the other measures recomputed.
func TestErrorsAbdullah(t *testing.T) {
	e := ErrorsOf([]float64{-.060, .100, -.060, -.112, -.120, -.100, -.060})
	n := ErrorsOf([]float64{.080, -.045, .080, .007, .150, -.045, .080})
	h := ErrorsOf([]float64{.055, -.006, -.017, .042, -.011, .013, .048})
	near(t, "deviation east", e.Deviation, 0.0747160, 5e-8)
	near(t, "deviation north", n.Deviation, 0.0734108, 5e-8)
	near(t, "deviation height", h.Deviation, 0.0303079, 5e-8)
	near(t, "mean east", e.Mean, -.0588571, 5e-8)
	near(t, "mean north", n.Mean, .0438571, 5e-8)
	near(t, "mean height", h.Mean, .0177143, 5e-8)
	near(t, "RMSE east", e.RMSE, .0908248, 5e-8)
	near(t, "RMSE north", n.RMSE, .0808870, 5e-8)
	near(t, "RMSE height", h.RMSE, .0331835, 5e-8)
	near(t, "RMSE horizontal", CombineRMSE(e.RMSE, n.RMSE), .1216218, 5e-8)
	near(t, "horizontal 95 %", circular95*CombineRMSE(e.RMSE, n.RMSE), .2105030, 3e-6)
	near(t, "vertical 95 %", Vertical95(h.RMSE), .0650396, 2e-6)
	near(t, "largest", e.Max, 0.12, 0)
}

// ASPRS Positional Accuracy Standards 2014, annex D (from memory): RMSE 0.102,
// 0.106 and 0.081, horizontal 0.147, at 95 % 0.255 and 0.160.
func TestErrorsASPRS(t *testing.T) {
	x := ErrorsOf([]float64{-.140, -.100, .017, -.070, .130})
	y := ErrorsOf([]float64{-.070, -.100, -.070, .150, .120})
	z := ErrorsOf([]float64{-.071, .010, .102, -.100, .087})
	near(t, "RMSE x", x.RMSE, .101675, 5e-7)
	near(t, "RMSE y", y.RMSE, .106489, 5e-7)
	near(t, "RMSE z", z.RMSE, .081381, 5e-7)
	near(t, "RMSE r", CombineRMSE(x.RMSE, y.RMSE), .147234, 1e-6)
	near(t, "horizontal 95 %", circular95*CombineRMSE(x.RMSE, y.RMSE), .254832, 5e-6)
	near(t, "vertical 95 %", Vertical95(z.RMSE), .159506, 5e-6)
}

// The factors of NSSDA and ASPRS 2014 (from memory), and what they mean: the
// share of normal errors inside.
func TestErrorsFactors(t *testing.T) {
	axis := circular95 * CombineRMSE(1, 1)
	near(t, "2.4477", axis, 2.447747, 5e-7)
	near(t, "1.9600", Vertical95(1), 1.959964, 5e-7)
	near(t, "share inside the circle", 1-math.Exp(-axis*axis/2), 0.95, 1e-12)
	near(t, "share within the height", math.Erf(Vertical95(1)/math.Sqrt2), 0.95, 1e-12)
}

// Edition 2 of 2023 (from memory): the checkpoints' own survey error counts.
func TestErrorsCombine(t *testing.T) {
	near(t, "height", CombineRMSE(0.04, 0.03), 0.05, 1e-16)
	near(t, "space", CombineRMSE(0.02, 0.03, 0.06), 0.07, 1e-16)
	near(t, "nothing", CombineRMSE(), 0, 0)
}

func TestErrorsFew(t *testing.T) {
	if got := ErrorsOf(nil); got != (Errors{}) {
		t.Errorf("of none: %+v", got)
	}
	if got, want := ErrorsOf([]float64{-2}), (Errors{N: 1, Mean: -2, RMSE: 2, Max: 2}); got != want {
		t.Errorf("of one: %+v, want %+v", got, want)
	}
}
