package hazards

import "math"

// confidence is the probability that every allowed limit holds, if the true
// value of each measure is normal about its estimate with the stated standard
// uncertainty, and the errors of the measures are independent of each other.
//
// They are not quite: a rough spot is wrong about its roughness, its step and
// its inclination together. For normal errors that go together the probability
// that all one-sided limits hold is at least the product (Slepian 1962, Bell
// Syst. Tech. J. 41, 463–501), so independence errs on the safe side. What no
// sigma states, such as the survey's systematic error or what changed since its
// date, is not in it.
func (c *criteria) confidence(m *measured) float64 {
	p := 1.0
	for i := range c {
		p *= c[i].holds(m[i])
	}
	return p
}

// holds is the probability that the true value of one measure is within its
// allowed limits. A bound that no true value can pass never fails: without
// that, level ground would be "not below 0°" with a probability of one half.
func (c *criterion) holds(e estimate) float64 {
	below, above := 0.0, 0.0
	if c.limit.AllowedMin > c.low {
		below = exceeds(c.limit.AllowedMin-e.value, e.sigma)
	}
	if c.limit.AllowedMax < c.high {
		above = exceeds(e.value-c.limit.AllowedMax, e.sigma)
	}
	return max(0, 1-below-above)
}

// exceeds is the probability that the true value lies past a bound when the
// estimate does by d: Φ(d/σ). Without uncertainty, a value on the bound has not
// passed it.
func exceeds(d, sigma float64) float64 {
	if sigma == 0 || math.IsInf(d, 0) {
		if d > 0 {
			return 1
		}
		return 0
	}
	return 0.5 * math.Erfc(-d/(sigma*math.Sqrt2))
}
