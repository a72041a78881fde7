package worksite

import (
	"fmt"
	"strings"

	"github.com/goccy/go-yaml"
	"github.com/goccy/go-yaml/ast"

	"ledgework/hazards"
)

// A Platform is what will be set down: a named example profile, one with some
// limits of its own, or one given whole.
type Platform struct {
	hazards.Profile
}

// UnmarshalYAML starts from the example that is named and reads what is given
// over it. With no name, or another one, every limit must be given.
func (p *Platform) UnmarshalYAML(n ast.Node) error {
	var given map[string]any
	if err := yaml.NodeToValue(n, &given); err != nil {
		return err
	}
	name, _ := given["profile"].(string)
	base, named := hazards.Example(name)
	if !named {
		base = hazards.Profile{
			Name:    "custom",
			Weights: hazards.Weights{Inclination: 1, Roughness: 1, Step: 1, Clearance: 1, Coverage: 1},
		}
	}
	if err := yaml.NodeToValue(n, &base, yaml.Strict()); err != nil {
		return err
	}
	if missing := missingLimits(given); !named && len(missing) > 0 {
		what := "no example profile is named"
		if name != "" {
			what = fmt.Sprintf("%q is no example profile", name)
		}
		return errorAt(n, what+" and "+strings.Join(missing, ", ")+" not given", "name "+exampleNames()+", or give every limit")
	}
	p.Profile = base
	return nil
}

// missingLimits lists the keys that a profile from nothing needs and lacks.
func missingLimits(given map[string]any) []string {
	var missing []string
	for _, key := range []string{"footprint_radius_m", "inclination_deg", "roughness_m", "step_m", "clearance_m", "coverage"} {
		if _, ok := given[key]; !ok {
			missing = append(missing, key)
		}
	}
	return missing
}

// exampleNames lists the example profiles as a sentence does.
func exampleNames() string {
	names := hazards.Examples()
	last := len(names) - 1
	return strings.Join(names[:last], ", ") + " or " + names[last]
}
