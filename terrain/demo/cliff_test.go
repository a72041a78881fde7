package demo

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func TestFaceFramesLieOnTheFace(t *testing.T) {
	k := newCliff()
	for _, s := range []float64{0, 23.9, 24, 24.1, 27, 41} {
		for _, z := range []float64{0, 3, 7} { // below the undulation
			f := k.onMain(s, z)
			if d := k.face(f.o); math.Abs(d) > 1e-9 {
				t.Errorf("s %g, z %g: %g m off the face", s, z, d)
			}
			if got := r3.Norm(r3.Sub(k.normal(f.o, onFace), f.n)); got > 1e-9 {
				t.Errorf("s %g, z %g: normal differs by %g", s, z, got)
			}
			if got := inclinationDeg(f.n); math.Abs(got-70) > 1e-9 {
				t.Errorf("s %g, z %g: inclination %g", s, z, got)
			}
			if r3.Norm(r3.Sub(r3.Cross(f.a, f.b), f.n)) > 1e-9 && r3.Norm(r3.Add(r3.Cross(f.a, f.b), f.n)) > 1e-9 {
				t.Errorf("s %g, z %g: frame is not orthonormal", s, z)
			}
		}
	}
}

func TestUndulationIsGentle(t *testing.T) {
	most, slope := 0.0, 0.0
	const h = 1e-3
	for s := 0.0; s < 20; s += 0.1 {
		for z := 0.0; z < 25; z += 0.1 {
			most = max(most, math.Abs(undulation(s, z)))
			slope = max(slope, math.Hypot(undulation(s+h, z)-undulation(s, z), undulation(s, z+h)-undulation(s, z))/h)
		}
	}
	if most < 0.08 || most > 0.1 {
		t.Errorf("amplitude %g", most)
	}
	// What stepShare is derived from: at most 0.11 where arc length grows by
	// up to 1.22 m per metre behind the foot.
	if slope*bendR/(bendR-9.5) > 0.11 {
		t.Errorf("slope %g", slope)
	}
}

func TestCornersOfTheCliff(t *testing.T) {
	k := newCliff()
	b := builder{cliff: k}
	for _, z := range []float64{0, 8, 16} {
		f := k.onMain(b.cornerArc(z), z)
		if d := k.side.distance(f.o); math.Abs(d) > 1e-9 {
			t.Errorf("corner at height %g is %g m off the side face", z, d)
		}
		between := 180 - math.Acos(r3.Dot(f.n, k.side.normal))*180/math.Pi
		if between < 100 || between > 120 {
			t.Errorf("faces meet at %g°", between)
		}
		if r := bendR - z*k.cos/k.sin; r < 40 {
			t.Errorf("plan radius %g m at height %g", r, z)
		}
	}
}
