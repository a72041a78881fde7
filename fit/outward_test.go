package fit

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// The shapes of these tests are invented, at coordinates of the size of UTM's.

// origin is where the invented shapes stand.
func origin() r3.Vec { return r3.Vec{X: 412000.37, Y: 6543000.81, Z: 80.23} }

// A sheetOf is a parallelogram with a corner at o, relative to origin, whose
// outward normal is u×v.
type sheetOf struct{ o, u, v r3.Vec }

func (s sheetOf) normal() r3.Vec { return r3.Unit(r3.Cross(s.u, s.v)) }

// scan puts points with noise of 5 mm on the sheets, about perM2 on each m².
func scan(rng *rand.Rand, perM2 float64, sheets ...sheetOf) []r3.Vec {
	var points []r3.Vec
	for _, s := range sheets {
		for range int(perM2 * r3.Norm(r3.Cross(s.u, s.v))) {
			p := r3.Add(s.o, r3.Add(r3.Scale(rng.Float64(), s.u), r3.Scale(rng.Float64(), s.v)))
			e := r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}
			points = append(points, r3.Add(r3.Add(p, origin()), r3.Scale(0.005, e)))
		}
	}
	return points
}

// ring is a closed stack: an upright prism of n sides with a square top.
func ring(n int, radius, height float64) []sheetOf {
	var out []sheetOf
	at := func(i int) r3.Vec {
		s, c := math.Sincos(2 * math.Pi * float64(i) / float64(n))
		return r3.Vec{X: radius * c, Y: radius * s}
	}
	for i := range n {
		out = append(out, sheetOf{at(i), r3.Sub(at(i+1), at(i)), r3.Vec{Z: height}})
	}
	side := radius * math.Sqrt2 / 2
	return append(out, sheetOf{r3.Vec{X: -side, Y: -side, Z: height}, r3.Vec{X: 2 * side}, r3.Vec{Y: 2 * side}})
}

// orientAll fits planes at two levels, 0.4 m and 0.1 m, and turns both.
func orientAll(t *testing.T, points []r3.Vec, sensors []r3.Vec, workers int) (*terrain.Index, *LocalPlanes, float64) {
	t.Helper()
	ctx := context.Background()
	v := sumPoints(t, 0.1, points)
	levels, parents, err := v.Pyramid(0.4)
	if err != nil {
		t.Fatal(err)
	}
	top := len(levels) - 1
	coarse := terrain.NewIndex(levels[top])
	coarsePlanes, err := FitLocal(ctx, coarse.Voxels(), coarse, 1.2, Work{Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	guessed, err := OrientCoarse(ctx, coarse, coarsePlanes, sensors)
	if err != nil {
		t.Fatal(err)
	}
	parent := make([]int32, v.Len())
	for i := range parent {
		parent[i] = int32(i)
		for l := range top {
			parent[i] = parents[l][parent[i]]
		}
	}
	x := terrain.NewIndex(v)
	planes, err := FitLocal(ctx, v, x, 0.4, Work{Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	if err := OrientFrom(ctx, x, planes, coarsePlanes, parent, sensors); err != nil {
		t.Fatal(err)
	}
	return x, planes, guessed
}

// checkSides checks the side of every voxel that lies on one sheet alone.
func checkSides(t *testing.T, x *terrain.Index, planes *LocalPlanes, sheets []sheetOf) {
	t.Helper()
	const away = 0.6 // from other sheets: planes reach around edges
	checked := 0
	distance := func(s sheetOf, p r3.Vec) float64 {
		d := r3.Sub(p, s.o)
		u, v := r3.Unit(s.u), r3.Unit(s.v)
		a, b := r3.Dot(d, u), r3.Dot(d, v)
		outside := max(0, -a, a-r3.Norm(s.u), -b, b-r3.Norm(s.v))
		return math.Hypot(outside, r3.Dot(d, s.normal()))
	}
	for i := range planes.Normal {
		if !planes.Fitted(i) {
			continue
		}
		p := r3.Sub(x.Mean(i), origin())
		on, near := -1, 0
		for n, s := range sheets {
			if d := distance(s, p); d < away {
				near++
				on = n
			}
		}
		if near != 1 {
			continue
		}
		checked++
		if r3.Dot(planes.Normal[i], sheets[on].normal()) < 0.8 {
			t.Fatalf("at %.2f: normal %.2f, want %.2f", p, planes.Normal[i], sheets[on].normal())
		}
	}
	if checked < 500 {
		t.Errorf("only %d voxels checked", checked)
	}
}

func TestOrient(t *testing.T) {
	e, n, up := r3.Vec{X: 8}, r3.Vec{Y: 8}, r3.Vec{Z: 8}
	ground := sheetOf{r3.Vec{}, e, n}
	// A gorge: two walls that face each other, and its floor.
	west := sheetOf{r3.Vec{}, n, r3.Vec{X: -1, Z: 8}}
	east := sheetOf{r3.Vec{X: 8, Y: 8}, r3.Vec{Y: -8}, r3.Vec{X: 1, Z: 8}}
	// A wall over ground with a roof that reaches out of it.
	back := sheetOf{r3.Vec{Y: 8}, e, up}
	roof := sheetOf{r3.Vec{Y: 8, Z: 8}, r3.Vec{X: 8}, r3.Vec{Y: -3, Z: -0.5}}
	for _, c := range []struct {
		name    string
		sheets  []sheetOf
		sensors []r3.Vec // relative to origin
	}{
		{"ground", []sheetOf{ground}, []r3.Vec{{X: 4, Y: 4, Z: 20}}},
		{"gorge", []sheetOf{ground, west, east}, []r3.Vec{{X: 4, Y: 4, Z: 2}}},
		{"wall with a roof", []sheetOf{ground, back, roof}, []r3.Vec{{X: 4, Y: -6, Z: 2}}},
		{"stack", ring(8, 4, 8), []r3.Vec{{X: 15, Z: 12}, {X: -15, Y: 8, Z: 12}, {X: -2, Y: -15, Z: 12}}},
	} {
		for _, scanned := range []bool{false, true} {
			name := c.name
			var sensors []r3.Vec
			if scanned {
				name += " with scanners"
				for _, s := range c.sensors {
					sensors = append(sensors, r3.Add(s, origin()))
				}
			}
			t.Run(name, func(t *testing.T) {
				points := scan(rand.New(rand.NewPCG(1, 1)), 400, c.sheets...)
				x, planes, guessed := orientAll(t, points, sensors, 2)
				checkSides(t, x, planes, c.sheets)
				// Smooth pieces that stand upright as a whole have weak votes, right as
				// they are.
				if (c.name == "ground" || c.name == "gorge") && guessed > 0.05 {
					t.Errorf("%.2f of it is guessed", guessed)
				}
				if c.name == "wall with a roof" {
					i := x.Nearest(r3.Add(origin(), r3.Vec{X: 4, Y: 6.5, Z: 7.75}), 0.3)
					if got := InclinationDeg(planes.Normal[i]); got < 160 {
						t.Errorf("the roof's inclination is %.1f°, want 170°", got)
					}
				}
			})
		}
	}
}

// Sensors win over everything that the shape itself suggests: seen from below,
// a sheet is a roof.
func TestOrientSensorsDecide(t *testing.T) {
	roof := sheetOf{r3.Vec{}, r3.Vec{Y: 8}, r3.Vec{X: 8}}
	points := scan(rand.New(rand.NewPCG(1, 1)), 400, roof)
	x, planes, guessed := orientAll(t, points, []r3.Vec{r3.Add(origin(), r3.Vec{X: 4, Y: 4, Z: -10})}, 2)
	checkSides(t, x, planes, []sheetOf{roof})
	if guessed != 0 {
		t.Errorf("%.2f guessed", guessed)
	}
}

// A lone sheer wall says nothing of its side, and the share says so.
func TestOrientGuesses(t *testing.T) {
	wall := sheetOf{r3.Vec{}, r3.Vec{X: 8}, r3.Vec{Z: 8}}
	points := scan(rand.New(rand.NewPCG(1, 1)), 400, wall)
	if _, _, guessed := orientAll(t, points, nil, 2); guessed != 1 {
		t.Errorf("%.2f of a lone wall is guessed, want all", guessed)
	}
	if _, _, guessed := orientAll(t, points, []r3.Vec{r3.Add(origin(), r3.Vec{X: 4, Y: -20, Z: 4})}, 2); guessed != 0 {
		t.Errorf("%.2f of a scanned wall is guessed, want nothing", guessed)
	}
}

// Scan lines far apart in height on a wall above ground: the thin parts take
// the side of the rest.
func TestOrientSparseLines(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	ground := sheetOf{r3.Vec{}, r3.Vec{X: 8}, r3.Vec{Y: 8}}
	wall := sheetOf{r3.Vec{Y: 8}, r3.Vec{X: 8}, r3.Vec{Y: 2, Z: 8}}
	points := scan(rng, 400, ground, sheetOf{wall.o, wall.u, r3.Scale(0.4, wall.v)})
	for i := range 12 { // 0.27 m apart
		line := scan(rng, 20000, sheetOf{r3.Add(wall.o, r3.Scale(0.41+0.05*float64(i), wall.v)), wall.u, r3.Scale(0.0005, wall.v)})
		points = append(points, line...)
	}
	x, planes, _ := orientAll(t, points, nil, 2)
	for i := range planes.Normal {
		p := r3.Sub(x.Mean(i), origin())
		if p.Z > 0.6 && planes.Fitted(i) && r3.Dot(planes.Normal[i], wall.normal()) < 0 {
			t.Fatalf("at %.2f: normal %.2f", p, planes.Normal[i])
		}
	}
}

func TestOrientIndependentOfWorkersAndOrder(t *testing.T) {
	points := scan(rand.New(rand.NewPCG(1, 1)), 300, ring(8, 4, 6)...)
	_, want, wantGuessed := orientAll(t, points, nil, 1)
	for workers := 2; workers <= 3; workers++ {
		slices.Reverse(points[:len(points)/workers])
		if _, got, guessed := orientAll(t, points, nil, workers); !reflect.DeepEqual(got, want) || guessed != wantGuessed {
			t.Errorf("%d workers: sides differ", workers)
		}
	}
}

func TestOrientStops(t *testing.T) {
	v := sumPoints(t, 0.1, roughWall(20000, 1))
	x := terrain.NewIndex(v)
	planes, err := FitLocal(context.Background(), v, x, 0.4, Work{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := OrientCoarse(ctx, x, planes, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("OrientCoarse: error %v, want canceled", err)
	}
	parent := make([]int32, v.Len())
	if err := OrientFrom(ctx, x, planes, planes, parent, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("OrientFrom: error %v, want canceled", err)
	}
}

// A face that stands alone may be a wall seen from below or the underside of
// something: it counts as a guess until a scanner position tells.
func TestOrientLoneFace(t *testing.T) {
	// Leans out over the viewer by 15°.
	face := sheetOf{r3.Vec{}, r3.Vec{X: 8}, r3.Vec{Y: -2, Z: 7.7}}
	points := scan(rand.New(rand.NewPCG(1, 2)), 400, face)
	if _, _, guessed := orientAll(t, points, nil, 2); guessed < 0.99 {
		t.Errorf("%.2f of a lone face is guessed, want all", guessed)
	}
	below := []r3.Vec{r3.Add(origin(), r3.Vec{X: 4, Y: -10, Z: -2})}
	x, planes, guessed := orientAll(t, points, below, 2)
	if guessed > 0 {
		t.Errorf("%.2f is guessed though a scanner saw it", guessed)
	}
	i := x.Nearest(r3.Add(origin(), r3.Vec{X: 4, Y: -1, Z: 3.85}), 0.3)
	if got := InclinationDeg(planes.Normal[i]); math.Abs(got-104.6) > 1 {
		t.Errorf("inclination %.1f°, want 104.6°", got)
	}
}
