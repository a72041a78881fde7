package hazards

import (
	"cmp"
	"context"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// pick returns the voxels of the landing patches, best first: of the footprints
// that score above 0, the best, then the best of those that do not overlap it,
// and so on. Ties go to the voxel that comes first in the order of
// Cell.Compare, so the choice is unique. Two discs do not overlap if their
// centres are at least two radii apart in space, whatever their planes.
//
// The choice is greedy: it finds the best places, not the largest number of
// them.
func (j *judge) pick(ctx context.Context, scores []float64) ([]int32, error) {
	var order []int32
	maxOffset := 0.0
	for v, s := range scores {
		if s > 0 {
			order = append(order, int32(v))
			maxOffset = max(maxOffset, math.Abs(j.planes.Offset[v]))
		}
	}
	slices.SortFunc(order, func(a, b int32) int {
		if c := cmp.Compare(scores[b], scores[a]); c != 0 {
			return c
		}
		return cmp.Compare(a, b) // voxels are in the order of their cells
	})

	var picked, near []int32
	taken := make([]bool, len(scores))
	apart := 2 * j.radius
	for i, v := range order {
		if i%chunkVoxels == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		if taken[v] {
			continue
		}
		picked = append(picked, v)
		// Centres are off their means by at most maxOffset.
		c := j.centre(int(v))
		near = j.index.Within(near[:0], c, apart+maxOffset)
		for _, n := range near {
			if scores[n] > 0 && r3.Norm(r3.Sub(j.centre(int(n)), c)) < apart {
				taken[n] = true
			}
		}
	}
	return picked, nil
}
