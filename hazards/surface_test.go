package hazards

import (
	"context"
	"errors"
	"math"
	"reflect"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// A cliff with a deep notch whose roof is 1 m deep: every side of it.
func cliffWithRoof() (s scene, roof, floor, back, front r3.Vec) {
	s, a := wall(80)
	level := attitude{o: a.at(0, 0, 0), u: a.u, w: r3.Vec{Y: 1}, n: r3.Vec{Z: 1}}
	s = s.cut(block(level, 1.5, 1.2, -1, 1))
	return s, level.at(0, 0.6, 1), level.at(0, 0.6, -1), level.at(0, 1.2, 0), a.at(4, 0, 0)
}

func build(t testing.TB, v *terrain.Voxels, sensors []r3.Vec, workers int) *Surface {
	t.Helper()
	o, _ := ObstacleOptions{}.Resolve(v.Lattice.SpacingM())
	s, err := NewSurface(context.Background(), v, sensors, o, fit.Work{Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// Roofs face down, floors up and walls out, with scanner positions and without.
func TestSurfaceFacesAir(t *testing.T) {
	scene, roof, floor, back, front := cliffWithRoof()
	for _, azimuth := range []float64{0, 77, 200} {
		v := standard(azimuth)
		x := v.voxels(t, scene)
		for name, sensors := range map[string][]r3.Vec{
			"without": nil,
			"with":    {v.place(r3.Vec{X: 5, Y: -40, Z: 2}), v.place(r3.Vec{X: -20, Y: -30, Z: 20})},
		} {
			s := build(t, x, sensors, 2)
			// A lone wall of 80° has little that tells its side. It comes out
			// right all the same, but must be reported.
			if (s.GuessedShare > 0.5) != (sensors == nil) {
				t.Errorf("%s scanners: %.3f of the surface is guessed", name, s.GuessedShare)
			}
			for _, c := range []struct {
				name   string
				p, out r3.Vec
			}{
				{"roof", roof, r3.Vec{Z: -1}}, {"floor", floor, r3.Vec{Z: 1}},
				{"back", back, r3.Vec{Y: -1}}, {"front", front, south(80)},
			} {
				i := s.Index.Nearest(v.place(c.p), 0.3)
				if i < 0 {
					t.Fatalf("no voxel at the %s", c.name)
				}
				if a := angle(s.Planes.Normal[i], v.turn(c.out)); a > 5 {
					t.Errorf("azimuth %g, %s scanners: the %s faces %.2f, %.0f° off", azimuth, name, c.name, s.Planes.Normal[i], a)
				}
			}
		}
	}
}

// The planes of any radius, at any level of members, face the same way and
// agree with a brute force fit of all points within that radius.
func TestPlanesAt(t *testing.T) {
	scene, a := wall(65)
	v := standard(42)
	x := v.voxels(t, scene)
	s := build(t, x, nil, 2)
	at := s.Index.Nearest(v.place(a.o), 0.3)
	for _, radius := range []float64{0.2, 0.4, 0.6, 1.5, 3, 5} {
		p, err := s.PlanesAt(context.Background(), radius)
		if err != nil {
			t.Fatal(err)
		}
		if p.RadiusM != radius || len(p.Normal) != x.Len() {
			t.Fatalf("%d planes of radius %g m, want %d of %g m", len(p.Normal), p.RadiusM, x.Len(), radius)
		}
		for i, n := range p.Normal {
			if p.Fitted(i) && r3.Dot(n, v.turn(a.n)) < 0.5 {
				t.Fatalf("radius %g m: voxel %d faces %.2f", radius, i, n)
			}
		}
		near(t, "inclination", fit.InclinationDeg(p.Normal[at]), 65, max(0.05, 3*float64(p.SigmaDeg[at])))
	}
}

// A level is the sum of the finer ones, and ancestors lead to the cell around.
func TestSurfaceLevels(t *testing.T) {
	scene, _ := wall(50)
	v := standard(10)
	s := build(t, v.voxels(t, scene), nil, 2)
	if s.memberLevel != 1 || s.centreLevel != 3 { // 5 m/25 and 5 m/6, from 0.1 m
		t.Errorf("members at level %d and centres at %d, want 1 and 3", s.memberLevel, s.centreLevel)
	}
	for to, l := range s.levels {
		if l.Points() != s.Voxels.Points() {
			t.Errorf("level %d holds %d points, want %d", to, l.Points(), s.Voxels.Points())
		}
		up := s.ancestors(0, to)
		for i, c := range s.Voxels.Cells {
			want := terrain.Cell{I: c.I >> to, J: c.J >> to, K: c.K >> to}
			if got := l.Cells[up[i]]; got != want {
				t.Fatalf("level %d: ancestor of %v is %v, want %v", to, c, got, want)
			}
		}
	}
	if !slices.Equal(s.centreParents, s.ancestors(0, s.centreLevel)) {
		t.Error("centre parents are no ancestors")
	}
}

// Coarse surveys, on which all levels may be the same one.
func TestSurfaceCoarse(t *testing.T) {
	for _, g := range []float64{0.2, 0.5, 2} {
		scene, a := wall(40)
		v := standard(10)
		v.spacingM = g
		v.perCell = 3
		grow := g / 0.1
		v.withinM *= grow
		for i := range scene.parts {
			scene.parts[i] = a.square(halfM * grow)
		}
		s := build(t, v.voxels(t, scene), nil, 2)
		if err := s.MeasureRelief(context.Background()); err != nil {
			t.Fatal(err)
		}
		found, err := FindObstacles(context.Background(), s)
		if err != nil {
			t.Fatal(err)
		}
		if len(found) > 0 {
			t.Errorf("spacing %g m: %d obstacles on a plane", g, len(found))
		}
		unknown := 0
		for _, h := range s.Relief.Height {
			if math.IsNaN(h) {
				unknown++
			}
		}
		if unknown > 0 {
			t.Errorf("spacing %g m: %d voxels of %d without relief", g, unknown, s.Voxels.Len())
		}
	}
}

// Planes, sides and relief are the same to the last bit for any number of
// workers, and for any order of the points.
func TestSurfaceIndependentOfWorkersAndOrder(t *testing.T) {
	ctx := context.Background()
	scene, _, _, _, _ := cliffWithRoof()
	v := standard(17)
	points := v.points(scene)
	var want *Surface
	for workers := 1; workers <= 3; workers++ {
		slices.Reverse(points[:len(points)/workers])
		x, err := terrain.SumPoints(lattice(t, v.spacingM), points)
		if err != nil {
			t.Fatal(err)
		}
		got := build(t, x, nil, workers)
		if err := got.MeasureRelief(ctx); err != nil {
			t.Fatal(err)
		}
		if want == nil {
			want = got
			continue
		}
		if !reflect.DeepEqual(got.Planes, want.Planes) || got.GuessedShare != want.GuessedShare {
			t.Errorf("%d workers: planes differ", workers)
		}
		if !reflect.DeepEqual(got.Relief.Normal, want.Relief.Normal) {
			t.Errorf("%d workers: normals of faces differ", workers)
		}
		for i, h := range got.Relief.Height { // NaN is not equal to itself
			if math.Float64bits(h) != math.Float64bits(want.Relief.Height[i]) {
				t.Fatalf("%d workers: relief of voxel %d is %g, want %g", workers, i, h, want.Relief.Height[i])
			}
		}
	}
}

func TestSurfaceStops(t *testing.T) {
	scene, _ := wall(50)
	v := standard(0)
	x := v.voxels(t, scene)
	s := build(t, x, nil, 2)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := NewSurface(ctx, x, nil, s.options, fit.Work{Workers: 2}); !errors.Is(err, context.Canceled) {
		t.Errorf("NewSurface: error %v, want canceled", err)
	}
	if err := s.MeasureRelief(ctx); !errors.Is(err, context.Canceled) {
		t.Errorf("MeasureRelief: error %v, want canceled", err)
	}
	if _, err := s.PlanesAt(ctx, 0.5); !errors.Is(err, context.Canceled) {
		t.Errorf("PlanesAt: error %v, want canceled", err)
	}
}

// Surveys with next to nothing in them.
func TestSurfaceOfLittle(t *testing.T) {
	ctx := context.Background()
	for name, points := range map[string][]r3.Vec{
		"nothing":    nil,
		"one point":  {{X: 431000, Y: 5411000, Z: 3}},
		"few points": {{X: 431000, Y: 5411000, Z: 3}, {X: 431001, Y: 5411000, Z: 3}, {X: 431000, Y: 5411003, Z: 4}, {X: 431009, Y: 5411003, Z: 4}},
	} {
		s := build(t, voxelise(t, 0.1, points), nil, 2)
		if err := s.MeasureRelief(ctx); err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		found, err := FindObstacles(ctx, s)
		if err != nil || len(found) > 0 {
			t.Errorf("%s: %d obstacles, error %v", name, len(found), err)
		}
		for i, h := range s.Relief.Height {
			if !math.IsNaN(h) || s.Relief.Normal[i] != (r3.Vec{}) {
				t.Errorf("%s: relief %g against %v", name, h, s.Relief.Normal[i])
			}
		}
	}
}
