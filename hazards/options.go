package hazards

import (
	"fmt"
	"math"
)

// ObstacleOptions say what counts as an obstacle. Zero values are replaced by
// the documented defaults in Resolve. The yaml tags are the worksite's keys.
type ObstacleOptions struct {
	// BulgeHeightM is the relief from which a voxel is a bulge. The default is
	// 0.30.
	BulgeHeightM float64 `yaml:"bulge_height_m" json:"bulge_height_m"`
	// OverhangDepthM is the least horizontal reach of an overhang from lip to
	// back. The default is 0.20.
	OverhangDepthM float64 `yaml:"overhang_depth_m" json:"overhang_depth_m"`
	// OverhangToleranceDeg is the inclination beyond 90° from which a voxel
	// overhangs. The default is 5.
	OverhangToleranceDeg float64 `yaml:"overhang_tolerance_deg" json:"overhang_tolerance_deg"`
	// RecessDepthM is the depth behind the face from which a voxel is a recess.
	// The default is 0.40.
	RecessDepthM float64 `yaml:"recess_depth_m" json:"recess_depth_m"`
	// MinAreaM2 is the least surface area of an obstacle. The default is 0.25.
	MinAreaM2 float64 `yaml:"min_area_m2" json:"min_area_m2"`
	// ReferenceRadiusM is R, how far around a voxel its reference face is
	// looked for. The default is the larger of 5 m and 10 spacings.
	ReferenceRadiusM float64 `yaml:"reference_radius_m" json:"reference_radius_m"`
	// SurfaceRadiusM is the radius of the local planes that decide inclination
	// and overhang. The default is 4 spacings, about 50 voxels.
	SurfaceRadiusM float64 `yaml:"surface_radius_m" json:"surface_radius_m"`
	// ClearanceM inflates the ellipsoids for a second, wider set of axes. The
	// default is 0.
	ClearanceM float64 `yaml:"-" json:"clearance_m"`
}

// Resolve returns o with defaults filled in and thresholds raised to what a
// survey at the given spacing can show: a height of less than half a voxel, or
// an area of fewer than four, is the lattice's own grain. What was raised is
// said in notes.
func (o ObstacleOptions) Resolve(spacingM float64) (resolved ObstacleOptions, notes []string) {
	fill := func(v *float64, d float64) {
		if *v == 0 {
			*v = d
		}
	}
	fill(&o.BulgeHeightM, 0.30)
	fill(&o.OverhangDepthM, 0.20)
	fill(&o.OverhangToleranceDeg, 5)
	fill(&o.RecessDepthM, 0.40)
	fill(&o.MinAreaM2, 0.25)
	fill(&o.ReferenceRadiusM, max(5, 10*spacingM))
	fill(&o.SurfaceRadiusM, 4*spacingM)
	raise := func(v *float64, least float64, key, unit string) {
		if *v < least {
			notes = append(notes, fmt.Sprintf("%s raised from %g to %g %s: a spacing of %g m shows nothing smaller", key, *v, least, unit, spacingM))
			*v = least
		}
	}
	raise(&o.BulgeHeightM, spacingM/2, "bulge_height_m", "m")
	raise(&o.OverhangDepthM, spacingM/2, "overhang_depth_m", "m")
	raise(&o.RecessDepthM, spacingM/2, "recess_depth_m", "m")
	raise(&o.MinAreaM2, 4*spacingM*spacingM, "min_area_m2", "m²")
	raise(&o.ReferenceRadiusM, 5*spacingM, "reference_radius_m", "m")
	raise(&o.SurfaceRadiusM, 2*spacingM, "surface_radius_m", "m")
	return o, notes
}

// Validate reports the first value that makes no sense, under its key. Zero
// stands for a default and is valid.
func (o *ObstacleOptions) Validate() error {
	for _, v := range [...]struct {
		key  string
		v    float64
		high float64
	}{
		{"bulge_height_m", o.BulgeHeightM, math.Inf(1)},
		{"overhang_depth_m", o.OverhangDepthM, math.Inf(1)},
		{"overhang_tolerance_deg", o.OverhangToleranceDeg, 90},
		{"recess_depth_m", o.RecessDepthM, math.Inf(1)},
		{"min_area_m2", o.MinAreaM2, math.Inf(1)},
		{"reference_radius_m", o.ReferenceRadiusM, math.Inf(1)},
		{"surface_radius_m", o.SurfaceRadiusM, math.Inf(1)},
		{"clearance_m", o.ClearanceM, math.Inf(1)},
	} {
		if !(v.v >= 0 && v.v < v.high) {
			return fmt.Errorf("hazards: %s is %g, must be at least 0 and below %g", v.key, v.v, v.high)
		}
	}
	return nil
}
