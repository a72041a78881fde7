package terrain

import (
	"reflect"
	"strings"
	"testing"
)

// A coarser level by addition is the same as summing the points there.
func TestCoarserIsExact(t *testing.T) {
	points := cloud(5000, 3, 8)
	v, err := SumPoints(mustLattice(t, 0.1), points)
	if err != nil {
		t.Fatal(err)
	}
	levels, parents, err := v.Pyramid(3.2)
	if err != nil {
		t.Fatal(err)
	}
	if len(levels) != 6 || len(parents) != 5 {
		t.Fatalf("%d levels, %d parents; want 6, 5", len(levels), len(parents))
	}
	for n, level := range levels {
		direct, err := SumPoints(level.Lattice, points)
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(level, direct) {
			t.Errorf("level %d, edge %g m, differs from summing the points", n, level.Lattice.SpacingM())
		}
		if n == 0 {
			continue
		}
		for i, c := range levels[n-1].Cells {
			if p := level.Cells[parents[n-1][i]]; p != (Cell{c.I >> 1, c.J >> 1, c.K >> 1}) {
				t.Fatalf("parent of %v is %v", c, p)
			}
		}
	}
}

func TestCoarserRefusesOverflow(t *testing.T) {
	v, err := SumPoints(mustLattice(t, MaxSpacingM), cloud(10, 4, 5))
	if err != nil {
		t.Fatal(err)
	}
	if _, _, err := v.Coarser(); err == nil {
		t.Error("a spacing of 10 km was accepted")
	}
	v, err = SumPoints(mustLattice(t, 2000), cloud(10, 4, 5))
	if err != nil {
		t.Fatal(err)
	}
	v.Moments[0].N = 1 << 20
	if _, _, err := v.Coarser(); err == nil || !strings.Contains(err.Error(), "points in a voxel of 4000 m") {
		t.Errorf("error %v, want too many points", err)
	}
}
