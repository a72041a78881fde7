package hazards_test

import (
	"context"
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/hazards"
	"ledgework/terrain"
)

// A terrace of 3 by 3 m, dipping 5° to the south, with one point
// every 5 cm.
func ExampleFindPatches() {
	ctx := context.Background()
	lattice, _ := terrain.NewLattice(0.05)
	voxels := &terrain.Voxels{Lattice: lattice}
	const quanta = 500 // in 5 cm
	var cells [60]struct{ k, z int64 }
	for j := range cells {
		up := int64(j) * 437 / 10 // 0.1 mm; tan 5° is 0.0875
		cells[j].k, cells[j].z = up/quanta, up%quanta-quanta/2
	}
	for j, row := range cells { // ascending, as Voxels are
		for i := range 60 {
			var m terrain.Moments
			m.AddPoint(0, 0, row.z)
			voxels.Cells = append(voxels.Cells, terrain.Cell{I: int32(i), J: int32(j), K: int32(row.k)})
			voxels.Moments = append(voxels.Moments, m)
		}
	}

	profile, _ := hazards.Example("ledge")
	options, _ := hazards.ObstacleOptions{}.Resolve(0.05)
	above := []r3.Vec{{X: 1.5, Y: 1.5, Z: 10}} // a scanner
	surface, err := hazards.NewSurface(ctx, voxels, above, options, fit.Work{Workers: 1})
	if err != nil {
		fmt.Println(err)
		return
	}
	planes, err := surface.PlanesAt(ctx, profile.FootprintRadiusM)
	if err != nil {
		fmt.Println(err)
		return
	}
	patches, zones, err := hazards.FindPatches(ctx, surface, planes, nil, &profile, fit.Work{Workers: 1})
	if err != nil {
		fmt.Println(err)
		return
	}
	best := patches[0]
	for _, p := range patches {
		if p.Score > best.Score {
			best = p
		}
	}
	fmt.Printf("%d zone of %.1f m², %d patches\n", len(zones), zones[0].AreaM2, len(patches))
	fmt.Printf("inclination %.1f° towards %.0f°, score %.2f\n", best.InclinationDeg, best.DipDirectionDeg, best.Score)
	// Output:
	// 1 zone of 6.5 m², 12 patches
	// inclination 5.0° towards 180°, score 1.00
}
