package worksite

import (
	"context"
	"math"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/hazards"
	"ledgework/terrain"
)

// slope is a surface of points every 5 cm on z = 0.5·x, in voxels of 0.2 m.
func slope(t *testing.T) *hazards.Surface {
	t.Helper()
	lattice, err := terrain.NewLattice(0.2)
	if err != nil {
		t.Fatal(err)
	}
	var points []r3.Vec
	for x := 0.0; x < 6; x += 0.05 {
		for y := 0.0; y < 6; y += 0.05 {
			points = append(points, r3.Vec{X: x, Y: y, Z: 0.5 * x})
		}
	}
	v, err := terrain.SumPoints(lattice, points)
	if err != nil {
		t.Fatal(err)
	}
	options, _ := hazards.ObstacleOptions{}.Resolve(0.2)
	s, err := hazards.NewSurface(context.Background(), v, nil, options, fit.Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestCheckpoints(t *testing.T) {
	s := slope(t)
	// Points on the slope, moved down by a known height: the survey lies above
	// them by just that.
	r := &run{Worksite: Default(), stages: stages{progress: silent{}}}
	r.Surveys = []Survey{{Checkpoints: []Point{
		{3, 3, 1.5 - 0.10},
		{2.2, 3.7, 1.1 - 0.20},
		{3.9, 2.1, 1.95 + 0.15},
		{100, 100, 0}, // off the survey
	}}}
	if err := r.check(t.Context(), s); err != nil {
		t.Fatal(err)
	}
	got := r.heights
	// By hand: mean of 0.10, 0.20 and −0.15; root of the mean of their squares.
	want := Checkpoints{Given: 4, Used: 3, MeanM: 0.05, RMSEM: math.Sqrt((0.01 + 0.04 + 0.0225) / 3), MaxM: 0.20}
	const tol = 2e-4 // twice the quantum that coordinates are rounded to
	if got.Given != want.Given || got.Used != want.Used || math.Abs(got.MeanM-want.MeanM) > tol ||
		math.Abs(got.RMSEM-want.RMSEM) > tol || math.Abs(got.MaxM-want.MaxM) > tol {
		t.Errorf("got %+v, want %+v", *got, want)
	}
	if math.Abs(got.Vertical95M-1.96*got.RMSEM) > 1e-4 {
		t.Errorf("95 %% accuracy %g for RMSE %g", got.Vertical95M, got.RMSEM)
	}
	if len(r.warnings) != 1 {
		t.Errorf("warnings %q, want one about the point off the survey", r.warnings)
	}
}

// What a survey states of its accuracy is held against the checkpoints, whose
// own errors count too.
func TestCheckpointsAgainstAccuracy(t *testing.T) {
	s := slope(t)
	for _, c := range []struct {
		name            string
		accuracy, sigma float64
		combined        float64
		doubted         bool
	}{
		{"nothing stated", 0, 0, 0.10, false},
		{"checkpoints as stated", 0, 0.24, 0.26, false},
		{"survey as stated", 0.08, 0, 0.10, false},
		{"survey better than stated", 1, 0, 0.10, false},
		{"survey worse than stated", 0.02, 0, 0.10, true},
		{"checkpoints make up for it", 0.02, 0.24, 0.26, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			r := &run{Worksite: Default(), stages: stages{progress: silent{}}}
			r.Surveys = []Survey{{AccuracyM: c.accuracy, CheckpointSigmaM: c.sigma, Checkpoints: []Point{
				{3, 3, 1.5 - 0.10},
				{2.2, 3.7, 1.1 - 0.10},
				{3.9, 2.1, 1.95 + 0.10},
			}}}
			if err := r.check(t.Context(), s); err != nil {
				t.Fatal(err)
			}
			const tol = 2e-4 // twice the quantum that coordinates are rounded to
			got := r.heights
			if math.Abs(got.CombinedRMSEM-c.combined) > tol || math.Abs(got.SigmaM-c.sigma) > 1e-12 || math.Abs(got.Vertical95M-1.96*c.combined) > 2*tol {
				t.Errorf("got %+v, want a combined RMSE of %g", *got, c.combined)
			}
			if doubted := len(r.warnings) > 0; doubted != c.doubted {
				t.Errorf("warnings %q", r.warnings)
			}
		})
	}
}

// The 0.99 quantiles of χ² with 1 and 10 degrees of freedom are 6.635 and 23.209
// (any table of the distribution).
func TestPromise(t *testing.T) {
	for _, c := range []struct {
		n       int
		squares float64
		want    bool
	}{{0, 0, false}, {1, 6.63, false}, {1, 6.64, true}, {10, 23.20, false}, {10, 23.22, true}} {
		var p promise
		for range c.n {
			p.add(-2*math.Sqrt(c.squares/float64(c.n)), 2)
		}
		if got := p.broken(); got != c.want {
			t.Errorf("%d residuals with squares of %g: broken is %v", c.n, c.squares, got)
		}
	}
}

func TestNoCheckpoints(t *testing.T) {
	r := &run{Worksite: Default(), stages: stages{progress: silent{}}}
	if err := r.check(t.Context(), nil); err != nil || r.heights != nil || len(r.stages.done) != 0 {
		t.Errorf("got %v, %+v, %v", err, r.heights, r.stages.done)
	}
}
