package hazards

import (
	"fmt"
	"math"
)

// A Limit is a measure's best and allowed value: desirability falls linearly
// from 1 at Best to 0 at Allowed. Allowed lies above Best where less is better
// (roughness, step) and below it where more is better (coverage, clearance).
type Limit struct {
	Best    float64 `yaml:"best" json:"best"`
	Allowed float64 `yaml:"allowed" json:"allowed"`
}

// A Range is a two-sided limit: desirability is 1 between BestMin and BestMax
// and falls linearly to 0 at AllowedMin and AllowedMax.
type Range struct {
	AllowedMin float64 `yaml:"allowed_min" json:"allowed_min"`
	BestMin    float64 `yaml:"best_min" json:"best_min"`
	BestMax    float64 `yaml:"best_max" json:"best_max"`
	AllowedMax float64 `yaml:"allowed_max" json:"allowed_max"`
}

// A Profile says what is to be set down and what it tolerates. Limits are the
// user's: the named examples are examples, not safety limits.
//
// ClearanceM counts from the rim of the footprint and is at least minus the
// footprint radius, so a clearance allowed at or below that never excludes
// ground; one below 0 lets a footprint overlap an obstacle.
type Profile struct {
	Name             string  `yaml:"profile" json:"profile"`
	FootprintRadiusM float64 `yaml:"footprint_radius_m" json:"footprint_radius_m"`
	InclinationDeg   Range   `yaml:"inclination_deg" json:"inclination_deg"`
	RoughnessM       Limit   `yaml:"roughness_m" json:"roughness_m"`
	StepM            Limit   `yaml:"step_m" json:"step_m"`
	ClearanceM       Limit   `yaml:"clearance_m" json:"clearance_m"`
	Coverage         Limit   `yaml:"coverage" json:"coverage"`
	Weights          Weights `yaml:"weights" json:"weights"`
}

// Weights are the exponents of the weighted geometric mean; zero leaves a
// measure out of the score but not out of the limits.
type Weights struct {
	Inclination float64 `yaml:"inclination" json:"inclination"`
	Roughness   float64 `yaml:"roughness" json:"roughness"`
	Step        float64 `yaml:"step" json:"step"`
	Clearance   float64 `yaml:"clearance" json:"clearance"`
	Coverage    float64 `yaml:"coverage" json:"coverage"`
}

// Examples lists the names that Example knows.
func Examples() []string { return []string{"suspended", "ledge", "pad"} }

// Example returns the example profile of that name: "suspended" is a rig held
// by ropes on a steep face, "ledge" a person standing, "pad" goods set down
// from the air. They show what a profile looks like and let a first run say
// something; none of their numbers is a safety limit or taken from a standard.
func Example(name string) (Profile, bool) {
	switch name {
	case "suspended":
		return Profile{
			Name:             name,
			FootprintRadiusM: 0.60,
			InclinationDeg:   Range{AllowedMin: 35, BestMin: 50, BestMax: 75, AllowedMax: 85},
			RoughnessM:       Limit{Best: 0.03, Allowed: 0.12},
			StepM:            Limit{Best: 0.08, Allowed: 0.25},
			ClearanceM:       Limit{Best: 1.00, Allowed: 0.20},
			Coverage:         Limit{Best: 0.98, Allowed: 0.85},
			Weights:          Weights{Inclination: 1, Roughness: 1, Step: 1, Clearance: 1, Coverage: 1},
		}, true
	case "ledge":
		return Profile{
			Name:             name,
			FootprintRadiusM: 0.40,
			InclinationDeg:   Range{AllowedMin: 0, BestMin: 0, BestMax: 10, AllowedMax: 25},
			RoughnessM:       Limit{Best: 0.02, Allowed: 0.08},
			StepM:            Limit{Best: 0.05, Allowed: 0.15},
			ClearanceM:       Limit{Best: 0.30, Allowed: 0},
			Coverage:         Limit{Best: 0.98, Allowed: 0.85},
			Weights:          Weights{Inclination: 2, Roughness: 1, Step: 1, Clearance: 1, Coverage: 1},
		}, true
	case "pad":
		return Profile{
			Name:             name,
			FootprintRadiusM: 1.50,
			InclinationDeg:   Range{AllowedMin: 0, BestMin: 0, BestMax: 3, AllowedMax: 10},
			RoughnessM:       Limit{Best: 0.02, Allowed: 0.06},
			StepM:            Limit{Best: 0.05, Allowed: 0.15},
			ClearanceM:       Limit{Best: 3.00, Allowed: 1.00},
			Coverage:         Limit{Best: 0.98, Allowed: 0.90},
			Weights:          Weights{Inclination: 2, Roughness: 1, Step: 1, Clearance: 2, Coverage: 1},
		}, true
	}
	return Profile{}, false
}

// Validate reports the first field, in the order of the worksite file's keys,
// whose value makes no sense, under that key.
func (p *Profile) Validate() error {
	if !(p.FootprintRadiusM > 0) || math.IsInf(p.FootprintRadiusM, 0) {
		return fmt.Errorf("hazards: footprint_radius_m is %g, must be above 0 and finite", p.FootprintRadiusM)
	}
	if err := p.InclinationDeg.validate("inclination_deg", 0, 180); err != nil {
		return err
	}
	inf := math.Inf(1)
	for _, c := range [...]struct {
		key       string
		limit     Limit
		low, high float64 // values that the measure can take
		more      bool    // more is better
	}{
		{"roughness_m", p.RoughnessM, 0, inf, false},
		{"step_m", p.StepM, 0, inf, false},
		{"clearance_m", p.ClearanceM, -inf, inf, true},
		{"coverage", p.Coverage, 0, 1, true},
	} {
		if err := c.limit.validate(c.key, c.low, c.high, c.more); err != nil {
			return err
		}
	}
	return p.Weights.validate()
}

func (r Range) validate(key string, low, high float64) error {
	names := [4]string{"allowed_min", "best_min", "best_max", "allowed_max"}
	for i, v := range [4]float64{r.AllowedMin, r.BestMin, r.BestMax, r.AllowedMax} {
		if err := inside(key+"."+names[i], v, low, high); err != nil {
			return err
		}
	}
	for i, pair := range [3][2]float64{{r.AllowedMin, r.BestMin}, {r.BestMin, r.BestMax}, {r.BestMax, r.AllowedMax}} {
		if pair[0] > pair[1] {
			return fmt.Errorf("hazards: %s.%s is %g, above %s %g", key, names[i], pair[0], names[i+1], pair[1])
		}
	}
	return nil
}

func (l Limit) validate(key string, low, high float64, more bool) error {
	if err := inside(key+".best", l.Best, low, high); err != nil {
		return err
	}
	if err := inside(key+".allowed", l.Allowed, low, high); err != nil {
		return err
	}
	switch {
	case more && l.Allowed > l.Best:
		return fmt.Errorf("hazards: %s.allowed is %g, above best %g, but more is better", key, l.Allowed, l.Best)
	case !more && l.Allowed < l.Best:
		return fmt.Errorf("hazards: %s.allowed is %g, below best %g, but less is better", key, l.Allowed, l.Best)
	}
	return nil
}

func (w Weights) validate() error {
	sum := 0.0
	for _, c := range [...]struct {
		key   string
		value float64
	}{
		{"inclination", w.Inclination}, {"roughness", w.Roughness}, {"step", w.Step},
		{"clearance", w.Clearance}, {"coverage", w.Coverage},
	} {
		if err := inside("weights."+c.key, c.value, 0, math.Inf(1)); err != nil {
			return err
		}
		sum += c.value
	}
	if sum == 0 {
		return fmt.Errorf("hazards: weights are all 0, at least one must be above")
	}
	return nil
}

// inside reports a value that is not finite or not in [low, high].
func inside(key string, v, low, high float64) error {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return fmt.Errorf("hazards: %s is %g, must be finite", key, v)
	case v < low || v > high:
		if math.IsInf(high, 1) {
			return fmt.Errorf("hazards: %s is %g, must not be below %g", key, v, low)
		}
		return fmt.Errorf("hazards: %s is %g, must be from %g to %g", key, v, low, high)
	}
	return nil
}
