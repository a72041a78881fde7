package hazards

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

// halfM is how far the sheets of a scene reach.
const halfM = 8

// corner is where two faces meet at the given angle, measured in the rock if
// the corner is convex, else in the air, along an edge through the origin that
// leans back by 15° from the vertical. On either face, u leads away from the
// edge and w up along it.
func corner(angleDeg float64, isConvex bool) (s scene, left, right attitude) {
	sin, cos := math.Sincos(15 * math.Pi / 180)
	out, up := r3.Vec{Y: -cos, Z: sin}, r3.Vec{Y: sin, Z: cos}
	sp, cp := math.Sincos((180 - angleDeg) / 2 * math.Pi / 180)
	one := attitude{u: r3.Vec{X: cp}, w: up, n: r3.Add(r3.Scale(cp, out), r3.Vec{X: sp})}
	two := attitude{u: r3.Vec{X: -cp}, w: up, n: r3.Add(r3.Scale(cp, out), r3.Vec{X: -sp})}
	if isConvex {
		one.u, two.u = r3.Add(one.u, r3.Scale(-sp, out)), r3.Add(two.u, r3.Scale(-sp, out))
		return convex(r3.Vec{}, halfM, one, two), two, one
	}
	one.u, two.u = r3.Sub(r3.Scale(-1, one.u), r3.Scale(-sp, out)), r3.Sub(r3.Scale(-1, two.u), r3.Scale(-sp, out))
	s = convex(r3.Vec{}, halfM, one, two)
	s.rock = anyOf(one.behind(), two.behind())
	return s, one, two
}

// south is the normal of a face of the given inclination that faces south.
func south(inclinationDeg float64) r3.Vec { return leaning(inclinationDeg, 180) }

// wall is a plane face.
func wall(inclinationDeg float64) (scene, attitude) {
	a := facing(r3.Vec{}, south(inclinationDeg))
	return convex(r3.Vec{}, halfM, a), a
}

// A shape is a scene that is no obstacle, with places for one on it.
type shape struct {
	name   string
	scene  scene
	view   r3.Vec     // towards the scanner
	places []attitude // on its faces and edges, 3 m apart at least
}

// shapes are what the surveyor calls a plain slope. The places lie on faces,
// close to edges and astride them.
func shapes() []shape {
	front := south(70)
	var out []shape
	for _, deg := range []float64{90, 110, 140} {
		s, left, right := corner(deg, true)
		out = append(out, shape{fmt.Sprintf("convex corner of %g°", deg), s, front,
			[]attitude{left.moved(1.2, 3, 0), astride(left, right).moved(0, -2, 0)}})
	}
	for _, deg := range []float64{100, 140} {
		s, left, right := corner(deg, false)
		out = append(out, shape{fmt.Sprintf("concave corner of %g°", deg), s, front,
			[]attitude{left.moved(1.2, 3, 0), astride(left, right).moved(0, -2, 0.3)}})
	}

	face := facing(r3.Vec{}, south(70))
	slope := facing(r3.Vec{}, south(25))
	out = append(out, shape{"crest", convex(r3.Vec{}, halfM, face, slope), r3.Vec{Y: -1, Z: 1},
		[]attitude{slope.moved(2, 0.9, 0), face.moved(-3, -1.0, 0)}})

	ground := facing(r3.Vec{}, r3.Vec{Z: 1})
	foot := convex(r3.Vec{}, halfM, face, ground)
	foot.rock = anyOf(face.behind(), ground.behind())
	out = append(out, shape{"foot", foot, r3.Vec{Y: -1, Z: 1},
		[]attitude{ground.moved(2, -1.0, 0), face.moved(-3, 1.2, 0)}})

	west, top := facing(r3.Vec{}, leaning(75, 260)), facing(r3.Vec{}, leaning(10, 200))
	prow := facing(r3.Vec{}, south(75))
	out = append(out, shape{"trihedral corner", convex(r3.Vec{}, halfM, prow, west, top), r3.Vec{X: -0.7, Y: -1, Z: 1},
		[]attitude{top.moved(2, 2, 0), prow.moved(2, -3, 0)}})
	nook := convex(r3.Vec{}, halfM, prow, facing(r3.Vec{}, leaning(80, 90)), ground)
	nook.rock = anyOf(prow.behind(), facing(r3.Vec{}, leaning(80, 90)).behind(), ground.behind())
	out = append(out, shape{"trihedral nook", nook, r3.Vec{X: 0.7, Y: -1, Z: 1},
		[]attitude{ground.moved(2, -2, 0), prow.moved(3, 3, 0)}})

	lean := facing(r3.Vec{}, south(70))
	add := func(name string, h func(u, w float64) float64) {
		var s scene
		var part sheetPart
		s.rock, part = lean.relief(halfM, h)
		s.parts = []sheetPart{part}
		out = append(out, shape{name, s, front, []attitude{lean.moved(-2, 2, h(-2, 2)), lean.moved(3, -3, h(3, -3))}})
	}
	// Sheer walls, one of them within the tolerance of overhangs.
	for _, deg := range []float64{90, 93} {
		s, a := wall(deg)
		out = append(out, shape{fmt.Sprintf("wall of %g°", deg), s, front, []attitude{a.moved(-2, 2, 0), a.moved(3, -3, 0)}})
	}
	const amplitude, wave = 0.1, 2 * math.Pi / 12
	add("undulation along", func(u, w float64) float64 { return amplitude * math.Sin(wave*u) })
	add("undulation both ways", func(u, w float64) float64 { return amplitude * math.Cos(wave*u) * math.Cos(wave*w) })
	const radius = 40.0
	add("wall curved outward", func(u, w float64) float64 { return math.Sqrt(radius*radius-u*u) - radius })
	add("wall curved inward", func(u, w float64) float64 { return radius - math.Sqrt(radius*radius-u*u) })
	return out
}

// astride is the attitude at the edge of two faces that looks out between them.
func astride(a, b attitude) attitude {
	n := r3.Unit(r3.Add(a.n, b.n))
	return attitude{a.o, r3.Cross(a.w, n), a.w, n}
}

// Corners, crests, feet and gentle curvature are no obstacles.
func TestPlainSlopesCarryNothing(t *testing.T) {
	for i, sh := range shapes() {
		for _, azimuth := range []float64{0, []float64{37, 231}[i%2]} {
			t.Run(fmt.Sprintf("%s at %g°", sh.name, azimuth), func(t *testing.T) {
				t.Parallel()
				v := standard(azimuth)
				s, found := v.examine(t, sh.scene, sh.view)
				v.expect(t, s, found)
			})
		}
	}
}

// blockKind is what a block with sides square to a face is, 0.5 m high: its
// lower side overhangs by the face's inclination, 0.5 m times the sine far.
func blockKind(a attitude) Kind {
	switch reach := 0.5 * math.Hypot(a.n.X, a.n.Y); {
	case reach > 0.25:
		return OverhangingBulge
	case reach < 0.15:
		return Bulge
	}
	return anyBulge // too close to the threshold to tell
}

// A small block on any of them is found, and nothing else.
func TestBlocksOnPlainSlopes(t *testing.T) {
	for i, sh := range shapes() {
		azimuth := []float64{0, 37, 231}[i%3]
		t.Run(fmt.Sprintf("%s at %g°", sh.name, azimuth), func(t *testing.T) {
			t.Parallel()
			v := standard(azimuth)
			carrying := sh.scene
			var want []finding
			for _, a := range sh.places {
				carrying = carrying.with(block(a, 0.5, 0.5, -0.4, 0.5))
				want = append(want, finding{blockKind(a), a.at(0, 0, 0.5)})
			}
			s, found := v.examine(t, carrying, sh.view)
			v.expect(t, s, found, want...)
		})
	}
}

// wedge is a prism across the face at a, 2·u wide, whose profile along the face
// and out of it is the convex polygon given, counterclockwise.
func wedge(a attitude, u float64, profile ...[2]float64) scene {
	planes := []attitude{facing(a.at(u, 0, 0), a.u), facing(a.at(-u, 0, 0), r3.Scale(-1, a.u))}
	var w, n, size float64
	for i, p := range profile {
		q := profile[(i+1)%len(profile)]
		w += p[0] / float64(len(profile))
		n += p[1] / float64(len(profile))
		size += math.Hypot(q[0]-p[0], q[1]-p[1])
		// The left of the way round is inside.
		planes = append(planes, facing(a.at(0, p[0], p[1]), r3.Add(r3.Scale(q[1]-p[1], a.w), r3.Scale(p[0]-q[0], a.n))))
	}
	return convex(a.at(0, w, n), u+size, planes...)
}

// What obstacles there are by their kinds, on a wall of 75° unless said
// otherwise.
func TestKinds(t *testing.T) {
	wall75, a := wall(75)
	flat0, level := wall(0)
	// A profile whose underside is less than vertical: it descends 2.2 m to
	// the face while it recedes 0.5 m, and the wall leans by 15°, 0.57 m on that
	// length.
	prow := wedge(a, 0.5, [2]float64{-2.6, -0.1}, [2]float64{0.6, -0.1}, [2]float64{0.4, 0.5}, [2]float64{-0.2, 0.5})
	// Its underside leaves the face at 45°.
	anvil := wedge(a, 0.5, [2]float64{-0.4, -0.1}, [2]float64{0.9, -0.1}, [2]float64{0.9, 0.6}, [2]float64{-1.0, 0.6})
	// Too shallow for a recess. Its floor is no obstacle, its roof is one.
	notch := block(a, 1, 0.4, -0.3, 0.5)
	rib := func(u float64) scene { return block(a, u, 20, -0.4, 0.5) }
	// Set back by 1.2 m, up to the crest, 8 m long.
	tread := attitude{o: a.at(0, -2, 0), u: a.u, w: r3.Unit(r3.Vec{X: -a.n.X, Y: -a.n.Y}), n: r3.Vec{Z: 1}}
	riser := facing(tread.at(0, 1.2, 0), r3.Scale(-1, a.n))
	bay := convex(tread.at(0, 0, 0), 14, facing(tread.o, r3.Vec{Z: -1}), riser,
		facing(tread.at(4, 0, 0), a.u), facing(tread.at(-4, 0, 0), r3.Scale(-1, a.u)))

	for _, c := range []struct {
		name  string
		scene scene
		want  []finding
	}{
		{"niche", wall75.cut(block(a, 0.5, 0.5, -0.6, 0.5)), []finding{
			{Recess, a.at(0, 0, -0.6)}, {Overhang, a.at(0, 0.5, -0.35)}}}, // and its roof
		{"pit in level ground", flat0.cut(block(level, 0.5, 0.5, -0.6, 0.5)), []finding{{Recess, level.at(0, 0, -0.6)}}},
		{"hollow not deep enough", flat0.cut(block(level, 0.5, 0.5, -0.33, 0.5)), nil},
		{"block on level ground", flat0.with(block(level, 0.5, 0.5, -0.4, 0.5)), []finding{{Bulge, level.at(0, 0, 0.5)}}},
		{"block not high enough", flat0.with(block(level, 0.5, 0.5, -0.4, 0.25)), nil},
		{"block not large enough", flat0.with(block(level, 0.1, 0.1, -0.4, 0.35)), nil},
		{"block with lower side that hangs over nothing", wall75.with(prow), []finding{{Bulge, a.at(0, 0.1, 0.5)}}},
		{"block with undercut underside", wall75.with(anvil), []finding{{OverhangingBulge, a.at(0, 0.3, 0.6)}}},
		{"notch", wall75.cut(notch), []finding{{Overhang, a.at(0, 0.4, -0.15)}}},
		{"ledge", wall75.cut(bay), nil},
		// A rib is a bulge as long as it is narrow; wide ribs are the
		// slope's shape. The border is majorShare of the disc of radius R, 8.6 m².
		{"narrow rib", wall75.with(rib(0.3)), []finding{{Bulge, a.at(0, 0, 0.5)}}},
		{"wide rib", wall75.with(rib(1.5)), nil},
	} {
		for _, azimuth := range []float64{0, 127} {
			t.Run(fmt.Sprintf("%s at %g°", c.name, azimuth), func(t *testing.T) {
				t.Parallel()
				v := standard(azimuth)
				s, found := v.examine(t, c.scene, r3.Vec{Y: -1, Z: 0.4})
				v.expect(t, s, found, c.want...)
				for _, o := range found {
					if o.Scattered {
						t.Errorf("%s is scattered, variation %g", o.Kind, o.SurfaceVariation)
					}
				}
			})
		}
	}
}

// A shrub is found, for it may be anything, but flagged.
func TestShrubIsScattered(t *testing.T) {
	for _, deg := range []float64{0, 40, 75} {
		for _, azimuth := range []float64{0, 63} {
			s, a := wall(deg)
			s.loose, s.radii = []r3.Vec{a.at(1, 1, 0.45)}, []float64{0.5}
			v := standard(azimuth)
			surface, found := v.examine(t, s, r3.Vec{Y: -1, Z: 1})
			v.expect(t, surface, found, finding{anyBulge, a.at(1, 1, 0.8)})
			for _, o := range found {
				if !o.Scattered || o.SurfaceVariation < scatteredFrom {
					t.Errorf("wall of %g°: variation %g, scattered %t", deg, o.SurfaceVariation, o.Scattered)
				}
			}
		}
	}
}

// Height, depth, area and volume of blocks and niches: the oracle is the
// recipe. Voxels on the rim count whole, which adds half a spacing on every
// side on average: 6 % of the volume here. The height is that of the highest
// voxel, which may hold one point alone: it errs upward by up to 4σ of a point.
func TestObstacleMeasures(t *testing.T) {
	for i, deg := range []float64{0, 20, 50, 70, 90} {
		for _, height := range [2][]float64{{0.45, -0.8}, {0.7, -0.6}}[i%2] {
			t.Run(fmt.Sprintf("%g m on %g°", height, deg), func(t *testing.T) {
				t.Parallel()
				azimuth := 7 * deg
				v := standard(azimuth)
				v.noiseM, v.withinM, v.spacingM = 0.002, 4, 0.05
				s, a := wall(deg)
				a = a.moved(0.3, -0.2, 0)
				const u, w = 0.9, 0.7
				kind := anyBulge
				if height > 0 {
					s = s.with(block(a, u, w, -0.3, height))
				} else {
					kind = Recess
					s = s.cut(block(a, u, w, height, 0.5))
				}
				_, found := v.examine(t, s, r3.Vec{Y: -1, Z: 1})
				seen := 0
				for _, o := range found {
					if o.Kind == Overhang { // a niche's roof
						continue
					}
					seen++
					if o.Kind != kind && (kind != anyBulge || o.Kind == Recess) {
						t.Errorf("kind %s", o.Kind)
					}
					volume := 4 * u * w * math.Abs(height)
					near(t, "height", o.HeightM, math.Abs(height), 0.01)
					near(t, "volume", o.RockVolumeM3, volume, 0.1*volume)
					// Of the sides, what lies beyond half of the threshold.
					sides := 4 * (u + w) * (math.Abs(height) - 0.15)
					near(t, "area", o.AreaM2, 4*u*w+sides, 0.2*(4*u*w+sides))
					near(t, "face's inclination", angle(o.Face.Normal, v.turn(a.n)), 0, 0.3)
					near(t, "distance of the face", o.Face.Signed(v.place(a.o)), 0, 0.01)
					if o.RockShare <= 0 || o.RockShare > 1 {
						t.Errorf("rock share %g", o.RockShare)
					}
				}
				if seen != 1 {
					t.Errorf("%d obstacles", seen)
				}
			})
		}
	}
}

// A level roof too small for a reference face and one layer of voxels thick: it
// faces no azimuth, and its ellipsoid is that of a box, whose semi-axes are √3
// times the half edges. Wherever the lattice puts it, the result is the same.
func TestLevelRoof(t *testing.T) {
	const g = 0.05
	for _, at := range []r3.Vec{{}, {X: 412000, Y: 6543000, Z: 30}, {X: 412345.6, Y: 6543000, Z: 31.15}, {X: 412000, Z: 139.65}, {Z: 7.1}} {
		var points []r3.Vec
		for i := range 40 {
			for j := range 20 {
				for n := range 4 {
					points = append(points, r3.Vec{
						X: at.X + g*(float64(i)+0.3+0.1*float64(n)), Y: at.Y + g*(float64(j)+0.2+0.2*float64(n)), Z: at.Z + g*(0.3+0.1*float64(n%2)),
					})
				}
			}
		}
		o, _ := ObstacleOptions{}.Resolve(g)
		ctx := context.Background()
		s, err := NewSurface(ctx, voxelise(t, g, points), []r3.Vec{r3.Add(at, r3.Vec{X: 1, Y: 0.5, Z: -10})}, o, fit.Work{Workers: 1})
		if err != nil {
			t.Fatal(err)
		}
		if err := s.MeasureRelief(ctx); err != nil {
			t.Fatal(err)
		}
		found, err := FindObstacles(ctx, s)
		if err != nil {
			t.Fatal(err)
		}
		if len(found) != 1 || found[0].Kind != Overhang {
			t.Fatalf("at %v: %d obstacles, want one overhang", at, len(found))
		}
		checkEnclosed(t, s, found)
		near(t, "reach", found[0].HeightM, 19*g, 1e-3)
		near(t, "inclination", found[0].InclinationDeg, 180, 1)
		for i, edge := range [3]float64{40 * g, 20 * g, g} {
			near(t, "semi-axis", found[0].Ellipsoid.SemiAxes[i], math.Sqrt(3)/2*edge, 1e-6*edge)
		}
	}
}

// The share of an ellipsoid beyond a plane against counting: points of a fine
// grid through it.
func TestOutwardShare(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 20 {
		e := fit.Ellipsoid{Centre: r3.Vec{X: 1, Y: 2, Z: 3}, SemiAxes: [3]float64{3, 2, 1}, Axes: [3]r3.Vec{{Y: 1}, {Z: 1}, {X: 1}}}
		face := fit.Plane{Normal: randomDirection(rng), Centroid: r3.Add(e.Centre, r3.Scale(1.5*rng.NormFloat64(), randomDirection(rng)))}
		const steps = 60
		inside, beyond := 0, 0
		for n := range steps * steps * steps {
			at := func(k int) float64 { return 3 * (2*(float64(k%steps)+0.5)/steps - 1) }
			p := r3.Add(e.Centre, r3.Vec{X: at(n), Y: at(n / steps), Z: at(n / steps / steps)})
			if e.Contains(p) {
				inside++
				if face.Signed(p) > 0 {
					beyond++
				}
			}
		}
		near(t, "share", outwardShare(&e, &face), float64(beyond)/float64(inside), 0.01)
	}
}

// angle is that between two unit vectors in degrees.
func angle(a, b r3.Vec) float64 {
	return math.Atan2(r3.Norm(r3.Cross(a, b)), r3.Dot(a, b)) * 180 / math.Pi
}

// The same obstacles, to the last bit, for any number of workers.
func TestObstaclesIndependentOfWorkers(t *testing.T) {
	s, a := wall(70)
	s = s.with(block(a.moved(2, 1, 0), 0.5, 0.5, -0.3, 0.5)).cut(block(a.moved(-2, -1, 0), 0.5, 0.5, -0.6, 0.5)).
		cut(block(a.moved(-1, 3, 0), 1, 0.4, -0.3, 0.5))
	s.loose, s.radii = []r3.Vec{a.at(2, -3, 0.45)}, []float64{0.5}
	v := standard(37)
	x := v.voxels(t, s)
	ctx := context.Background()
	o, _ := ObstacleOptions{}.Resolve(v.spacingM)
	var want []Obstacle
	for workers := 1; workers <= 3; workers++ {
		surface, err := NewSurface(ctx, x, nil, o, fit.Work{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if err := surface.MeasureRelief(ctx); err != nil {
			t.Fatal(err)
		}
		got, err := FindObstacles(ctx, surface)
		if err != nil {
			t.Fatal(err)
		}
		if workers == 1 {
			want = got
			if len(want) < 4 {
				t.Fatalf("only %d obstacles", len(want))
			}
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("%d workers: obstacles differ", workers)
		}
		if !slices.IsSortedFunc(got, func(a, b Obstacle) int { return strings.Compare(a.ID, b.ID) }) {
			t.Error("not sorted by id")
		}
	}
}

func TestFindObstaclesStops(t *testing.T) {
	s, a := wall(70)
	v := standard(0)
	surface, _ := v.examine(t, s.with(block(a, 0.5, 0.5, -0.3, 0.5)), a.n)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if found, err := FindObstacles(ctx, surface); !errors.Is(err, context.Canceled) || found != nil {
		t.Errorf("%d obstacles, error %v, want canceled", len(found), err)
	}
}
