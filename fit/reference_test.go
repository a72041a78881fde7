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

// reliefOf measures the relief of points at 0.1 m, seen from a scanner.
func reliefOf(t *testing.T, ctx context.Context, points []r3.Vec, workers int) (*terrain.Voxels, *Relief, error) {
	t.Helper()
	v := sumPoints(t, 0.1, points)
	levels, parents, err := v.Pyramid(0.8)
	if err != nil {
		t.Fatal(err)
	}
	centre := make([]int32, v.Len())
	for i := range centre {
		centre[i] = int32(i)
		for _, p := range parents[:3] {
			centre[i] = p[centre[i]]
		}
	}
	members := terrain.NewIndex(levels[1])
	planes, err := FitLocal(context.Background(), levels[1], terrain.NewIndex(v), 0.4, Work{Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	above := []r3.Vec{r3.Add(origin(), r3.Vec{X: -30, Y: -20, Z: 40})}
	if _, err := OrientCoarse(context.Background(), members, planes, above); err != nil {
		t.Fatal(err)
	}
	r, err := FindRelief(ctx, &ReliefInput{
		At: v, Members: members, Planes: planes, Centres: levels[3], Centre: centre, RadiusM: testRadiusM, ProudM: testProudM,
	}, Work{Workers: workers})
	return v, r, err
}

// reliefScene is a foot with a block on its floor and a pit in it.
func reliefScene() []r3.Vec {
	rng := rand.New(rand.NewPCG(1, 1))
	var points []r3.Vec
	floor := scan(rng, 500, sheetOf{r3.Vec{X: -8, Y: -5}, r3.Vec{X: 8}, r3.Vec{Y: 10}})
	for _, p := range floor {
		q := r3.Sub(p, origin())
		if math.Abs(q.X+2) < 0.5 && math.Abs(q.Y-1) < 0.5 {
			p.Z += 0.5
		}
		if math.Abs(q.X+5) < 0.5 && math.Abs(q.Y+2) < 0.5 {
			p.Z -= 0.6
		}
		points = append(points, p)
	}
	return append(points, scan(rng, 500, sheetOf{r3.Vec{Y: -5}, r3.Vec{X: 2, Z: 6}, r3.Vec{Y: 10}})...)
}

// Relief is the recipe's to a centimetre: a block's top, a pit's floor, and
// nothing on either side of the foot.
func TestFindReliefValues(t *testing.T) {
	v, r, err := reliefOf(t, context.Background(), reliefScene(), 2)
	if err != nil {
		t.Fatal(err)
	}
	var block, pit, rest int
	for i, h := range r.Height {
		q := r3.Sub(v.Mean(i), origin())
		want := 0.0
		switch {
		case math.Abs(q.X+2) < 0.4 && math.Abs(q.Y-1) < 0.4:
			want = 0.5
			block++
		case math.Abs(q.X+5) < 0.4 && math.Abs(q.Y+2) < 0.4:
			want = -0.6
			pit++
		case math.Abs(q.X+2) < 0.6 && math.Abs(q.Y-1) < 0.6 || math.Abs(q.X+5) < 0.6 && math.Abs(q.Y+2) < 0.6:
			continue // their edges
		default:
			rest++
		}
		// Of the voxel's own mean, whose single point errs by up to 4σ of 5 mm.
		if !(math.Abs(h-want) < 0.03) {
			t.Fatalf("at %.2f: relief %.3f, want %.3f", q, h, want)
		}
		if n := r3.Norm(r.Normal[i]); math.Abs(n-1) > 1e-9 {
			t.Fatalf("normal of length %g", n)
		}
	}
	if block < 40 || pit < 40 || rest < 5000 {
		t.Errorf("%d, %d and %d voxels", block, pit, rest)
	}
}

func TestFindReliefIndependentOfWorkers(t *testing.T) {
	points := reliefScene()
	_, want, err := reliefOf(t, context.Background(), points, 1)
	if err != nil {
		t.Fatal(err)
	}
	for workers := 2; workers <= 3; workers++ {
		if _, got, err := reliefOf(t, context.Background(), points, workers); err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("%d workers: relief differs, error %v", workers, err)
		}
	}
}

func TestFindReliefStops(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, r, err := reliefOf(t, ctx, reliefScene(), 2); !errors.Is(err, context.Canceled) || r != nil {
		t.Errorf("error %v, want canceled", err)
	}
}

// CellArea, on average over where the lattice stands: the voxels that a large
// square of a plane cuts, times their share.
func TestCellArea(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 10 {
		n := randomUnit(rng)
		u := orthogonal(n)
		w := r3.Cross(n, u)
		const half = 3.0
		points := make([]r3.Vec, 0, 400000)
		for range cap(points) {
			points = append(points, r3.Add(r3.Scale(half*(2*rng.Float64()-1), u), r3.Scale(half*(2*rng.Float64()-1), w)))
		}
		v := sumPoints(t, 0.2, points)
		got := CellArea(0.2, n) * float64(v.Len())
		near(t, "area", got, 4*half*half, 0.08*4*half*half) // the rim, and slivers no point fell in
	}
	near(t, "without direction", CellArea(0.3, r3.Vec{}), 2*0.09/3, 1e-15)
}
