package hazards

// A Limit is a measure's best and allowed value: desirability falls linearly
// from 1 at Best to 0 at Allowed. Allowed may lie on either side of Best.
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
