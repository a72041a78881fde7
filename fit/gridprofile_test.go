package fit

import (
	"math"
	"testing"
)

// profileOf is the profile of a grid, its rows from north to south.
func profileOf(rows [][]float64, along, across float64) *GridProfile {
	var p GridProfile
	for r := 1; r+1 < len(rows); r++ {
		p.Add(rows[r-1], rows[r], rows[r+1], along, across)
	}
	return &p
}

// On a plane every method is exact: z = 0.75x + y has the slope atan 1.25.
func TestGridProfileOfPlane(t *testing.T) {
	rows := make([][]float64, 12)
	for r := range rows {
		for c := range 15 {
			rows[r] = append(rows[r], 0.75*2*float64(c)-3*float64(r))
		}
	}
	p := profileOf(rows, 2, 3)
	if p.Cells() != 10*13 {
		t.Fatalf("%d cells, want those with eight neighbours, 130", p.Cells())
	}
	want := math.Atan(1.25) * 180 / math.Pi
	for _, q := range []float64{0, 0.5, 1} {
		if got, ok := p.SlopeDeg(q); !ok || math.Abs(got-want) > 0.01 {
			t.Errorf("slope at %g is %g°, want %g°", q, got, want)
		}
	}
	if a, b := p.SteeperThan(51), p.SteeperThan(52); a != 1 || b != 0 {
		t.Errorf("steeper than 51° %g, than 52° %g; want 1, 0", a, b)
	}
	// Riley's index of a plane, by its eight differences.
	var sum float64
	for _, d := range [8][2]float64{{-1, -1}, {-1, 0}, {-1, 1}, {0, -1}, {0, 1}, {1, -1}, {1, 0}, {1, 1}} {
		h := 1.5*d[0] - 3*d[1]
		sum += h * h
	}
	if got, ok := p.RuggednessM(0.5); !ok || math.Abs(got/math.Sqrt(sum)-1) > 0.01 {
		t.Errorf("ruggedness %g m, want %g m", got, math.Sqrt(sum))
	}
}

func TestGridProfileLeavesHolesOut(t *testing.T) {
	rows := [][]float64{{0, 0, 0, 0, 0}, {0, 0, 0, math.NaN(), 0}, {0, 0, 0, 0, 0}}
	p := profileOf(rows, 1, 1)
	if p.Cells() != 1 {
		t.Errorf("%d cells, want the one without a hole beside it", p.Cells())
	}
	if s, ok := p.SlopeDeg(0.5); !ok || s > 0.01 {
		t.Errorf("level ground has slope %g°", s)
	}
	var empty GridProfile
	if _, ok := empty.SlopeDeg(0.5); ok {
		t.Error("an empty profile has a median")
	}
	if empty.SteeperThan(0) != 0 {
		t.Error("an empty profile is steep")
	}
}
