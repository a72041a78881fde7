package export

import (
	"bytes"
	"errors"
	"math"
	"math/big"
	"math/rand/v2"
	"strings"
	"testing"

	"ledgework/terrain"
)

// Voxels that no survey gives are written all the same, and refused by the
// reader.
func TestReadVoxelsRefusesImpossibleSums(t *testing.T) {
	tests := []struct {
		name   string
		change func(v *terrain.Voxels)
		want   string
	}{
		{"order", func(v *terrain.Voxels) { v.Cells[3], v.Cells[4] = v.Cells[4], v.Cells[3] }, "row 4: voxels are out of order"},
		{"repeated", func(v *terrain.Voxels) { v.Cells[3] = v.Cells[4] }, "repeated"},
		{"no points", func(v *terrain.Voxels) { v.Moments[5] = terrain.Moments{} }, "row 5: 0 points"},
		{"negative points", func(v *terrain.Voxels) { v.Moments[5].N = -1 }, "row 5: -1 points"},
		{"too many points", func(v *terrain.Voxels) { v.Moments[5].N = math.MaxInt64 }, "not 1 to"},
		{"mean outside", func(v *terrain.Voxels) { v.Moments[5].Y = 251 * v.Moments[5].N }, "row 5: no points within the voxel"},
		{"least number", func(v *terrain.Voxels) { v.Moments[5].X = math.MinInt64 }, "no points within the voxel"},
		{"negative square", func(v *terrain.Voxels) { v.Moments[5].ZZ = -1 }, "no points within the voxel"},
		{"square too small", func(v *terrain.Voxels) { v.Moments[5] = terrain.Moments{N: 2, X: 10, XX: 49} }, "no points within the voxel"},
		{"square too large", func(v *terrain.Voxels) { v.Moments[5].XX = math.MaxInt64 }, "no points within the voxel"},
		{"product too large", func(v *terrain.Voxels) { v.Moments[5] = terrain.Moments{N: 1, XX: 4, YY: 9, XY: 7} }, "no points within the voxel"},
		{"intensity", func(v *terrain.Voxels) { v.Intensity[5] = uint64(v.Moments[5].N)*65535 + 1 }, "sum_intensity"},
		{"class order", func(v *terrain.Voxels) {
			v.Classes = []terrain.ClassCount{{Voxel: 2, Class: 7, N: 1}, {Voxel: 2, Class: 7, N: 1}}
		}, "row 2: classes are out of order"},
		{"class count", func(v *terrain.Voxels) {
			v.Classes = []terrain.ClassCount{{Voxel: 2, Class: 7, N: v.Moments[2].N + 1}}
		}, "row 2: more points in classes"},
	}
	for _, tt := range tests {
		v := randomVoxels(t, 10, true)
		tt.change(v)
		b := encode(t, v)
		_, _, err := ReadVoxels(bytes.NewReader(b), int64(len(b)))
		var format *terrain.FormatError
		if !errors.As(err, &format) || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want %q in it", tt.name, err, tt.want)
		}
	}
}

func TestWithin(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 2000 {
		a, b := rng.Int64()>>rng.IntN(63), rng.Int64()>>rng.IntN(63)
		root := new(big.Int).Sqrt(new(big.Int).Mul(big.NewInt(a), big.NewInt(b)))
		x := root.Int64() + rng.Int64N(3) - 1
		if rng.IntN(2) == 0 {
			x = -x
		}
		square := new(big.Int).Mul(big.NewInt(x), big.NewInt(x))
		want := square.Cmp(new(big.Int).Mul(big.NewInt(a), big.NewInt(b))) <= 0
		if got := within(x, a, b); got != want {
			t.Errorf("within(%d, %d, %d) = %v, want %v", x, a, b, got, want)
		}
	}
}
