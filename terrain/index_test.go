package terrain

import (
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func cloud(n int, seed uint64, span float64) []r3.Vec {
	rng := rand.New(rand.NewPCG(seed, 4))
	points := make([]r3.Vec, n)
	for i := range points {
		points[i] = r3.Vec{X: 1000 + span*rng.Float64(), Y: -span * rng.Float64(), Z: span * (rng.Float64() - 0.5)}
	}
	return points
}

func TestIndexAgainstBruteForce(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 5))
	for _, g := range []float64{0.1, 0.5, 2} {
		v, err := SumPoints(mustLattice(t, g), cloud(3000, 1, 5))
		if err != nil {
			t.Fatal(err)
		}
		x := NewIndex(v)
		for range 300 {
			p := r3.Vec{X: 1000 + 6*rng.Float64() - 0.5, Y: -6*rng.Float64() + 0.5, Z: 6*rng.Float64() - 3}
			r := 2 * rng.Float64()
			var want []int32
			nearest, nearestD := -1, r
			for i := range v.Cells {
				if d := r3.Norm(r3.Sub(v.Mean(i), p)); d <= r {
					want = append(want, int32(i))
					if nearest < 0 || d < nearestD {
						nearest, nearestD = i, d
					}
				}
			}
			if got := x.Within(nil, p, r); !slices.Equal(got, want) {
				t.Fatalf("g %g: within %g of %v: %d voxels, want %d", g, r, p, len(got), len(want))
			}
			if got := x.Nearest(p, r); got != nearest {
				t.Fatalf("g %g: nearest within %g of %v: %d, want %d", g, r, p, got, nearest)
			}
			c := v.Lattice.CellOf(p)
			if got := x.Find(c); got != v.Find(c) {
				t.Fatalf("Find(%v) = %d, want %d", c, got, v.Find(c))
			}
		}
	}
}

func TestIndexRows(t *testing.T) {
	v, err := SumPoints(mustLattice(t, 0.5), cloud(2000, 2, 5))
	if err != nil {
		t.Fatal(err)
	}
	x := NewIndex(v)
	lo, hi := Cell{2002, -8, -3}, Cell{2006, -3, 2}
	var got, want []int
	x.Rows(lo, hi, func(start, end int) {
		for i := start; i < end; i++ {
			got = append(got, i)
		}
	})
	for i, c := range v.Cells {
		if c.I >= lo.I && c.I <= hi.I && c.J >= lo.J && c.J <= hi.J && c.K >= lo.K && c.K <= hi.K {
			want = append(want, i)
		}
	}
	if !slices.Equal(got, want) || len(want) == 0 {
		t.Errorf("rows hold %d voxels, want %d", len(got), len(want))
	}
}

func TestIndexOfNothing(t *testing.T) {
	x := NewIndex(&Voxels{Lattice: mustLattice(t, 1)})
	if x.Find(Cell{}) != -1 || len(x.Within(nil, r3.Vec{}, 5)) != 0 || x.Nearest(r3.Vec{}, 5) != -1 {
		t.Error("an empty index finds something")
	}
}
