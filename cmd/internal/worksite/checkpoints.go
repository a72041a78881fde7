package worksite

import (
	"context"
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/hazards"
)

// Checkpoints says how the survey's heights compare with surveyed positions:
// survey less checkpoint, in metres.
type Checkpoints struct {
	Given       int     `json:"given"`
	Used        int     `json:"used"` // on surveyed ground that is not too steep
	MeanM       float64 `json:"mean_m"`
	DeviationM  float64 `json:"deviation_m"`
	RMSEM       float64 `json:"rmse_m"`
	MaxM        float64 `json:"max_m"`
	Vertical95M float64 `json:"vertical95_m"` // 95 % accuracy, FGDC-STD-007.3-1998
}

const (
	// checkpointReach is how far, in voxels, a checkpoint may lie from the
	// surface: a height error of a few voxels is a result, one of a hundred is
	// a wrong checkpoint.
	checkpointReach = 10

	// minCheckpointUp keeps to ground below 60°: on steeper ground an error in
	// plan turns into more than 1.7 times its size in height.
	minCheckpointUp = 0.5
)

// check compares the heights of the local planes with the checkpoints.
func (r *run) check(ctx context.Context, s *hazards.Surface) error {
	c := Checkpoints{}
	var residuals []float64
	for i := range r.Surveys {
		for _, p := range r.Surveys[i].Checkpoints {
			c.Given++
			if dh, ok := heightAbove(s, r3.Vec{X: p[0], Y: p[1], Z: p[2]}); ok {
				residuals = append(residuals, dh)
			}
		}
	}
	if c.Given == 0 {
		return nil
	}
	return r.stages.do(ctx, "checkpoints", 0, Points, func() (string, error) {
		e := fit.ErrorsOf(residuals)
		c.Used, c.MeanM, c.DeviationM, c.RMSEM, c.MaxM = e.N, e.Mean, e.Deviation, e.RMSE, e.Max
		c.Vertical95M = fit.Vertical95(e.RMSE)
		r.heights = &c
		if c.Used < c.Given {
			r.warn(fmt.Sprintf("%d of %d checkpoints lie off the surveyed ground or where it is steeper than 60°", c.Given-c.Used, c.Given))
		}
		return fmt.Sprintf("%d used, RMSE %.3f m", c.Used, c.RMSEM), nil
	})
}

// heightAbove is the height of the surface above p, measured on the local plane
// of the voxel nearest to it.
func heightAbove(s *hazards.Surface, p r3.Vec) (metres float64, ok bool) {
	i := s.Index.Nearest(p, checkpointReach*s.Voxels.Lattice.SpacingM())
	if i < 0 || !s.Planes.Fitted(i) || s.Planes.Normal[i].Z < minCheckpointUp {
		return 0, false
	}
	n := s.Planes.Normal[i]
	on := r3.Sub(s.Index.Mean(i), r3.Scale(s.Planes.Offset[i], n))
	return r3.Dot(n, r3.Sub(on, p)) / n.Z, true
}
