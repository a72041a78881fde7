package hazards

import (
	"math"
	"strings"
	"testing"
)

func TestExamples(t *testing.T) {
	names := Examples()
	if len(names) != 3 {
		t.Errorf("examples %v", names)
	}
	for _, name := range names {
		p, ok := Example(name)
		if !ok || p.Name != name {
			t.Errorf("%s: ok %v, name %q", name, ok, p.Name)
		}
		if err := p.Validate(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, ok := Example("nothing"); ok {
		t.Error("an example of nothing")
	}
}

func TestProfileValidate(t *testing.T) {
	for _, c := range []struct {
		change func(p *Profile)
		want   string
	}{
		{func(p *Profile) {}, ""},
		{func(p *Profile) { p.FootprintRadiusM = 0 }, "footprint_radius_m is 0, must be above 0 and finite"},
		{func(p *Profile) { p.FootprintRadiusM = math.NaN() }, "footprint_radius_m is NaN, must be above 0 and finite"},
		{func(p *Profile) { p.FootprintRadiusM = math.Inf(1) }, "footprint_radius_m is +Inf, must be above 0 and finite"},
		{func(p *Profile) { p.InclinationDeg.AllowedMin = -1 }, "inclination_deg.allowed_min is -1, must be from 0 to 180"},
		{func(p *Profile) { p.InclinationDeg.AllowedMax = 181 }, "inclination_deg.allowed_max is 181, must be from 0 to 180"},
		{func(p *Profile) { p.InclinationDeg.BestMin = 20 }, "inclination_deg.best_min is 20, above best_max 10"},
		{func(p *Profile) { p.InclinationDeg.BestMax = 30 }, "inclination_deg.best_max is 30, above allowed_max 25"},
		{func(p *Profile) { p.InclinationDeg.AllowedMin = 5 }, "inclination_deg.allowed_min is 5, above best_min 0"},
		{func(p *Profile) { p.RoughnessM.Allowed = 0.01 }, "roughness_m.allowed is 0.01, below best 0.02, but less is better"},
		{func(p *Profile) { p.RoughnessM.Best = -0.01 }, "roughness_m.best is -0.01, must not be below 0"},
		{func(p *Profile) { p.StepM.Allowed = math.Inf(1) }, "step_m.allowed is +Inf, must be finite"},
		{func(p *Profile) { p.StepM.Best = math.NaN() }, "step_m.best is NaN, must be finite"},
		{func(p *Profile) { p.ClearanceM.Allowed = 0.5 }, "clearance_m.allowed is 0.5, above best 0.3, but more is better"},
		{func(p *Profile) { p.ClearanceM = Limit{-0.4, -0.4} }, ""},
		{func(p *Profile) { p.Coverage.Allowed = 0.99 }, "coverage.allowed is 0.99, above best 0.98, but more is better"},
		{func(p *Profile) { p.Coverage.Best = 98 }, "coverage.best is 98, must be from 0 to 1"},
		{func(p *Profile) { p.Weights.Step = -1 }, "weights.step is -1, must not be below 0"},
		{func(p *Profile) { p.Weights = Weights{} }, "weights are all 0, at least one must be above"},
	} {
		p, _ := Example("ledge")
		c.change(&p)
		err := p.Validate()
		switch {
		case c.want == "" && err != nil:
			t.Errorf("unexpected: %v", err)
		case c.want != "" && (err == nil || strings.TrimPrefix(err.Error(), "hazards: ") != c.want):
			t.Errorf("got %v, want %s", err, c.want)
		}
	}
}
