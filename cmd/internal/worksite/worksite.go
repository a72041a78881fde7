package worksite

import (
	"path/filepath"

	"github.com/goccy/go-yaml/ast"

	"ledgework/hazards"
)

// A Worksite says what was surveyed, what will be set down there and what
// counts as an obstacle. Field comments are what the YAML keys mean.
type Worksite struct {
	Site      string     `yaml:"site" json:"site"`           // any name
	CRS       string     `yaml:"crs" json:"crs"`             // working CRS: auto, EPSG:n, WKT or PROJJSON
	SpacingM  AutoLength `yaml:"spacing_m" json:"spacing_m"` // voxel edge
	Crop      *Crop      `yaml:"crop" json:"crop,omitempty"` // nothing outside it is read
	Voxels    string     `yaml:"voxels" json:"voxels,omitempty"`
	Surveys   []Survey   `yaml:"surveys" json:"surveys"`
	Exclude   Classes    `yaml:"exclude_classes" json:"exclude_classes"` // LAS classes left out
	Platform  Platform   `yaml:"platform" json:"platform"`
	Obstacles Obstacles  `yaml:"obstacles" json:"obstacles"`
	Outputs   []string   `yaml:"outputs" json:"outputs"`

	path string    // of the file, empty if it was not loaded from one
	tree *ast.File // what was parsed, to say where a value stands
}

// A Survey is one set of files that belong together.
type Survey struct {
	Date    string   `yaml:"date" json:"date,omitempty"` // YYYY-MM-DD
	Files   []string `yaml:"files" json:"files"`         // paths, folders and globs, relative to the worksite
	CRS     string   `yaml:"crs" json:"crs,omitempty"`   // of files that carry none
	Band    int      `yaml:"band" json:"band,omitempty"` // elevation band of grids, from 1; 0 is automatic
	Sensors []Point  `yaml:"sensors" json:"sensors,omitempty"`
	// AccuracyM is 1 sigma of a point, 0 where unknown. It is what the
	// checkpoints are held against and stands in the voxel file. Judgements do
	// without it: what points err by themselves shows in the roughness measured,
	// and an error common to all changes no measure of one patch.
	AccuracyM        float64 `yaml:"accuracy_m" json:"accuracy_m,omitempty"`
	TolerateDefects  bool    `yaml:"tolerate_defects" json:"tolerate_defects,omitempty"`
	Checkpoints      []Point `yaml:"checkpoints" json:"checkpoints,omitempty"`
	CheckpointSigmaM float64 `yaml:"checkpoint_sigma_m" json:"checkpoint_sigma_m,omitempty"` // 1 sigma of a checkpoint's height, 0 where unknown
}

// Classes are LAS classification codes.
type Classes []uint8

// A Point is a position in the working CRS: E, N, H in metres.
type Point [3]float64

// An AutoLength is a length in metres, or 0 for one that the run chooses.
type AutoLength float64

// A Crop is either a polygon file or a box in the working CRS.
type Crop struct {
	File string
	Box  [4]float64 // Emin, Nmin, Emax, Nmax in metres, if File is empty
}

// Obstacles are the thresholds of what a rope, a load or a foot catches on. The
// keys are those of hazards.ObstacleOptions; a radius may be auto.
type Obstacles struct {
	BulgeHeightM         float64    `yaml:"bulge_height_m" json:"bulge_height_m"`
	OverhangDepthM       float64    `yaml:"overhang_depth_m" json:"overhang_depth_m"`
	OverhangToleranceDeg float64    `yaml:"overhang_tolerance_deg" json:"overhang_tolerance_deg"`
	RecessDepthM         float64    `yaml:"recess_depth_m" json:"recess_depth_m"`
	MinAreaM2            float64    `yaml:"min_area_m2" json:"min_area_m2"`
	ReferenceRadiusM     AutoLength `yaml:"reference_radius_m" json:"reference_radius_m"`
	SurfaceRadiusM       AutoLength `yaml:"surface_radius_m" json:"surface_radius_m"`
}

// options are the thresholds as the search takes them; clearance grows the
// second set of ellipsoids.
func (o Obstacles) options(clearanceM float64) hazards.ObstacleOptions {
	return hazards.ObstacleOptions{
		BulgeHeightM:         o.BulgeHeightM,
		OverhangDepthM:       o.OverhangDepthM,
		OverhangToleranceDeg: o.OverhangToleranceDeg,
		RecessDepthM:         o.RecessDepthM,
		MinAreaM2:            o.MinAreaM2,
		ReferenceRadiusM:     float64(o.ReferenceRadiusM),
		SurfaceRadiusM:       float64(o.SurfaceRadiusM),
		ClearanceM:           clearanceM,
	}
}

// Path is the file that w was loaded from, empty if there is none.
func (w *Worksite) Path() string { return w.path }

// Resolve returns name relative to the folder of the worksite file.
func (w *Worksite) Resolve(name string) string {
	if name == "" || filepath.IsAbs(name) {
		return name
	}
	return filepath.Join(filepath.Dir(w.path), name)
}
