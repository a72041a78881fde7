package hazards

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// maxLayers bounds the voxels counted on either side in a column. A plane cuts
// at most three cells of a column along its normal's largest component; more
// come from roughness.
const maxLayers = 8

// columnArea is the surface area in m² that voxel v stands for within a set of
// voxels, on a surface with unit normal n.
//
// A column of cells along the axis closest to n is crossed by g²/|n| of
// surface, n being the normal's component along that axis; the voxels of the
// set in the column that touch share it. Counting columns makes the area
// independent of how many layers of voxels a noisy surface fills, and holds for
// an elevation grid too, which fills one voxel of each; the average share of
// voxels that a plane cuts, fit.CellArea, does neither. On an elevation grid
// steeper than 55° columns are cut across, and the area comes out too low.
// Without a normal it is fit.CellArea.
func columnArea(x *terrain.Index, n r3.Vec, v int, in func(i int) bool) float64 {
	g := x.Voxels().Lattice.SpacingM()
	slant := max(math.Abs(n.X), math.Abs(n.Y), math.Abs(n.Z))
	if slant == 0 {
		return fit.CellArea(g, n)
	}
	c := x.Voxels().Cells[v]
	next := func(step int32) terrain.Cell {
		switch slant {
		case math.Abs(n.Z):
			return terrain.Cell{I: c.I, J: c.J, K: c.K + step}
		case math.Abs(n.X):
			return terrain.Cell{I: c.I + step, J: c.J, K: c.K}
		}
		return terrain.Cell{I: c.I, J: c.J + step, K: c.K}
	}
	layers := 1
	for _, direction := range [2]int32{-1, 1} {
		for step := int32(1); step <= maxLayers; step++ {
			i := x.Find(next(direction * step))
			if i < 0 || !in(i) {
				break
			}
			layers++
		}
	}
	return g * g / (slant * float64(layers))
}
