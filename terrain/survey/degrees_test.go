package survey

import (
	"testing"

	"ledgework/terrain"
)

func TestLooksLikeDegrees(t *testing.T) {
	tests := []struct {
		name   string
		lo, hi [3]float64
		grid   bool
		want   bool
	}{
		{"grid of an escarpment", [3]float64{-104.34, 39.506, 1690}, [3]float64{-104.306, 39.524, 1807}, true, true},
		{"grid of 1° of plain", [3]float64{10, 50, 20}, [3]float64{11, 51, 70}, true, true},
		{"grid about 0° N 0° E", [3]float64{0, 0, 0}, [3]float64{0.1, 0.1, 200}, true, true},
		{"grid in local metres", [3]float64{0, 0, 0}, [3]float64{100, 80, 40}, true, false},
		{"grid of a model in metres", [3]float64{0, 0, 0}, [3]float64{1.2, 0.8, 0.4}, true, false},
		{"grid in UTM", [3]float64{500000, 5000000, 0}, [3]float64{500100, 5000100, 2000}, true, false},
		{"points of a site", [3]float64{15.001, 45.001, 300}, [3]float64{15.004, 45.004, 340}, false, true},
		{"points of 10 km", [3]float64{15, 45, 300}, [3]float64{15.1, 45.1, 340}, false, true},
		{"points of a chimney", [3]float64{-0.5, -0.5, 0}, [3]float64{0.5, 0.5, 80}, false, false},
		{"points of a shaft off the origin", [3]float64{20, 20, -100}, [3]float64{22, 22, 0}, false, false},
		{"points of a room", [3]float64{-3, -2, 0}, [3]float64{4, 5, 2.5}, false, false},
		{"one point", [3]float64{10, 50, 20}, [3]float64{10, 50, 20}, false, false},
		{"a vertical line of points", [3]float64{10, 50, 20}, [3]float64{10, 50, 90}, false, false},
		{"latitude beyond the pole", [3]float64{10, 89, 0}, [3]float64{10.1, 91, 400}, false, false},
	}
	for _, tt := range tests {
		if got := looksLikeDegrees(terrain.Extent{Min: tt.lo, Max: tt.hi}, tt.grid); got != tt.want {
			t.Errorf("%s: %v, want %v", tt.name, got, tt.want)
		}
	}
	if looksLikeDegrees(terrain.EmptyExtent(), true) {
		t.Error("nothing looks like degrees")
	}
}
