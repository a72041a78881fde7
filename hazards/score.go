package hazards

import "math"

// An estimate is a measured value with its standard uncertainty.
type estimate struct{ value, sigma float64 }

// The measures in their fixed order, which breaks ties.
const (
	inclination = iota
	roughness
	step
	coverage
	clearance
	measures
)

// measured holds one estimate of each measure, in that order.
type measured [measures]estimate

// A criterion is what a profile asks of one measure. A one-sided limit is a
// Range that is infinite on the side that does not matter.
type criterion struct {
	measure   Measure
	limit     Range
	weight    float64
	low, high float64 // the true value cannot lie outside
}

// criteria are a profile's, in the order of the measures.
type criteria [measures]criterion

func newCriteria(p *Profile) criteria {
	inf := math.Inf(1)
	atMost := func(l Limit) Range { return Range{-inf, -inf, l.Best, l.Allowed} }
	atLeast := func(l Limit) Range { return Range{l.Allowed, l.Best, inf, inf} }
	w := p.Weights
	return criteria{
		inclination: {Inclination, p.InclinationDeg, w.Inclination, 0, 180},
		roughness:   {Roughness, atMost(p.RoughnessM), w.Roughness, 0, inf},
		step:        {Step, atMost(p.StepM), w.Step, 0, inf},
		coverage:    {Coverage, atLeast(p.Coverage), w.Coverage, 0, 1},
		clearance:   {Clearance, atLeast(p.ClearanceM), w.Clearance, -p.FootprintRadiusM, inf},
	}
}

// allows reports whether x is within the allowed limits, both included.
func (r Range) allows(x float64) bool { return x >= r.AllowedMin && x <= r.AllowedMax }

// desirability is the one- or two-sided desirability of Derringer & Suich
// (1980, J. Quality Technology 12(4), 214–219, doi
// 10.1080/00224065.1980.11980968) with exponent 1: 1 within the best limits, 0
// beyond the allowed ones, linear between. Where best and allowed coincide it
// is 1 on the limit.
func (r Range) desirability(x float64) float64 {
	switch {
	case !r.allows(x): // also NaN
		return 0
	case x < r.BestMin:
		return (x - r.AllowedMin) / (r.BestMin - r.AllowedMin)
	case x > r.BestMax:
		return (r.AllowedMax - x) / (r.AllowedMax - r.BestMax)
	}
	return 1
}

// score is the overall desirability, Πdᵢ^(wᵢ/Σw), the weighted form of the
// geometric mean of Derringer & Suich. It is 0 as soon as one measure is
// outside its allowed limits, whatever its weight, and where one with a weight
// stands on an allowed limit that is not also its best.
func (c *criteria) score(m *measured) float64 {
	var sum, weights float64
	for i := range c {
		if !c[i].limit.allows(m[i].value) {
			return 0
		}
		if c[i].weight == 0 {
			continue
		}
		d := c[i].limit.desirability(m[i].value)
		if d == 0 {
			return 0
		}
		sum += c[i].weight * math.Log(d)
		weights += c[i].weight
	}
	return math.Exp(sum / weights)
}

// limitedBy names the measure that takes most off the score: the smallest
// dᵢ^wᵢ. Among equals, such as when every measure is at its best, it is the one
// least sure to hold its allowed limits, and then the first in order.
func (c *criteria) limitedBy(m *measured) Measure {
	best, bestLog, bestP := 0, math.Inf(1), math.Inf(1)
	for i := range c {
		log := 0.0
		if c[i].weight > 0 {
			log = c[i].weight * math.Log(c[i].limit.desirability(m[i].value))
		}
		p := c[i].holds(m[i])
		if log < bestLog || log == bestLog && p < bestP {
			best, bestLog, bestP = i, log, p
		}
	}
	return c[best].measure
}
