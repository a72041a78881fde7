package hazards

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestHoldsTable(t *testing.T) {
	inf := math.Inf(1)
	upper := criterion{limit: Range{-inf, -inf, 0, 1}, low: -inf, high: inf}
	both := criterion{limit: Range{-1.96, 0, 0, 1.96}, low: -inf, high: inf}
	ground := criterion{limit: Range{0, 0, 10, 25}, low: 0, high: 180}
	for _, c := range []struct {
		name string
		of   criterion
		e    estimate
		want float64
	}{
		// Quantiles of the normal distribution, as in any table of it.
		{"on the limit", upper, estimate{1, 0.3}, 0.5},
		{"1 sigma inside", upper, estimate{0, 1}, 0.8413447460685429},
		{"1.6448536 sigma inside", upper, estimate{1 - 1.6448536269514722, 1}, 0.95},
		{"1 sigma outside", upper, estimate{2, 1}, 0.15865525393145705},
		{"two-sided 95 %", both, estimate{0, 1}, 0.9500042097035591},
		{"sure, inside", upper, estimate{1, 0}, 1},
		{"sure, outside", upper, estimate{1.1, 0}, 0},
		{"infinite clearance", criterion{limit: Range{0.2, 1, inf, inf}, low: -1, high: inf}, estimate{inf, 0.1}, 1},
		{"level ground", ground, estimate{0.1, 2}, 1},
		{"coverage of 1 with any limit", criterion{limit: Range{0, 0.5, inf, inf}, low: 0, high: 1}, estimate{0.02, 0.1}, 1},
	} {
		near(t, c.name, c.of.holds(c.e), c.want, 1e-12)
	}
}

// The closed form against drawing the errors.
func TestConfidenceAgainstMonteCarlo(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	p, _ := Example("suspended")
	c := newCriteria(&p)
	for range 8 {
		m := measured{
			inclination: {40 + 40*rng.Float64(), 6},
			roughness:   {0.12 * rng.Float64(), 0.03},
			step:        {0.25 * rng.Float64(), 0.06},
			coverage:    {0.85 + 0.15*rng.Float64(), 0.05},
			clearance:   {0.2 + rng.Float64(), 0.3},
		}
		const draws = 200000
		held := 0
		for range draws {
			ok := true
			for i := range m {
				x := m[i].value + m[i].sigma*rng.NormFloat64()
				ok = ok && c[i].limit.allows(x)
			}
			if ok {
				held++
			}
		}
		want := float64(held) / draws
		got := c.confidence(&m)
		near(t, "confidence", got, want, 4*math.Sqrt(want*(1-want)/draws))
	}
}
