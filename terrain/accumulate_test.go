package terrain

import (
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"sync"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// wall returns the points of an invented rough wall in scan order, as batches
// of n points with all columns.
func wall(points, n int, seed uint64) []*Batch {
	rng := rand.New(rand.NewPCG(seed, 0))
	var out []*Batch
	for i := 0; i < points; {
		b := NewBatch(n, Intensity|Color|Class)
		m := min(n, points-i)
		b.Resize(m)
		for k := range m {
			row, col := (i+k)/400, (i+k)%400
			b.X[k] = 412000 + float64(col)*0.021 + rng.Float64()*0.01
			b.Y[k] = 6543000 + 0.3*math.Sin(float64(row)*0.03) + rng.NormFloat64()*0.01
			b.Z[k] = 5 + float64(row)*0.019 + rng.Float64()*0.01
			b.Intensity[k], b.Red[k], b.Green[k], b.Blue[k] = uint16(i+k), uint16(row), uint16(col), 7
			b.Class[k] = uint8(rng.IntN(6))
		}
		out = append(out, b)
		i += m
	}
	return out
}

func sum(t testing.TB, l Lattice, workers int, batches []*Batch) *Voxels {
	t.Helper()
	a := NewAccumulator(l, Intensity|Color|Class)
	feed := make(chan *Batch)
	var wg sync.WaitGroup
	for range workers {
		d := a.NewAdder()
		wg.Go(func() {
			for b := range feed {
				if err := d.Add(b); err != nil {
					t.Error(err)
				}
			}
		})
	}
	for _, b := range batches {
		feed <- b
	}
	close(feed)
	wg.Wait()
	return a.Voxels()
}

// The sums do not depend on the order of points, on how they are cut into
// batches, or on the number of workers: bit for bit.
func TestVoxelsIndependentOfOrder(t *testing.T) {
	l := mustLattice(t, 0.05)
	want := sum(t, l, 1, wall(60000, 4096, 1))
	rng := rand.New(rand.NewPCG(1, 3))
	for workers := 1; workers <= 4; workers++ {
		// The same points, shuffled across batches of another size.
		all := wall(60000, 60000, 1)[0]
		rng.Shuffle(all.Len(), func(i, j int) {
			swap := func(v []uint16) { v[i], v[j] = v[j], v[i] }
			all.X[i], all.X[j] = all.X[j], all.X[i]
			all.Y[i], all.Y[j] = all.Y[j], all.Y[i]
			all.Z[i], all.Z[j] = all.Z[j], all.Z[i]
			swap(all.Intensity)
			swap(all.Red)
			swap(all.Green)
			swap(all.Blue)
			all.Class[i], all.Class[j] = all.Class[j], all.Class[i]
		})
		var batches []*Batch
		for at := 0; at < all.Len(); {
			n := min(1+rng.IntN(3000), all.Len()-at)
			batches = append(batches, &Batch{
				X: all.X[at : at+n], Y: all.Y[at : at+n], Z: all.Z[at : at+n],
				Intensity: all.Intensity[at : at+n], Class: all.Class[at : at+n],
				Red: all.Red[at : at+n], Green: all.Green[at : at+n], Blue: all.Blue[at : at+n],
			})
			at += n
		}
		if got := sum(t, l, workers, batches); !reflect.DeepEqual(got, want) {
			t.Fatalf("%d workers, shuffled: voxels differ", workers)
		}
	}
}

// Every sum, against a plain map.
func TestVoxelsAgainstMap(t *testing.T) {
	l := mustLattice(t, 0.07)
	batches := wall(20000, 1000, 2)
	type cell struct {
		m         Moments
		intensity uint64
		classes   [256]int64
	}
	want := map[Cell]*cell{}
	for _, b := range batches {
		for i := range b.X {
			c := l.CellOf(r3.Vec{X: b.X[i], Y: b.Y[i], Z: b.Z[i]})
			if want[c] == nil {
				want[c] = &cell{}
			}
			_, x := l.locate(b.X[i])
			_, y := l.locate(b.Y[i])
			_, z := l.locate(b.Z[i])
			want[c].m.AddPoint(x, y, z)
			want[c].intensity += uint64(b.Intensity[i])
			want[c].classes[b.Class[i]]++
		}
	}
	v := sum(t, l, 2, batches)
	if v.Len() != len(want) || v.Points() != 20000 {
		t.Fatalf("%d voxels of %d points, want %d of 20000", v.Len(), v.Points(), len(want))
	}
	classes := make([][256]int64, v.Len())
	for _, c := range v.Classes {
		classes[c.Voxel][c.Class] = c.N
	}
	for i, c := range v.Cells {
		w := want[c]
		if w == nil || v.Moments[i] != w.m || v.Intensity[i] != w.intensity || classes[i] != w.classes {
			t.Fatalf("voxel %v: %v %d, want %+v", c, v.Moments[i], v.Intensity[i], w)
		}
		if i > 0 && v.Cells[i-1].Compare(c) >= 0 {
			t.Fatalf("cells %v and %v out of order", v.Cells[i-1], c)
		}
		if v.Find(c) != i {
			t.Fatalf("Find(%v) = %d, want %d", c, v.Find(c), i)
		}
	}
}

// Cells on both sides of every axis, where truncation would merge two.
func TestVoxelsAcrossOrigin(t *testing.T) {
	l := mustLattice(t, 1)
	var points []r3.Vec
	for x := -2.5; x < 3; x++ {
		for y := -2.5; y < 3; y++ {
			for z := -2.5; z < 3; z++ {
				points = append(points, r3.Vec{X: x, Y: y, Z: z})
			}
		}
	}
	v, err := SumPoints(l, points)
	if err != nil {
		t.Fatal(err)
	}
	if v.Len() != 216 {
		t.Errorf("%d voxels, want 216", v.Len())
	}
	for i := range v.Cells {
		if v.Moments[i].N != 1 || v.Moments[i].X != 0 {
			t.Fatalf("voxel %v holds %v", v.Cells[i], v.Moments[i])
		}
	}
}

func TestAddRefuses(t *testing.T) {
	l := mustLattice(t, 0.05)
	for _, c := range []struct {
		name string
		p    r3.Vec
		want string
	}{
		{"NaN", r3.Vec{X: math.NaN()}, "not on the Earth"},
		{"infinite", r3.Vec{Z: math.Inf(-1)}, "not on the Earth"},
		{"absurd", r3.Vec{Y: 3e7}, "not on the Earth"},
		{"far", r3.Vec{X: 5e5}, "too far for a spacing of 0.05 m"},
		{"high", r3.Vec{Z: 9e4}, "too far for a spacing of 0.05 m"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := SumPoints(l, []r3.Vec{{}, c.p})
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("error %v, want one with %q", err, c.want)
			}
		})
	}
}

func TestTooManyPointsInVoxel(t *testing.T) {
	l := mustLattice(t, MaxSpacingM)
	points := make([]r3.Vec, l.MaxPoints()+1)
	_, err := SumPoints(l, points)
	if err == nil || !strings.Contains(err.Error(), "points in one voxel") {
		t.Errorf("error %v, want too many points", err)
	}
	if _, err = SumPoints(l, points[1:]); err != nil {
		t.Errorf("%d points: %v", len(points)-1, err)
	}
}

func TestAddDoesNotAllocate(t *testing.T) {
	l := mustLattice(t, 0.05)
	a := NewAccumulator(l, Intensity|Color|Class)
	d := a.NewAdder()
	b := wall(4096, 4096, 1)[0]
	if err := d.Add(b); err != nil {
		t.Fatal(err)
	}
	if n := testing.AllocsPerRun(20, func() {
		if err := d.Add(b); err != nil {
			t.Fatal(err)
		}
	}); n > 0 {
		t.Errorf("%g allocations for a batch of known voxels, want 0", n)
	}
}
