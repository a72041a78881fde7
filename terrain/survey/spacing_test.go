package survey

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"ledgework/terrain"
)

func TestAutoSpacing(t *testing.T) {
	tests := []struct{ footprint, median, want float64 }{
		{0.5, 0.01, 0.05},
		{0.5, 0.03, 0.05},
		{0.5, 0.04, 0.1},
		{0.6, 0.01, 0.1},
		{1, 0.13, 0.2},
		{2, 1.037, 2},
		{2, 0.9203, 2},
		{0, 0.001, 0.002},
		{0, 10, 20},
		{0, 30, 50},
		{100, 0, 10},
		{0.3, 0.02, 0.05},
		{0.2, 0, 0.02}, // exactly on a step
	}
	for _, tt := range tests {
		if got := AutoSpacing(tt.footprint, tt.median); got != tt.want {
			t.Errorf("AutoSpacing(%g, %g) = %g, want %g", tt.footprint, tt.median, got, tt.want)
		}
	}
}

func TestAutoSpacingPanics(t *testing.T) {
	for _, v := range [][2]float64{{0, 0}, {-1, 1}, {1, -1}, {math.NaN(), 1}, {1, math.Inf(1)}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("AutoSpacing(%g, %g) did not panic", v[0], v[1])
				}
			}()
			AutoSpacing(v[0], v[1])
		}()
	}
}

// bruteMedian is the definition of MedianSpacing without sampling.
func bruteMedian(points [][3]float64) float64 {
	var all []float64
	for _, p := range points {
		best := math.Inf(1)
		for _, q := range points {
			d := math.Hypot(math.Hypot(p[0]-q[0], p[1]-q[1]), p[2]-q[2])
			if d > 0 {
				best = min(best, d)
			}
		}
		all = append(all, best)
	}
	slices.Sort(all)
	return all[(len(all)-1)/2]
}

func batchOf(points [][3]float64) *terrain.Batch {
	b := terrain.NewBatch(max(1, len(points)), 0)
	b.Resize(len(points))
	for i, p := range points {
		b.X[i], b.Y[i], b.Z[i] = p[0], p[1], p[2]
	}
	return b
}

func frameOf(points [][3]float64) *Frame {
	f := &Frame{Extent: terrain.EmptyExtent(), Points: int64(len(points))}
	for _, p := range points {
		f.Extent.Add(p[0], p[1], p[2])
	}
	return f
}

func TestMedianSpacingOfFewPoints(t *testing.T) {
	points := cloud(1500)
	points = append(points, points[:100]...) // the same places again
	s := newSample(frameOf(points))
	s.add(batchOf(points))
	if got, want := s.median(), bruteMedian(points[:1500]); math.Abs(got-want) > 1e-9 {
		t.Errorf("got %g, want %g", got, want)
	}
	for _, few := range [][][3]float64{nil, points[:1], {points[0], points[0]}} {
		s := newSample(frameOf(few))
		s.add(batchOf(few))
		if got := s.median(); got != 0 {
			t.Errorf("%d points: got %g, want 0", len(few), got)
		}
	}
}

// A jittered square grid of known spacing, sampled at every density.
func TestMedianSpacingSurvivesSampling(t *testing.T) {
	for _, tt := range []struct {
		name string
		n    int // points a side
		pos  func(u, v float64) [3]float64
	}{
		{"flat", 700, func(u, v float64) [3]float64 { return [3]float64{u, v, 0} }},
		{"wall facing east", 700, func(u, v float64) [3]float64 { return [3]float64{7, u, v} }},
		// A corridor of 1 % of its box: the mean spacing is wrong tenfold.
		{"two strips far apart", 700, func(u, v float64) [3]float64 {
			if u > 0.05 {
				return [3]float64{u + 50, v + 50, 0}
			}
			return [3]float64{u, v, 0}
		}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			const spacing = 0.01
			rng := rand.New(rand.NewPCG(1, 1))
			var points [][3]float64
			for i := range tt.n {
				for j := range tt.n {
					u, v := spacing*(float64(i)+0.1*rng.Float64()), spacing*(float64(j)+0.1*rng.Float64())
					points = append(points, tt.pos(u, v))
				}
			}
			f := frameOf(points)
			whole := newSample(f)
			whole.add(batchOf(points))
			got := whole.median()
			// Of four neighbours at spacing ± 0.1 spacing the nearest is a
			// little nearer than spacing.
			if got < 0.9*spacing || got > spacing {
				t.Errorf("median %g, want just below %g; level %d, %d points", got, spacing, whole.level, len(whole.points))
			}
			if len(whole.points) > spacingBudget {
				t.Errorf("%d points held", len(whole.points))
			}

			// Any order and number of workers gives the same.
			rng.Shuffle(len(points), func(i, j int) { points[i], points[j] = points[j], points[i] })
			parts := make([]*sample, 3)
			for i := range parts {
				parts[i] = newSample(f)
				parts[i].add(batchOf(points[i*len(points)/3 : (i+1)*len(points)/3]))
			}
			parts[2].merge(parts[0])
			parts[2].merge(parts[1])
			if again := parts[2].median(); again != got {
				t.Errorf("in another order and three parts: %g, want %g", again, got)
			}
		})
	}
}

func TestMedianSpacingOfOnePlace(t *testing.T) {
	points := make([][3]float64, 2*spacingBudget)
	for i := range points {
		points[i] = [3]float64{1, 2, 3}
	}
	s := newSample(frameOf(points))
	s.add(batchOf(points))
	if got := s.median(); got != 0 || len(s.points) > spacingBudget {
		t.Errorf("got %g with %d points held", got, len(s.points))
	}
}

func TestMedianSpacingOfFiles(t *testing.T) {
	dir := t.TempDir()
	points := cloud(3000)
	src := []Source{{Path: writeLAS(t, dir, "a.las", "", points[:2000], nil)}, {Path: writeLAS(t, dir, "b.las", "", points[2000:], nil)}}
	f, err := Plan(context.Background(), src, "")
	if err != nil {
		t.Fatal(err)
	}
	got, err := MedianSpacing(context.Background(), f, src, StreamOptions{}, nil)
	if err != nil || math.Abs(got-bruteMedian(points)) > 1e-6 {
		t.Errorf("got %g, want %g, error %v", got, bruteMedian(points), err)
	}

	grid := []Source{{Path: writeFile(t, dir, "g.asc", "ncols 3\nnrows 2\nxllcorner 1000\nyllcorner 2000\ncellsize 7.5\n1 2 3\n4 5 6\n")}}
	if f, err = Plan(context.Background(), grid, ""); err != nil {
		t.Fatal(err)
	}
	if got, err := MedianSpacing(context.Background(), f, grid, StreamOptions{}, nil); err != nil || got != 7.5 {
		t.Errorf("grid: got %g, want 7.5, error %v", got, err)
	}
}

// Two columns of points took a minute: neighbours were looked for along the
// axis between the columns.
func TestMedianSpacingOfTwoColumns(t *testing.T) {
	const n = spacingBudget / 2
	points := make([][3]float64, 0, 2*n)
	for i := range n {
		z := 0.01 * float64(i)
		points = append(points, [3]float64{0, 0, z}, [3]float64{2000, 0, z})
	}
	s := newSample(frameOf(points))
	s.add(batchOf(points))
	start := time.Now()
	if got := s.median(); math.Abs(got-0.01) > 1e-9 {
		t.Errorf("got %g, want 0.01", got)
	}
	// Milliseconds where each point looks at few others, 10^10 steps where it
	// looks at its whole column.
	if took := time.Since(start); took > 10*time.Second {
		t.Errorf("took %v", took)
	}
}
