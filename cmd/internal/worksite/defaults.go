package worksite

import (
	"ledgework/hazards"
	"ledgework/terrain"
)

// Default is the worksite that a file with no keys means. Nothing in it is a
// safety limit.
func Default() *Worksite {
	profile, _ := hazards.Example(defaultProfile)
	// Thresholds do not depend on the spacing; radii do, and stay auto.
	obstacles, _ := hazards.ObstacleOptions{}.Resolve(terrain.MinSpacingM)
	return &Worksite{
		CRS:      auto,
		Exclude:  Classes{7, 18}, // low and high noise, LAS 1.4 table 17
		Platform: Platform{profile},
		Obstacles: Obstacles{
			BulgeHeightM:         obstacles.BulgeHeightM,
			OverhangDepthM:       obstacles.OverhangDepthM,
			OverhangToleranceDeg: obstacles.OverhangToleranceDeg,
			RecessDepthM:         obstacles.RecessDepthM,
			MinAreaM2:            obstacles.MinAreaM2,
		},
		Outputs: []string{outputGeoJSON},
	}
}

const (
	auto           = "auto"
	defaultProfile = "suspended"
	outputGeoJSON  = "geojson"
)
