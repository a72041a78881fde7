package hazards

import (
	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

// Findings are everything that one run found, in the working CRS. Slices are
// sorted by id and must not be changed.
type Findings struct {
	Obstacles []Obstacle
	Patches   []Patch
	Zones     []Zone
}

// A Kind is what an obstacle is.
type Kind string

// The kinds of obstacle.
const (
	Bulge            Kind = "bulge"
	Overhang         Kind = "overhang"
	Recess           Kind = "recess"
	OverhangingBulge Kind = "overhanging bulge"
)

// An Obstacle is a connected piece of surface that a rope or a load catches
// on, or gets trapped in. Voxels are indices into the run's terrain.Voxels.
type Obstacle struct {
	ID     string
	Kind   Kind
	Voxels []int32 // ascending

	// Ellipsoid contains every corner of every voxel of the obstacle.
	// Inflated is the same, grown by the profile's clearance.
	Ellipsoid fit.Ellipsoid
	Inflated  fit.Ellipsoid
	VolumeGap float64 // relative bound on its volume above that of the least ellipsoid around the corners

	Face         fit.Plane // reference face it stands on; normal points into the air
	Top          r3.Vec    // the voxel mean furthest from the face
	HeightM      float64   // greatest relief, or depth for a recess, or reach for an overhang
	AreaM2       float64   // surface area
	RockVolumeM3 float64   // between surface and face; for a recess the missing rock
	RockShare    float64   // rock volume over the part of the ellipsoid on the same side of the face

	InclinationDeg   float64 // 95th percentile of its local planes, 90 vertical
	DipDirectionDeg  float64 // of the reference face, 0 where that is level
	SurfaceVariation float64 // of all its voxels' local planes, median
	Scattered        bool    // not a surface: vegetation, wires
}

// A Measure is one thing that a landing patch is judged on. Its text is the
// value of limited_by.
type Measure string

// The measures.
const (
	Inclination Measure = "inclination"
	Roughness   Measure = "roughness"
	Step        Measure = "step"
	Coverage    Measure = "coverage"
	Clearance   Measure = "clearance"
)

// A Patch is a footprint disc on the local plane at a voxel.
type Patch struct {
	ID     string
	Voxel  int32   // index of the voxel at its centre
	Voxels []int32 // voxels of the disc, ascending
	Centre r3.Vec  // on the plane, at the voxel's mean
	Plane  fit.Plane

	InclinationDeg, InclinationSigmaDeg float64
	DipDirectionDeg                     float64
	RoughnessM, RoughnessSigmaM         float64
	StepM, StepSigmaM                   float64
	Coverage, CoverageSigma             float64
	ClearanceM, ClearanceSigmaM         float64 // ClearanceM is +Inf without obstacles

	Score      float64 // 0 to 1
	Confidence float64 // probability that all allowed limits hold
	LimitedBy  Measure
}

// A Zone is connected ground on which the footprint scores above 0.
type Zone struct {
	ID              string
	Voxels          []int32 // ascending
	AreaM2          float64 // surface area
	PatchCount      int
	BestPatch       string  // id, empty if none lies in it
	BestScore       float64 // of its best patch, or of its best voxel where no patch lies in it
	MeanScore       float64
	InclinationDeg  float64 // of its mean normal
	DipDirectionDeg float64

	// How its N local unit normals of resultant length R vary. They are those of
	// overlapping footprints, so no error of the mean follows from them.
	SpreadDeg             float64 // angular dispersion, arccos(R/N): 0 on a plane
	Concentration         float64 // Fisher's k = (N−1)/(N−R); NaN for one normal, or where all are the same
	DipDirectionMeanDeg   float64 // circular mean, each voxel counting alike however steep; NaN on level ground
	DipDirectionSpreadDeg float64 // circular standard deviation about it; NaN likewise
}
