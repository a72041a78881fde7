package worksite

import (
	"context"
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"
	"gonum.org/v1/gonum/stat/distuv"

	"ledgework/fit"
	"ledgework/hazards"
)

// Checkpoints says how the survey's heights compare with surveyed positions:
// survey less checkpoint, in metres.
type Checkpoints struct {
	Given      int     `json:"given"`
	Used       int     `json:"used"` // on surveyed ground that is not too steep
	MeanM      float64 `json:"mean_m"`
	DeviationM float64 `json:"deviation_m"`
	RMSEM      float64 `json:"rmse_m"`
	MaxM       float64 `json:"max_m"`

	// SigmaM is the root mean square of the checkpoints' own 1 sigma, 0 where
	// unknown; CombinedRMSEM has it added, as the ASPRS Positional Accuracy
	// Standards Edition 2 (2023) require.
	SigmaM        float64 `json:"checkpoint_sigma_m"`
	CombinedRMSEM float64 `json:"combined_rmse_m"`
	Vertical95M   float64 `json:"vertical95_m"` // 95 % accuracy of CombinedRMSEM, FGDC-STD-007.3-1998
}

const (
	// checkpointReach is how far, in voxels, a checkpoint may lie from the
	// surface: a height error of a few voxels is a result, one of a hundred is
	// a wrong checkpoint.
	checkpointReach = 10

	// minCheckpointUp keeps to ground below 60°: on steeper ground an error in
	// plan turns into more than 1.7 times its size in height.
	minCheckpointUp = 0.5

	// wrongfulDoubt is the probability with which a survey as accurate as it is
	// said to be is doubted.
	wrongfulDoubt = 0.01
)

// check compares the heights of the local planes with the checkpoints.
func (r *run) check(ctx context.Context, s *hazards.Surface) error {
	c := Checkpoints{}
	var residuals, sigmas []float64
	var stated promise
	for i := range r.Surveys {
		survey := &r.Surveys[i]
		for _, p := range survey.Checkpoints {
			c.Given++
			dh, ok := heightAbove(s, r3.Vec{X: p[0], Y: p[1], Z: p[2]})
			if !ok {
				continue
			}
			residuals = append(residuals, dh)
			sigmas = append(sigmas, survey.CheckpointSigmaM)
			if survey.AccuracyM > 0 {
				stated.add(dh, fit.CombineRMSE(survey.AccuracyM, survey.CheckpointSigmaM))
			}
		}
	}
	if c.Given == 0 {
		return nil
	}
	return r.stages.do(ctx, "checkpoints", 0, Points, func() (string, error) {
		e := fit.ErrorsOf(residuals)
		c.Used, c.MeanM, c.DeviationM, c.RMSEM, c.MaxM = e.N, e.Mean, e.Deviation, e.RMSE, e.Max
		c.SigmaM = fit.ErrorsOf(sigmas).RMSE
		c.CombinedRMSEM = fit.CombineRMSE(c.RMSEM, c.SigmaM)
		c.Vertical95M = fit.Vertical95(c.CombinedRMSEM)
		r.heights = &c
		if c.Used < c.Given {
			r.warn(fmt.Sprintf("%d of %d checkpoints lie off the surveyed ground or where it is steeper than 60°", c.Given-c.Used, c.Given))
		}
		if stated.broken() {
			r.warn(fmt.Sprintf("the heights are off the checkpoints by %.3f m (RMSE), more than accuracy_m lets expect: the survey has a systematic error, or is less accurate than stated", c.RMSEM))
		}
		return fmt.Sprintf("%d used, RMSE %.3f m, 95 %% accuracy %.3f m", c.Used, c.CombinedRMSEM, c.Vertical95M), nil
	})
}

// A promise is what accuracies that are stated say of residuals.
type promise struct {
	n       int
	squares float64 // of residuals, each in units of its stated sigma
}

func (p *promise) add(residual, sigma float64) {
	p.n++
	p.squares += residual / sigma * residual / sigma
}

// broken reports whether the residuals are too large for their sigmas: normal
// errors have a χ² of as many degrees of freedom. Local planes average the
// errors of points, so the test is lenient on a survey that is as stated.
func (p *promise) broken() bool {
	return p.n > 0 && p.squares > distuv.ChiSquared{K: float64(p.n)}.Quantile(1-wrongfulDoubt)
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
