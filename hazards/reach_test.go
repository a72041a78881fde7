package hazards

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// The roof under a collar around a pillar: it reaches from 1.0 to 1.4 m from
// the axis all the way round, which is 0.4 m and not the collar's diameter.
func TestReachAroundPillar(t *testing.T) {
	l, err := terrain.NewLattice(0.05)
	if err != nil {
		t.Fatal(err)
	}
	var points []r3.Vec
	for a := 0.0; a < 2*math.Pi; a += 0.01 {
		for r := 1.0; r <= 1.4; r += 0.02 {
			points = append(points, r3.Vec{X: 5 + r*math.Cos(a), Y: 5 + r*math.Sin(a), Z: 3})
		}
	}
	v, err := terrain.SumPoints(l, points)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name   string
		normal func(p r3.Vec) r3.Vec // of the face
		least  float64
		most   float64
	}{
		// A slice three spacings wide and 15° off the azimuth adds 4 cm.
		{"pillar", func(p r3.Vec) r3.Vec { return r3.Unit(r3.Vec{X: p.X - 5, Y: p.Y - 5}) }, 0.36, 0.46},
		{"wall to the north", func(r3.Vec) r3.Vec { return r3.Vec{Y: 1} }, 2.7, 2.9},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := &Surface{Voxels: v, Index: terrain.NewIndex(v), Relief: &fit.Relief{Normal: make([]r3.Vec, v.Len())}}
			var set []int32
			for i := range v.Cells {
				s.Relief.Normal[i] = c.normal(v.Mean(i))
				set = append(set, int32(i))
			}
			if got := s.reach(set); got < c.least || got > c.most {
				t.Errorf("reach %.3f m, want %g to %g", got, c.least, c.most)
			}
		})
	}
}
