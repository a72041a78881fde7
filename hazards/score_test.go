package hazards

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The tire tread compound of Derringer & Suich (1980), section "Example": the
// limits are as printed in several public texts; the responses at the optimum,
// their desirabilities and D are from memory.
func TestScorePublishedExample(t *testing.T) {
	inf := math.Inf(1)
	c := criteria{
		{limit: Range{120, 170, inf, inf}, weight: 1},   // abrasion index, larger is better
		{limit: Range{1000, 1300, inf, inf}, weight: 1}, // modulus, larger is better
		{limit: Range{400, 500, 500, 600}, weight: 1},   // elongation, 500 is best
		{limit: Range{60, 67.5, 67.5, 75}, weight: 1},   // hardness, 67.5 is best
		{limit: Range{-inf, -inf, inf, inf}},            // a fifth that asks nothing
	}
	m := measured{{value: 129.5}, {value: 1300}, {value: 465.7}, {value: 68}}
	for i, want := range []float64{0.189, 1, 0.656, 0.932} {
		near(t, "desirability", c[i].limit.desirability(m[i].value), want, 0.0015)
	}
	near(t, "score", c.score(&m), 0.583, 0.0015)
}

func TestDesirability(t *testing.T) {
	inf := math.Inf(1)
	atMost := Range{-inf, -inf, 0.02, 0.10}
	atLeast := Range{0.8, 1, inf, inf}
	both := Range{35, 50, 75, 85}
	sharp := Range{-inf, -inf, 5, 5}
	for _, c := range []struct {
		r       Range
		x, want float64
	}{
		{atMost, 0, 1}, {atMost, 0.02, 1}, {atMost, 0.06, 0.5}, {atMost, 0.08, 0.25}, {atMost, 0.10, 0}, {atMost, 0.11, 0},
		{atLeast, 1, 1}, {atLeast, 0.9, 0.5}, {atLeast, 0.8, 0}, {atLeast, 0.7, 0}, {atLeast, inf, 1},
		{both, 34, 0}, {both, 35, 0}, {both, 42.5, 0.5}, {both, 50, 1}, {both, 60, 1}, {both, 75, 1}, {both, 80, 0.5}, {both, 85, 0}, {both, 86, 0},
		{sharp, 4, 1}, {sharp, 5, 1}, {sharp, 5.0001, 0},
		{both, math.NaN(), 0}, {atMost, math.NaN(), 0},
	} {
		near(t, "desirability", c.r.desirability(c.x), c.want, 1e-12)
	}
}

// scored is a profile and measures at desirability d[i] of each measure.
func scored(d [measures]float64, w Weights) (criteria, measured) {
	p := Profile{
		FootprintRadiusM: 1,
		InclinationDeg:   Range{0, 0, 0, 100},
		RoughnessM:       Limit{0, 1},
		StepM:            Limit{0, 1},
		ClearanceM:       Limit{1, 0},
		Coverage:         Limit{1, 0},
		Weights:          w,
	}
	m := measured{
		inclination: {value: 100 * (1 - d[inclination])},
		roughness:   {value: 1 - d[roughness]},
		step:        {value: 1 - d[step]},
		coverage:    {value: d[coverage]},
		clearance:   {value: d[clearance]},
	}
	return newCriteria(&p), m
}

func TestScoreIsWeightedGeometricMean(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 200 {
		var d [measures]float64
		for i := range d {
			d[i] = 1 - rng.Float64()
		}
		w := Weights{rng.Float64(), rng.Float64(), rng.Float64(), rng.Float64(), rng.Float64()}
		c, m := scored(d, w)
		weights := [measures]float64{w.Inclination, w.Roughness, w.Step, w.Coverage, w.Clearance}
		product, sum := 1.0, 0.0
		for i := range d {
			product *= math.Pow(d[i], weights[i])
			sum += weights[i]
		}
		got := c.score(&m)
		near(t, "score", got, math.Pow(product, 1/sum), 1e-12)
		// Scaling all weights changes nothing.
		c2, _ := scored(d, Weights{3 * w.Inclination, 3 * w.Roughness, 3 * w.Step, 3 * w.Clearance, 3 * w.Coverage})
		near(t, "score with scaled weights", c2.score(&m), got, 1e-12)
		// A mean lies between its extremes.
		lo, hi := 1.0, 0.0
		for _, v := range d {
			lo, hi = min(lo, v), max(hi, v)
		}
		if got < lo-1e-12 || got > hi+1e-12 {
			t.Errorf("score %g outside %g to %g", got, lo, hi)
		}
	}
}

func TestScoreOutside(t *testing.T) {
	ones := Weights{1, 1, 1, 1, 1}
	for i := range measures {
		d := [measures]float64{1, 1, 1, 1, 1}
		d[i] = -0.01
		c, m := scored(d, ones)
		if got := c.score(&m); got != 0 {
			t.Errorf("measure %d outside: score %g", i, got)
		}
		// A weight of 0 leaves it out of the score but not out of the limits.
		c[i].weight = 0
		if got := c.score(&m); got != 0 {
			t.Errorf("measure %d outside without weight: score %g", i, got)
		}
		d[i] = 0
		c, m = scored(d, ones)
		if got := c.score(&m); got != 0 {
			t.Errorf("measure %d on its limit: score %g", i, got)
		}
		c[i].weight = 0
		if got := c.score(&m); got != 1 {
			t.Errorf("measure %d on its limit without weight: score %g", i, got)
		}
	}
}

func TestLimitedBy(t *testing.T) {
	ones := Weights{1, 1, 1, 1, 1}
	for _, c := range []struct {
		d    [measures]float64 // inclination, roughness, step, coverage, clearance
		w    Weights
		want Measure
	}{
		{[measures]float64{0.9, 0.8, 0.7, 0.6, 0.5}, ones, Clearance},
		{[measures]float64{0.5, 0.6, 0.7, 0.8, 0.9}, ones, Inclination},
		{[measures]float64{0.9, 0.5, 0.5, 0.9, 0.9}, ones, Roughness}, // equal: the first
		{[measures]float64{0.9, 0.9, 0.9, 0.6, 0.7}, Weights{1, 1, 1, 2, 1}, Clearance},
		{[measures]float64{0.9, 0.5, 0.8, 0.9, 0.9}, Weights{1, 0, 1, 1, 1}, Step},
	} {
		k, m := scored(c.d, c.w)
		if got := k.limitedBy(&m); got != c.want {
			t.Errorf("%v with %v: limited by %s, want %s", c.d, c.w, got, c.want)
		}
	}
	// All at their best: the least sure.
	k, m := scored([measures]float64{1, 1, 1, 1, 1}, ones)
	m[step].sigma = 0.7
	if got := k.limitedBy(&m); got != Step {
		t.Errorf("all best: limited by %s, want %s", got, Step)
	}
}
