package fit

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// sumPoints voxelises points at spacing g.
func sumPoints(t testing.TB, g float64, points []r3.Vec) *terrain.Voxels {
	t.Helper()
	l, err := terrain.NewLattice(g)
	if err != nil {
		t.Fatal(err)
	}
	v, err := terrain.SumPoints(l, points)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// roughWall is an invented wall that undulates, leans and has a block, at UTM
// sized coordinates.
func roughWall(n int, seed uint64) []r3.Vec {
	rng := rand.New(rand.NewPCG(seed, 0))
	points := make([]r3.Vec, n)
	for i := range points {
		x, z := 6*rng.Float64(), 4*rng.Float64()
		y := 0.2*math.Sin(2*x) + 0.3*z + 0.01*rng.NormFloat64()
		if x > 2 && x < 3 && z > 1 && z < 2 {
			y -= 0.4
		}
		points[i] = r3.Vec{X: 412000 + x, Y: 6543000 + y, Z: 80 + z}
	}
	return points
}

// Every local plane, against one fitted to the raw points of its members.
func TestFitLocalAgainstBruteForce(t *testing.T) {
	ctx := context.Background()
	points := roughWall(30000, 1)
	v := sumPoints(t, 0.1, points)
	byCell := map[terrain.Cell][]r3.Vec{}
	for _, p := range points {
		c := v.Lattice.CellOf(p)
		byCell[c] = append(byCell[c], p)
	}
	const radius = 0.45
	got, err := FitLocal(ctx, v, terrain.NewIndex(v), radius, Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(1, 1))
	for range 300 {
		i := rng.IntN(v.Len())
		var members []r3.Vec
		voxels := 0
		for j, c := range v.Cells {
			if r3.Norm(r3.Sub(v.Mean(j), v.Mean(i))) <= radius {
				members = append(members, byCell[c]...)
				voxels++
			}
		}
		if int64(len(members)) != got.Points[i] || voxels != int(got.Voxels[i]) {
			t.Fatalf("voxel %d: %d points of %d voxels, want %d of %d", i, got.Points[i], got.Voxels[i], len(members), voxels)
		}
		normal, rms := rawPlane(members)
		// Points are rounded to 0.1 mm, which turns a plane of this size by
		// a few µrad and adds 0.03 mm to its roughness.
		if a := math.Abs(r3.Dot(normal, got.Normal[i])); a < 1-1e-9 {
			t.Fatalf("voxel %d: normal %v, want %v", i, got.Normal[i], normal)
		}
		if d := math.Abs(float64(got.Roughness[i]) - rms); d > 1e-5 {
			t.Fatalf("voxel %d: roughness %g, want %g", i, got.Roughness[i], rms)
		}
	}
}

// rawPlane is a two-pass fit in floating point, as independent of moments
// as can be: centroid first, then products of differences.
func rawPlane(points []r3.Vec) (normal r3.Vec, rms float64) {
	var mean r3.Vec
	for _, p := range points {
		mean = r3.Add(mean, r3.Sub(p, points[0]))
	}
	n := float64(len(points))
	mean = r3.Add(points[0], r3.Scale(1/n, mean))
	var c terrain.Covariance
	for _, p := range points {
		d := r3.Sub(p, mean)
		c.XX += d.X * d.X / n
		c.XY += d.X * d.Y / n
		c.XZ += d.X * d.Z / n
		c.YY += d.Y * d.Y / n
		c.YZ += d.Y * d.Z / n
		c.ZZ += d.Z * d.Z / n
	}
	lambda, axes := EigenSym3(c)
	return axes[0], math.Sqrt(lambda[0] * n / (n - 3))
}

func TestFitLocalIndependentOfWorkers(t *testing.T) {
	ctx := context.Background()
	v := sumPoints(t, 0.05, roughWall(40000, 2))
	x := terrain.NewIndex(v)
	want, err := FitLocal(ctx, v, x, 0.3, Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	for workers := 2; workers <= 4; workers++ {
		got, err := FitLocal(ctx, v, x, 0.3, Work{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(got, want) {
			t.Fatalf("%d workers: planes differ", workers)
		}
	}
}

// Members from a coarser level: the plane of a plane is the same at any level.
func TestFitLocalCoarserMembers(t *testing.T) {
	ctx := context.Background()
	rng := rand.New(rand.NewPCG(1, 2))
	n := r3.Unit(r3.Vec{X: -0.3, Y: -0.9, Z: 0.35})
	u := orthogonal(n)
	w := r3.Cross(n, u)
	points := make([]r3.Vec, 40000)
	for i := range points {
		points[i] = r3.Add(r3.Vec{X: 412000, Y: 6543000, Z: 90},
			r3.Add(r3.Scale(6*rng.Float64(), u), r3.Scale(6*rng.Float64(), w)))
	}
	v := sumPoints(t, 0.1, points)
	levels, _, err := v.Pyramid(0.4)
	if err != nil {
		t.Fatal(err)
	}
	for level, m := range levels {
		got, err := FitLocal(ctx, v, terrain.NewIndex(m), 1.5, Work{Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		for i := range got.Normal {
			if a := math.Abs(r3.Dot(n, got.Normal[i])); a < 1-1e-8 || math.Abs(got.Offset[i]) > 2e-4 {
				t.Fatalf("level %d voxel %d: normal %v offset %g, want %v and 0", level, i, got.Normal[i], got.Offset[i], n)
			}
		}
	}
}

// What has no plane says so.
func TestFitLocalDegenerate(t *testing.T) {
	var line []r3.Vec
	for i := range 200 {
		line = append(line, r3.Vec{X: float64(i) * 0.03, Y: 0.01 * float64(i%2)})
	}
	for name, points := range map[string][]r3.Vec{
		"two points": {{}, {X: 0.3}},
		"four cells": {{}, {X: 0.3}, {Y: 0.3}, {X: 0.3, Y: 0.3}},
		"scan line":  line,
	} {
		t.Run(name, func(t *testing.T) {
			v := sumPoints(t, 0.1, points)
			p, err := FitLocal(context.Background(), v, terrain.NewIndex(v), 0.5, Work{Workers: 1})
			if err != nil {
				t.Fatal(err)
			}
			for i := range p.Normal {
				if p.Fitted(i) {
					t.Fatalf("voxel %d has normal %v", i, p.Normal[i])
				}
			}
		})
	}
}

func TestFitLocalStops(t *testing.T) {
	v := sumPoints(t, 0.05, roughWall(20000, 3))
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := FitLocal(ctx, v, terrain.NewIndex(v), 0.3, Work{Workers: 2}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want canceled", err)
	}
}

// A tile with many neighbourhoods stops within it: its one tile was begun
// before the context ended.
func TestFitLocalStopsWithinTile(t *testing.T) {
	v := sumPoints(t, 0.05, roughWall(20000, 3))
	if n := len(tilesOf(v, 100)); n != 1 {
		t.Fatalf("%d tiles, want 1", n)
	}
	out := &LocalPlanes{Normal: make([]r3.Vec, v.Len()), Offset: make([]float64, v.Len())}
	out.Roughness, out.Variation, out.SigmaDeg = make([]float32, v.Len()), make([]float32, v.Len()), make([]float32, v.Len())
	out.Points, out.Voxels = make([]int64, v.Len()), make([]int32, v.Len())
	w := &localWorker{at: v, members: terrain.NewIndex(v), out: out, radius: 0.3}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if err := w.tile(ctx, tilesOf(v, 100)[0]); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want canceled", err)
	}
	if last := v.Len() - 1; out.Voxels[last] != 0 {
		t.Errorf("voxel %d was fitted after the context had ended", last)
	}
}

func TestFitLocalCrowded(t *testing.T) {
	// The second is the most a damaged file could claim: the sum of all wraps
	// round to a small number.
	for _, n := range []int64{1 << 50, 1 << 62} {
		v := sumPoints(t, 1, roughWall(2000, 4))
		for i := range v.Moments[:4] {
			v.Moments[i].N = n
		}
		if _, err := FitLocal(context.Background(), v, terrain.NewIndex(v), 5, Work{Workers: 2}); !errors.Is(err, ErrCrowded) {
			t.Errorf("%d points: error %v, want ErrCrowded", n, err)
		}
	}
}

// A radius far larger than the survey takes no memory for the space around it,
// and one that leaves the lattice is refused.
func TestFitLocalLargeRadius(t *testing.T) {
	v := sumPoints(t, 0.005, []r3.Vec{{X: 0.012, Z: 0.001}, {X: 0.007, Y: 0.013}, {X: 0.021, Y: 0.002}, {Y: 0.031, Z: 0.002}, {X: 0.034, Y: 0.038}, {X: 0.002, Y: 0.003}})
	x := terrain.NewIndex(v)
	p, err := FitLocal(context.Background(), v, x, 400, Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	for i := range v.Cells {
		if p.Points[i] != 6 || !p.Fitted(i) {
			t.Errorf("voxel %d: %d points, want all 6 and a plane", i, p.Points[i])
		}
	}
	w := &localWorker{at: v, members: x, radius: 400}
	if _, err := w.gather([]int32{0}); err != nil {
		t.Fatal(err)
	}
	if n := len(w.starts); n > 100 {
		t.Errorf("%d columns over a survey of 8 cells square", n-1)
	}
	for _, radius := range []float64{1e4, 1e12, math.Inf(1), math.NaN()} {
		if _, err := FitLocal(context.Background(), v, x, radius, Work{Workers: 1}); !errors.Is(err, ErrCrowded) {
			t.Errorf("radius %g: error %v, want ErrCrowded", radius, err)
		}
	}
}

// A face of 20 m × 10 m with about 80 occupied neighbours within the radius.
func BenchmarkFitLocal(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 3))
	points := make([]r3.Vec, 1_000_000)
	for i := range points {
		x, z := 20*rng.Float64(), 10*rng.Float64()
		points[i] = r3.Vec{X: 412000 + x, Y: 6543000 + 0.2*math.Sin(2*x) + 0.3*z + 0.004*rng.NormFloat64(), Z: 80 + z}
	}
	v := sumPoints(b, 0.05, points)
	x := terrain.NewIndex(v)
	for _, workers := range []int{1, 2} {
		b.Run([]string{"", "one", "two"}[workers], func(b *testing.B) {
			b.ReportAllocs()
			var members int64
			for range b.N {
				p, err := FitLocal(context.Background(), v, x, 0.22, Work{Workers: workers})
				if err != nil {
					b.Fatal(err)
				}
				members = 0
				for _, n := range p.Voxels {
					members += int64(n)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(v.Len()), "ns/voxel")
			b.ReportMetric(float64(members)/float64(v.Len()), "neighbours")
		})
	}
}
