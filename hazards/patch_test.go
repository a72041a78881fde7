package hazards

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// voxelise sums points into voxels of edge g.
func voxelise(t testing.TB, g float64, points []r3.Vec) *terrain.Voxels {
	t.Helper()
	l, err := terrain.NewLattice(g)
	if err != nil {
		t.Fatal(err)
	}
	sums := map[terrain.Cell]*terrain.Moments{}
	for _, p := range points {
		c := l.CellOf(p)
		m := sums[c]
		if m == nil {
			m = new(terrain.Moments)
			sums[c] = m
		}
		d := r3.Scale(terrain.QuantaPerMetre, r3.Sub(p, l.Centre(c)))
		m.AddPoint(int64(math.Round(d.X)), int64(math.Round(d.Y)), int64(math.Round(d.Z)))
	}
	v := &terrain.Voxels{Lattice: l}
	for c := range sums {
		v.Cells = append(v.Cells, c)
	}
	slices.SortFunc(v.Cells, terrain.Cell.Compare)
	for _, c := range v.Cells {
		v.Moments = append(v.Moments, *sums[c])
	}
	return v
}

// ground is a surface with its local planes, turned towards air.
type ground struct {
	surface *Surface
	planes  *fit.LocalPlanes
}

func newGround(t testing.TB, g, radius float64, air r3.Vec, points []r3.Vec) ground {
	t.Helper()
	v := voxelise(t, g, points)
	x := terrain.NewIndex(v)
	planes, err := fit.FitLocal(context.Background(), v, x, radius, fit.Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	for i, n := range planes.Normal {
		if r3.Dot(n, air) < 0 {
			planes.Normal[i] = r3.Scale(-1, n)
			planes.Offset[i] = -planes.Offset[i]
		}
	}
	return ground{&Surface{Voxels: v, Index: x}, planes}
}

// sheet returns points with mean spacing d on the rectangle about o with half
// sides a, b along the plane axes of normal n, moved along n by height(a, b).
func sheet(rng *rand.Rand, o, n r3.Vec, a, b, d float64, height func(a, b float64) (float64, bool)) []r3.Vec {
	n = r3.Unit(n)
	u, w := frame(n)
	count := int(4 * a * b / (d * d))
	points := make([]r3.Vec, 0, count)
	for range count {
		s, t := a*(2*rng.Float64()-1), b*(2*rng.Float64()-1)
		h, ok := height(s, t)
		if !ok {
			continue
		}
		p := r3.Add(o, r3.Add(r3.Scale(s, u), r3.Scale(t, w)))
		points = append(points, r3.Add(p, r3.Scale(h, n)))
	}
	return points
}

func flat(a, b float64) (float64, bool) { return 0, true }

// leaning is the normal of a face with the given inclination and dip direction.
func leaning(inclinationDeg, dipDirectionDeg float64) r3.Vec {
	si, ci := math.Sincos(inclinationDeg * math.Pi / 180)
	sd, cd := math.Sincos(dipDirectionDeg * math.Pi / 180)
	return r3.Vec{X: si * sd, Y: si * cd, Z: ci}
}

func randomDirection(rng *rand.Rand) r3.Vec {
	for {
		v := r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}
		if r3.Norm(v) > 0.1 {
			return r3.Unit(v)
		}
	}
}

// nearestVoxel is the voxel whose mean is nearest to p.
func (g ground) nearestVoxel(p r3.Vec) int {
	return g.surface.Index.Nearest(p, 10)
}

// lenient accepts everything, so that measures can be looked at.
func lenient(radius float64) *Profile {
	return &Profile{
		FootprintRadiusM: radius,
		InclinationDeg:   Range{0, 0, 180, 180},
		RoughnessM:       Limit{1, 1},
		StepM:            Limit{radius, radius},
		ClearanceM:       Limit{-radius, -radius},
		Coverage:         Limit{0, 0},
		Weights:          Weights{1, 1, 1, 1, 1},
	}
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.9g, want %.9g ± %g", what, got, want, tol)
	}
}

// A block of known height on a leaning plane of known noise: the oracle is the
// recipe.
func TestMeasureKnownFace(t *testing.T) {
	const (
		spacing, radius = 0.05, 0.5
		noise, block    = 0.004, 0.10
	)
	for _, dip := range []float64{0, 37, 200} {
		for _, lean := range []float64{0, 30, 60, 90, 120} {
			rng := rand.New(rand.NewPCG(1, 1))
			n := leaning(lean, dip)
			origin := r3.Vec{X: 431000.3, Y: 5411000.7, Z: 120.1}
			points := sheet(rng, origin, n, 2.5, 1.5, 0.008, func(a, b float64) (float64, bool) {
				h := noise * rng.NormFloat64()
				if math.Hypot(a-2, b) < 0.12 {
					h += block
				}
				return h, true
			})
			g := newGround(t, spacing, radius, n, points)
			j := newJudge(g.surface, g.planes, nil, lenient(radius))

			m, disc := j.measure(int32(g.nearestVoxel(origin)), &gathering{j: j})
			near(t, "inclination", m[inclination].value, lean, 5*m[inclination].sigma+0.05)
			near(t, "roughness", m[roughness].value, noise, 0.03*noise)
			near(t, "coverage", m[coverage].value, 1, 0)
			// 12 000 points; the outermost can stand alone in its voxel, and exceeds
			// 5 sigmas with a probability of 0.3 %.
			if s := m[step].value; !(s >= 0 && s < 5*noise) {
				t.Errorf("lean %g: step of a plane %g", lean, s)
			}
			if len(disc) == 0 {
				t.Fatalf("lean %g: empty disc", lean)
			}

			u, _ := frame(n)
			m, _ = j.measure(int32(g.nearestVoxel(r3.Add(origin, r3.Scale(1.75, u)))), &gathering{j: j})
			// The block lifts the fitted plane by its share of the area and tilts it.
			near(t, "step of the block", m[step].value, block, 0.02)
			if m[step].sigma <= 0 || m[step].sigma > 0.025 {
				t.Errorf("lean %g: step sigma %g", lean, m[step].sigma)
			}
		}
	}
}

// On a smooth 20° plane beside a ball every measure but inclination and
// clearance is at its best; the score follows by hand.
func TestFindPatchesScoreByHand(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	n := leaning(20, 90)
	points := sheet(rng, r3.Vec{}, n, 3, 3, 0.01, flat)
	g := newGround(t, 0.05, 0.5, n, points)
	p := lenient(0.5)
	p.InclinationDeg = Range{0, 0, 10, 30}    // 20° is 0.5
	p.ClearanceM = Limit{Best: 4, Allowed: 0} // linear: clearance/4
	p.Coverage = Limit{Best: 1, Allowed: 1}   // away from the edge
	p.Weights = Weights{Inclination: 1, Roughness: 0, Step: 0, Clearance: 3, Coverage: 0}

	ball := r3.Scale(-3.5, r3.Unit(r3.Vec{X: math.Cos(20 * math.Pi / 180), Z: -math.Sin(20 * math.Pi / 180)}))
	obstacles := []Obstacle{{Ellipsoid: fit.Ellipsoid{
		Centre: ball, SemiAxes: [3]float64{0.7, 0.7, 0.7},
		Axes: [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}},
	}}}
	patches, zones, err := FindPatches(context.Background(), g.surface, g.planes, obstacles, p, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	if len(zones) != 1 || len(patches) < 10 {
		t.Fatalf("%d zones, %d patches", len(zones), len(patches))
	}
	for _, q := range patches {
		clear := r3.Norm(r3.Sub(q.Centre, ball)) - 0.7 - 0.5
		near(t, "clearance", q.ClearanceM, clear, 1e-9)
		near(t, "inclination", q.InclinationDeg, 20, 0.01)
		near(t, "dip direction", q.DipDirectionDeg, 90, 0.05)
		want := math.Pow((30-q.InclinationDeg)/20*math.Pow(min(clear/4, 1), 3), 1./4)
		near(t, "score", q.Score, want, 1e-9)
		limited := Clearance
		if math.Pow(min(clear/4, 1), 3) > (30-q.InclinationDeg)/20 {
			limited = Inclination
		}
		if q.LimitedBy != limited {
			t.Errorf("clearance %g limited by %s, want %s", clear, q.LimitedBy, limited)
		}
		// σ is half a spacing, 0.025 m; all the rest is sure.
		near(t, "confidence", q.Confidence, 0.5*math.Erfc(-clear/(0.025*math.Sqrt2)), 1e-6)
		if q.Coverage != 1 || q.RoughnessM > 0.001 || len(q.Voxels) < 200 {
			t.Errorf("%s: coverage %g, roughness %g, %d voxels", q.ID, q.Coverage, q.RoughnessM, len(q.Voxels))
		}
		near(t, "plane through the centre", q.Plane.Signed(q.Centre), 0, 1e-9)
	}
}

func TestFindPatchesWithoutObstacles(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	g := newGround(t, 0.05, 0.4, r3.Vec{Z: 1}, sheet(rng, r3.Vec{}, r3.Vec{Z: 1}, 1, 1, 0.01, flat))
	p, _ := Example("ledge")
	patches, zones, err := FindPatches(context.Background(), g.surface, g.planes, nil, &p, fit.Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	if len(patches) == 0 || len(zones) != 1 {
		t.Fatalf("%d patches, %d zones", len(patches), len(zones))
	}
	for _, q := range patches {
		if !math.IsInf(q.ClearanceM, 1) || q.Score <= 0 || q.Confidence <= 0 {
			t.Errorf("%s: clearance %g, score %g, confidence %g", q.ID, q.ClearanceM, q.Score, q.Confidence)
		}
	}
}

// rubble is a scene with all kinds of ground: a rough tilted floor with holes
// and blocks.
func rubble(t testing.TB, half float64) (ground, []Obstacle) {
	rng := rand.New(rand.NewPCG(1, 1))
	points := sheet(rng, r3.Vec{X: 10, Y: 20, Z: 5}, leaning(12, 140), half, half, 0.02, func(a, b float64) (float64, bool) {
		h := 0.004*rng.NormFloat64() + 0.05*math.Sin(a)*math.Cos(1.3*b)
		if math.Sin(2*a)*math.Sin(2.2*b) > 0.93 {
			h += 0.12
		}
		return h, math.Sin(1.1*a+1)*math.Sin(0.9*b) < 0.9
	})
	g := newGround(t, 0.05, 0.4, r3.Vec{Z: 1}, points)
	var obstacles []Obstacle
	for range 5 {
		at := g.surface.Voxels.Mean(rng.IntN(g.surface.Voxels.Len()))
		obstacles = append(obstacles, Obstacle{Ellipsoid: fit.Ellipsoid{
			Centre: at, SemiAxes: [3]float64{0.3, 0.2, 0.1}, Axes: [3]r3.Vec{{Z: 1}, {X: 1}, {Y: 1}},
		}})
	}
	return g, obstacles
}

func TestFindPatchesDoesNotDependOnWorkers(t *testing.T) {
	g, obstacles := rubble(t, 3)
	p, _ := Example("ledge")
	patches, zones, err := FindPatches(context.Background(), g.surface, g.planes, obstacles, &p, fit.Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	if len(patches) < 5 || len(zones) == 0 {
		t.Fatalf("%d patches, %d zones: the scene is too bad to test on", len(patches), len(zones))
	}
	for _, workers := range []int{0, 2, 3} {
		p2, z2, err := FindPatches(context.Background(), g.surface, g.planes, obstacles, &p, fit.Work{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(patches, p2) || !reflect.DeepEqual(zones, z2) {
			t.Errorf("%d workers: another result", workers)
		}
	}
}

// What is said of a patch must hold: within every allowed limit, by the very
// definitions.
func TestPatchesWithinLimits(t *testing.T) {
	g, obstacles := rubble(t, 3)
	p, _ := Example("ledge")
	patches, _, err := FindPatches(context.Background(), g.surface, g.planes, obstacles, &p, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	j := newJudge(g.surface, g.planes, obstacles, &p)
	scores, err := j.scores(context.Background(), fit.Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	for _, q := range patches {
		if q.Score != scores[q.Voxel] {
			t.Errorf("%s: score %g, picked for %g", q.ID, q.Score, scores[q.Voxel])
		}
		if !(q.Score > 0 && q.Score <= 1 && q.Confidence >= 0 && q.Confidence <= 1) {
			t.Errorf("%s: score %g, confidence %g", q.ID, q.Score, q.Confidence)
		}
		if q.InclinationDeg > 25 || q.RoughnessM > 0.08 || q.StepM > 0.15 || q.Coverage < 0.85 || q.ClearanceM < 0 {
			t.Errorf("%s: outside a limit", q.ID)
		}
		for _, o := range obstacles {
			// No point of the rim is within the clearance of an obstacle.
			u, w := frame(q.Plane.Normal)
			for i := range 64 {
				s, c := math.Sincos(float64(i) * math.Pi / 32)
				rim := r3.Add(q.Centre, r3.Scale(p.FootprintRadiusM, r3.Add(r3.Scale(c, u), r3.Scale(s, w))))
				if d := o.Ellipsoid.DistanceTo(rim); d < q.ClearanceM-1e-9 {
					t.Errorf("%s: rim %g m from an obstacle, clearance %g", q.ID, d, q.ClearanceM)
				}
			}
		}
		highest := 0.0
		for _, v := range q.Voxels {
			highest = max(highest, r3.Dot(r3.Sub(g.surface.Voxels.Mean(int(v)), q.Centre), q.Plane.Normal))
		}
		near(t, "step", q.StepM, highest, 1e-9)
	}
}

func TestFindPatchesCancelled(t *testing.T) {
	g, obstacles := rubble(t, 1)
	p, _ := Example("ledge")
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, _, err := FindPatches(ctx, g.surface, g.planes, obstacles, &p, fit.Work{Workers: 2}); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v, want cancelled", err)
	}
}

// Every stage heeds the context by itself: each takes long on a large survey.
func TestPatchesAndZonesCancelled(t *testing.T) {
	g, obstacles := rubble(t, 2)
	p, _ := Example("ledge")
	j := newJudge(g.surface, g.planes, obstacles, &p)
	scores, err := j.scores(context.Background(), fit.Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if got, err := j.patches(ctx, []int32{0}); got != nil || !errors.Is(err, context.Canceled) {
		t.Errorf("%d patches, error %v, want canceled", len(got), err)
	}
	if got, err := j.zones(ctx, scores, nil); got != nil || !errors.Is(err, context.Canceled) {
		t.Errorf("%d zones, error %v, want canceled", len(got), err)
	}
}

func TestFindPatchesNothing(t *testing.T) {
	p, _ := Example("ledge")
	// Two lone points: no plane anywhere. And a footprint below the spacing.
	for name, g := range map[string]ground{
		"points": newGround(t, 0.05, 0.4, r3.Vec{Z: 1}, []r3.Vec{{X: 1}, {X: 1.2}}),
		"coarse": newGround(t, 10, 0.4, r3.Vec{Z: 1}, sheet(rand.New(rand.NewPCG(1, 1)), r3.Vec{}, r3.Vec{Z: 1}, 50, 50, 5, flat)),
		"empty":  newGround(t, 0.05, 0.4, r3.Vec{Z: 1}, nil),
	} {
		patches, zones, err := FindPatches(context.Background(), g.surface, g.planes, nil, &p, fit.Work{Workers: 1})
		if err != nil || len(patches) != 0 || len(zones) != 0 {
			t.Errorf("%s: %d patches, %d zones, %v", name, len(patches), len(zones), err)
		}
	}
}

func TestFindPatchesOtherRadius(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("planes of another radius accepted")
		}
	}()
	p, _ := Example("ledge")
	g := newGround(t, 0.05, 0.5, r3.Vec{Z: 1}, nil)
	FindPatches(context.Background(), g.surface, g.planes, nil, &p, fit.Work{Workers: 1})
}

// benchmarkScores times the judgement of every voxel.
func benchmarkScores(b *testing.B, name string, spacing float64) {
	rng := rand.New(rand.NewPCG(1, 1))
	p, _ := Example(name)
	n := leaning((p.InclinationDeg.BestMin+p.InclinationDeg.BestMax)/2, 130)
	side := 60 * spacing
	points := sheet(rng, r3.Vec{}, n, side, side, spacing/3, flat)
	g := newGround(b, spacing, p.FootprintRadiusM, n, points)
	voxels := g.surface.Voxels.Len()
	b.ReportAllocs()
	b.ResetTimer()
	for range b.N {
		if _, _, err := FindPatches(context.Background(), g.surface, g.planes, nil, &p, fit.Work{Workers: 1}); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(voxels), "ns/voxel")
}

func BenchmarkFindPatches(b *testing.B) {
	b.Run("suspended at 0.06", func(b *testing.B) { benchmarkScores(b, "suspended", 0.06) })
	b.Run("ledge at 0.05", func(b *testing.B) { benchmarkScores(b, "ledge", 0.05) })
}
