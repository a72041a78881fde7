package demo

import (
	"encoding/json"
	"math"
	"reflect"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func TestTruthAsJSON(t *testing.T) {
	want := NewSite(1).Season(2).Truth()
	text, err := json.Marshal(want)
	if err != nil {
		t.Fatal(err)
	}
	var got Truth
	if err := json.Unmarshal(text, &got); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(got, want) {
		t.Error("truth is not the same after JSON")
	}
}

func TestBoxContains(t *testing.T) {
	s, c := sincosDeg(30)
	b := Box{
		Centre: Position{10, 20, 30}, HalfM: [3]float64{3, 2, 1},
		Along: Position{c, s, 0}, Up: Position{-s, c, 0}, Out: Position{0, 0, 1},
	}
	f := over(&b)
	for _, tt := range []struct {
		a, b, n, margin float64
		want            bool
	}{
		{0, 0, 0, 0, true}, {2.9, 1.9, 0.9, 0, true}, {3.1, 0, 0, 0, false}, {0, -2.1, 0, 0, false},
		{0, 0, 1.1, 0, false}, {3.1, -2.1, 1.1, 0.2, true}, {2.9, 0, 0, -0.2, false},
	} {
		if got := b.Contains(f.at(tt.a, tt.b, tt.n), tt.margin); got != tt.want {
			t.Errorf("(%g, %g, %g) with margin %g: %t", tt.a, tt.b, tt.n, tt.margin, got)
		}
	}
}

// A quarter turn about the vertical, worked out by hand.
func TestTransform(t *testing.T) {
	tr := newTransform(r3.Vec{X: 1}, r3.Vec{Z: 5}, r3.Vec{Z: 2}, 90)
	got := tr.Apply(r3.Vec{X: 3, Y: 0, Z: 1})
	if want := (r3.Vec{X: 1, Y: 2, Z: 6}); r3.Norm(r3.Sub(got, want)) > 1e-12 {
		t.Errorf("got %v, want %v", got, want)
	}
	if back := tr.Invert(got); r3.Norm(r3.Sub(back, r3.Vec{X: 3, Z: 1})) > 1e-12 {
		t.Errorf("inverse gives %v", back)
	}
	if math.Abs(tr.ShiftLenM-5) > 0 || tr.AngleDeg != 90 {
		t.Errorf("told %g m and %g°", tr.ShiftLenM, tr.AngleDeg)
	}
}
