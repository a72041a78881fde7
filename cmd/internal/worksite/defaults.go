package worksite

import "ledgework/hazards"

// Default is the worksite that a file with no keys means. Nothing in it is a
// safety limit.
func Default() *Worksite {
	profile, _ := hazards.Example(defaultProfile)
	return &Worksite{
		CRS:      auto,
		Exclude:  []uint8{7, 18}, // low and high noise, LAS 1.4 table 17
		Platform: Platform{profile},
		Obstacles: Obstacles{
			BulgeHeightM:         0.30,
			OverhangDepthM:       0.20,
			OverhangToleranceDeg: 5,
			RecessDepthM:         0.40,
			MinAreaM2:            0.25,
		},
		Outputs: []string{outputGeoJSON},
	}
}

const (
	auto           = "auto"
	defaultProfile = "suspended"
	outputGeoJSON  = "geojson"
)
