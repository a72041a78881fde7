package export

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// A plateCarree has one degree for each metre, with east 0 at the antimeridian.
type plateCarree struct{ lat float64 }

func (p plateCarree) ToWGS84(x, y, _ []float64) error {
	for i := range x {
		y[i] += p.lat
		if x[i] += 180; x[i] > 180 {
			x[i] -= 360
		}
	}
	return nil
}

// Cutting at the antimeridian keeps area and validity, whatever the shape.
func TestAntimeridian(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	repairs := 0
	for round := range 200 {
		share, size := 0.3+0.7*rng.Float64(), 2+rng.Int32N(14)
		cells := []terrain.Cell{{}}
		for j := range size {
			for i := range size {
				if rng.Float64() < share {
					cells = append(cells, terrain.Cell{I: i - size/2, J: j})
				}
			}
		}
		v := voxelsAt(t, 0.5, cells)
		s := (&outliner{voxels: v}).outline(all(v), true)
		// An odd eighth of a cell puts the cut within cells, zero along edges.
		shift := float64(round%2) / 16
		for _, polygon := range s {
			for _, r := range polygon {
				for i := range r {
					r[i].E += shift
				}
			}
		}
		g, err := toGlobe(s, plateCarree{lat: 10})
		if err != nil {
			t.Fatal(err)
		}
		if got, want := planar.Area(g.polygons), planar.Area(s.planar()); math.Abs(got-want) > 1e-6 {
			t.Errorf("round %d: area %v, want %v", round, got, want)
		}
		if ok, _, err := g.check(gdal.ValidWKB); err != nil {
			t.Fatal(err)
		} else if !ok {
			repairs++
			r, same, err := g.repaired()
			if err != nil || !same {
				t.Errorf("round %d: repair kept the area: %v, %v", round, same, err)
			}
			g = r
		}
		if ok, reason, err := g.check(gdal.ValidWKB); !ok || err != nil {
			t.Errorf("round %d: %s, %v", round, reason, err)
		}
		for i, p := range g.polygons {
			for j, r := range p {
				if b := r.Bound(); b.Max[0]-b.Min[0] > 10 {
					t.Errorf("round %d: ring from %v to %v", round, b.Min, b.Max)
				}
				if len(r) != len(g.heights[i][j]) {
					t.Errorf("round %d: %d heights for %d positions", round, len(g.heights[i][j]), len(r))
				}
			}
		}
	}
	if repairs == 0 {
		t.Error("no outline needed repair: the test is too tame")
	}
}

func TestBox(t *testing.T) {
	of := func(w, e float64) box {
		b := emptyBox()
		b.add(w, 1, 2)
		b.add(e, 3, 4)
		return b
	}
	tests := []struct {
		name  string
		boxes []box
		want  [6]float64
	}{
		{"plain", []box{of(10, 11), of(9, 9.5)}, [6]float64{9, 1, 2, 11, 3, 4}},
		// RFC 7946, section 5.2: the Fiji archipelago, 177 E to 178 W.
		{"Fiji", []box{of(177, 179), of(-179, -178)}, [6]float64{177, 1, 2, -178, 3, 4}},
		{"one that crosses", []box{of(179, 181)}, [6]float64{179, 1, 2, -179, 3, 4}},
		{"up to the antimeridian", []box{of(179, 180)}, [6]float64{179, 1, 2, 180, 3, 4}},
		{"from the antimeridian", []box{of(-180, -179)}, [6]float64{-180, 1, 2, -179, 3, 4}},
		{"full circle", []box{of(-180, 180), of(5, 6)}, [6]float64{-180, 1, 2, 180, 3, 4}},
	}
	for _, tt := range tests {
		b := emptyBox()
		for _, o := range tt.boxes {
			b.union(o)
		}
		b.union(emptyBox())
		if got := b.wrapped(); got != tt.want {
			t.Errorf("%s: %v, want %v", tt.name, got, tt.want)
		}
	}
}

func TestRoundPole(t *testing.T) {
	for _, tt := range []struct {
		name     string
		lon, lat []float64
	}{
		{"north, eastward", []float64{-45, 45, 135, -135, -45}, []float64{80, 80, 80, 80, 80}},
		{"north, westward", []float64{-45, -135, 135, 45, -45}, []float64{80, 80, 80, 80, 80}},
		{"south, on the antimeridian", []float64{180, -90, 0, 90, 180}, []float64{-80, -80, -80, -80, -80}},
	} {
		r, h := unwrap(tt.lon, tt.lat, []float64{1, 2, 3, 4, 1})
		if len(r) != len(h) {
			t.Errorf("%s: %d heights for %d positions", tt.name, len(h), len(r))
		}
		if got := planar.Area(orb.Polygon{r}); math.Abs(math.Abs(got)-3600) > 1e-9 {
			t.Errorf("%s: area %v, want 360° × 10°: %v", tt.name, got, r)
		}
	}
}
