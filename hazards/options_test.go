package hazards

import (
	"math"
	"reflect"
	"strings"
	"testing"
)

func TestObstacleOptionsDefaults(t *testing.T) {
	got, notes := ObstacleOptions{}.Resolve(0.05)
	want := ObstacleOptions{
		BulgeHeightM: 0.30, OverhangDepthM: 0.20, OverhangToleranceDeg: 5, RecessDepthM: 0.40,
		MinAreaM2: 0.25, ReferenceRadiusM: 5, SurfaceRadiusM: 0.2,
	}
	if got != want || len(notes) > 0 {
		t.Errorf("got %+v, %q, want %+v without notes", got, notes, want)
	}
	// Resolving again changes nothing.
	if again, notes := got.Resolve(0.05); again != got || len(notes) > 0 {
		t.Errorf("again: %+v, %q", again, notes)
	}
	// Values of the user's own stay.
	own := ObstacleOptions{1, 2, 3, 4, 5, 6, 7, 8}
	if got, notes := own.Resolve(0.05); got != own || len(notes) > 0 {
		t.Errorf("own values: %+v, %q", got, notes)
	}
	// Radii follow the spacing.
	if got, _ := (ObstacleOptions{}).Resolve(2); got.ReferenceRadiusM != 20 || got.SurfaceRadiusM != 8 {
		t.Errorf("radii at 2 m: %g m and %g m, want 20 m and 8 m", got.ReferenceRadiusM, got.SurfaceRadiusM)
	}
}

// What a spacing cannot show is raised, and said so: 1 note for each.
func TestObstacleOptionsRaised(t *testing.T) {
	for _, c := range []struct {
		name     string
		in       ObstacleOptions
		spacingM float64
		want     ObstacleOptions
		notes    []string
	}{
		{"grid of 1 m", ObstacleOptions{}, 1,
			ObstacleOptions{0.5, 0.5, 5, 0.5, 4, 10, 4, 0},
			[]string{
				"bulge_height_m raised from 0.3 to 0.5 m: a spacing of 1 m shows nothing smaller",
				"overhang_depth_m raised from 0.2 to 0.5 m: a spacing of 1 m shows nothing smaller",
				"recess_depth_m raised from 0.4 to 0.5 m: a spacing of 1 m shows nothing smaller",
				"min_area_m2 raised from 0.25 to 4 m²: a spacing of 1 m shows nothing smaller",
			}},
		{"defaults at 0.2 m", ObstacleOptions{}, 0.2, ObstacleOptions{0.30, 0.20, 5, 0.40, 0.25, 5, 0.8, 0}, nil},
		{"radii", ObstacleOptions{ReferenceRadiusM: 0.4, SurfaceRadiusM: 0.15}, 0.1,
			ObstacleOptions{0.30, 0.20, 5, 0.40, 0.25, 0.5, 0.2, 0},
			[]string{
				"reference_radius_m raised from 0.4 to 0.5 m: a spacing of 0.1 m shows nothing smaller",
				"surface_radius_m raised from 0.15 to 0.2 m: a spacing of 0.1 m shows nothing smaller",
			}},
	} {
		t.Run(c.name, func(t *testing.T) {
			got, notes := c.in.Resolve(c.spacingM)
			if got != c.want {
				t.Errorf("got %+v, want %+v", got, c.want)
			}
			if !reflect.DeepEqual(notes, c.notes) {
				t.Errorf("notes\n%s\nwant\n%s", strings.Join(notes, "\n"), strings.Join(c.notes, "\n"))
			}
			if err := got.Validate(); err != nil {
				t.Errorf("what was resolved does not validate: %v", err)
			}
		})
	}
}

func TestObstacleOptionsValidate(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		o    ObstacleOptions
		want string
	}{
		{ObstacleOptions{}, ""},
		{ObstacleOptions{1, 1, 1, 1, 1, 1, 1, 1}, ""},
		{ObstacleOptions{OverhangToleranceDeg: 89.9}, ""},
		{ObstacleOptions{BulgeHeightM: -0.3}, "hazards: bulge_height_m is -0.3, must be at least 0 and below +Inf"},
		{ObstacleOptions{OverhangDepthM: inf}, "hazards: overhang_depth_m is +Inf, must be at least 0 and below +Inf"},
		{ObstacleOptions{OverhangToleranceDeg: 90}, "hazards: overhang_tolerance_deg is 90, must be at least 0 and below 90"},
		{ObstacleOptions{RecessDepthM: nan}, "hazards: recess_depth_m is NaN, must be at least 0 and below +Inf"},
		{ObstacleOptions{MinAreaM2: -1}, "hazards: min_area_m2 is -1, must be at least 0 and below +Inf"},
		{ObstacleOptions{ReferenceRadiusM: nan}, "hazards: reference_radius_m is NaN, must be at least 0 and below +Inf"},
		{ObstacleOptions{SurfaceRadiusM: -5}, "hazards: surface_radius_m is -5, must be at least 0 and below +Inf"},
		{ObstacleOptions{ClearanceM: inf}, "hazards: clearance_m is +Inf, must be at least 0 and below +Inf"},
		// The first in the order of the worksite's keys.
		{ObstacleOptions{SurfaceRadiusM: -5, OverhangDepthM: -1}, "hazards: overhang_depth_m is -1, must be at least 0 and below +Inf"},
	} {
		got := ""
		if err := c.o.Validate(); err != nil {
			got = err.Error()
		}
		if got != c.want {
			t.Errorf("%+v: got %q, want %q", c.o, got, c.want)
		}
	}
}
