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

func TestNoCheckpoints(t *testing.T) {
	r := &run{Worksite: Default(), stages: stages{progress: silent{}}}
	if err := r.check(t.Context(), nil); err != nil || r.heights != nil || len(r.stages.done) != 0 {
		t.Errorf("got %v, %+v, %v", err, r.heights, r.stages.done)
	}
}
