package hazards

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// The shapes of these tests are invented. A scene is a solid, given by what is
// rock, and sheets that hold all of its surface; whatever of a sheet is not on
// the surface of the solid is left out when the scene is scanned.

// A solid tells whether a point is rock.
type solid func(p r3.Vec) bool

func anyOf(s ...solid) solid {
	return func(p r3.Vec) bool {
		for _, in := range s {
			if in(p) {
				return true
			}
		}
		return false
	}
}

func allOf(s ...solid) solid {
	return func(p r3.Vec) bool {
		for _, in := range s {
			if !in(p) {
				return false
			}
		}
		return true
	}
}

func without(s, cut solid) solid { return func(p r3.Vec) bool { return s(p) && !cut(p) } }

// An attitude is a place on a face: u along it, w up it, n out of it.
type attitude struct{ o, u, w, n r3.Vec }

// facing is the attitude at o of a face with normal n.
func facing(o, n r3.Vec) attitude {
	n = r3.Unit(n)
	u, w := frame(n)
	return attitude{o, u, w, n}
}

func (a attitude) at(u, w, n float64) r3.Vec {
	return r3.Add(a.o, r3.Add(r3.Scale(u, a.u), r3.Add(r3.Scale(w, a.w), r3.Scale(n, a.n))))
}

// moved is the same attitude at another place of its face.
func (a attitude) moved(u, w, n float64) attitude {
	a.o = a.at(u, w, n)
	return a
}

func (a attitude) behind() solid {
	return func(p r3.Vec) bool { return r3.Dot(r3.Sub(p, a.o), a.n) < 0 }
}

// A face is a part of a surface, of which at gives points for s and t in [0, 1)
// with their normal, of either sign.
type sheetPart struct {
	areaM2 float64
	at     func(s, t float64) (p, n r3.Vec)
}

// square is the part of the plane within half of a's place on both axes.
func (a attitude) square(half float64) sheetPart {
	return sheetPart{4 * half * half, func(s, t float64) (r3.Vec, r3.Vec) {
		return a.at(half*(2*s-1), half*(2*t-1), 0), a.n
	}}
}

// relief is the surface at height h above the square, which must be gentle.
func (a attitude) relief(half float64, h func(u, w float64) float64) (solid, sheetPart) {
	return func(p r3.Vec) bool {
			d := r3.Sub(p, a.o)
			return r3.Dot(d, a.n) < h(r3.Dot(d, a.u), r3.Dot(d, a.w))
		}, sheetPart{4 * half * half, func(s, t float64) (r3.Vec, r3.Vec) {
			u, w := half*(2*s-1), half*(2*t-1)
			return a.at(u, w, h(u, w)), a.n
		}}
}

// A scene is a solid with its surface, and what of it is no surface.
type scene struct {
	rock  solid
	parts []sheetPart
	loose []r3.Vec
	radii []float64 // of balls full of twigs around loose
}

// convex is the solid behind all the planes, whose part of each lies within
// half of the point of the plane closest to c.
func convex(c r3.Vec, half float64, planes ...attitude) scene {
	var s scene
	var behind []solid
	for _, a := range planes {
		behind = append(behind, a.behind())
		a.o = r3.Sub(c, r3.Scale(r3.Dot(r3.Sub(c, a.o), a.n), a.n))
		s.parts = append(s.parts, a.square(half))
	}
	s.rock = allOf(behind...)
	return s
}

// block is a box on the face at a, 2·u wide along and 2·w long up it, from lo to
// hi out of it.
func block(a attitude, u, w, lo, hi float64) scene {
	return convex(a.at(0, 0, (lo+hi)/2), u+w+hi-lo,
		facing(a.at(u, 0, 0), a.u), facing(a.at(-u, 0, 0), r3.Scale(-1, a.u)),
		facing(a.at(0, w, 0), a.w), facing(a.at(0, -w, 0), r3.Scale(-1, a.w)),
		facing(a.at(0, 0, hi), a.n), facing(a.at(0, 0, lo), r3.Scale(-1, a.n)))
}

func (s scene) with(t scene) scene {
	s.rock = anyOf(s.rock, t.rock)
	s.parts = append(s.parts[:len(s.parts):len(s.parts)], t.parts...)
	return s
}

func (s scene) cut(t scene) scene {
	s.rock = without(s.rock, t.rock)
	s.parts = append(s.parts[:len(s.parts):len(s.parts)], t.parts...)
	return s
}

// A survey is a scene as it was scanned.
type survey struct {
	azimuthDeg float64 // by which the scene is turned
	origin     r3.Vec
	spacingM   float64
	perCell    float64 // points per g² of surface
	noiseM     float64 // 1σ on every axis
	withinM    float64 // what lies further from the scene's origin is not seen
	seed       uint64
}

// standard is how the scenes are scanned unless a test says otherwise: at
// coordinates of the size of UTM's.
func standard(azimuthDeg float64) survey {
	return survey{
		azimuthDeg: azimuthDeg, origin: r3.Vec{X: 431207.316, Y: 5411803.927, Z: 812.443},
		spacingM: 0.1, perCell: 5, noiseM: 0.005, withinM: 8, seed: 1,
	}
}

// place maps a point of the scene to the survey's coordinates.
func (v survey) place(p r3.Vec) r3.Vec { return r3.Add(v.origin, v.turn(p)) }

// turn maps a direction.
func (v survey) turn(p r3.Vec) r3.Vec {
	s, c := math.Sincos(v.azimuthDeg * math.Pi / 180)
	return r3.Vec{X: c*p.X + s*p.Y, Y: -s*p.X + c*p.Y, Z: p.Z}
}

func (v survey) points(s scene) []r3.Vec {
	rng := rand.New(rand.NewPCG(v.seed, 1))
	noisy := func(p r3.Vec) r3.Vec {
		e := r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}
		return r3.Add(v.place(p), r3.Scale(v.noiseM, e))
	}
	const skin = 1e-6 // m, on either side of a surface
	var points []r3.Vec
	for _, part := range s.parts {
		for range int(part.areaM2 * v.perCell / (v.spacingM * v.spacingM)) {
			p, n := part.at(rng.Float64(), rng.Float64())
			if r3.Norm(p) < v.withinM && s.rock(r3.Add(p, r3.Scale(skin, n))) != s.rock(r3.Sub(p, r3.Scale(skin, n))) {
				points = append(points, noisy(p))
			}
		}
	}
	for i, c := range s.loose {
		r := s.radii[i]
		for range int(6 * r * r * r / (v.spacingM * v.spacingM * v.spacingM)) {
			d := r3.Vec{X: 2*rng.Float64() - 1, Y: 2*rng.Float64() - 1, Z: 2*rng.Float64() - 1}
			if r3.Norm(d) < 1 {
				points = append(points, noisy(r3.Add(c, r3.Scale(r, d))))
			}
		}
	}
	return points
}

func (v survey) voxels(t testing.TB, s scene) *terrain.Voxels {
	t.Helper()
	l, err := terrain.NewLattice(v.spacingM)
	if err != nil {
		t.Fatal(err)
	}
	x, err := terrain.SumPoints(l, v.points(s))
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// examine finds the obstacles of the scene at default options. The scanner
// stands far off in the given direction from the scene's origin.
func (v survey) examine(t testing.TB, s scene, towards r3.Vec) (*Surface, []Obstacle) {
	t.Helper()
	ctx := context.Background()
	o, notes := ObstacleOptions{ClearanceM: 0.25}.Resolve(v.spacingM)
	if len(notes) > 0 {
		t.Fatal(notes)
	}
	var sensors []r3.Vec
	if towards != (r3.Vec{}) {
		sensors = []r3.Vec{v.place(r3.Scale(60, r3.Unit(towards)))}
	}
	surface, err := NewSurface(ctx, v.voxels(t, s), sensors, o, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	if err := surface.MeasureRelief(ctx); err != nil {
		t.Fatal(err)
	}
	found, err := FindObstacles(ctx, surface)
	if err != nil {
		t.Fatal(err)
	}
	checkEnclosed(t, surface, found)
	return surface, found
}

// checkEnclosed checks what every obstacle promises of its ellipsoids.
func checkEnclosed(t testing.TB, s *Surface, found []Obstacle) {
	t.Helper()
	for i := range found {
		o := &found[i]
		if !(o.VolumeGap >= 0 && o.VolumeGap <= 1e-6) {
			t.Errorf("%s: volume gap %g", o.ID, o.VolumeGap)
		}
		grown := s.options.ClearanceM
		for _, n := range o.Voxels {
			c := s.Voxels.Cells[n]
			for corner := range int32(8) {
				p := s.Voxels.Lattice.Corner(terrain.Cell{I: c.I + corner&1, J: c.J + corner>>1&1, K: c.K + corner>>2})
				// No tolerance: the inequality as a user would write it.
				if !o.Ellipsoid.Contains(p) {
					t.Fatalf("%s: corner %v of voxel %d at depth %.17g", o.ID, p, n, o.Ellipsoid.Depth(p))
				}
				out := r3.Sub(p, o.Ellipsoid.Centre)
				if !o.Inflated.Contains(p) || !o.Inflated.Contains(r3.Add(p, r3.Scale(grown*(1-1e-12), r3.Unit(out)))) {
					t.Fatalf("%s: corner %v of voxel %d outside of the inflated ellipsoid", o.ID, p, n)
				}
			}
		}
		if o.Kind != Bulge && o.Kind != OverhangingBulge {
			continue
		}
		// Coordinates of 6e6 m are rounded to 1e-9 m.
		if d := o.Face.Signed(o.Ellipsoid.Centre); math.Abs(d) > 5e-9 {
			t.Errorf("%s: centre %g m off the base plane", o.ID, d)
		}
		var best float64
		for _, a := range o.Ellipsoid.Axes {
			best = max(best, math.Abs(r3.Dot(a, o.Face.Normal)))
		}
		if best < 1-1e-12 {
			t.Errorf("%s: no axis along the normal, cosine %.15f", o.ID, best)
		}
	}
}

// A finding is what a test expects: an obstacle of the kind at the place.
type finding struct {
	kind Kind
	at   r3.Vec // in the scene, within reach of a voxel of the obstacle
}

// anyBulge is a bulge, whether or not it overhangs.
const anyBulge Kind = "bulge of either kind"

// expect checks that found is what is wanted and nothing else.
func (v survey) expect(t *testing.T, s *Surface, found []Obstacle, want ...finding) {
	t.Helper()
	const reach = 0.25
	taken := make([]bool, len(found))
next:
	for _, w := range want {
		p := v.place(w.at)
		for i := range found {
			if taken[i] || found[i].Kind != w.kind && (w.kind != anyBulge || found[i].Kind != Bulge && found[i].Kind != OverhangingBulge) {
				continue
			}
			for _, n := range found[i].Voxels {
				if r3.Norm(r3.Sub(s.Index.Mean(int(n)), p)) < reach {
					taken[i] = true
					continue next
				}
			}
		}
		t.Errorf("no %s at %v", w.kind, w.at)
	}
	for i := range found {
		if !taken[i] {
			o := &found[i]
			back := r3.Sub(o.Top, v.origin)
			back = survey{azimuthDeg: -v.azimuthDeg}.turn(back)
			t.Errorf("%s at %.2f that is none: height %.2f m, %.2f m², inclination %.0f°, variation %.2f",
				o.Kind, back, o.HeightM, o.AreaM2, o.InclinationDeg, o.SurfaceVariation)
		}
	}
}
