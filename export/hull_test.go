package export

import (
	"math/rand/v2"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"

	"ledgework/terrain"
)

// A hull turns left everywhere and has every corner of its shape inside or on
// it.
func TestHull(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 50 {
		cells := make([]terrain.Cell, 1+rng.IntN(40))
		for i := range cells {
			cells[i] = terrain.Cell{I: rng.Int32N(20), J: rng.Int32N(20) - 10}
		}
		v := voxelsAt(t, 0.5, cells)
		s := (&outliner{voxels: v}).outline(all(v), false)
		h := hull(s)
		r := h[0][0]
		if r[0] != r[len(r)-1] || len(r) < 4 {
			t.Fatalf("hull of %d positions is not closed", len(r))
		}
		for i := range len(r) - 1 {
			for _, polygon := range s {
				for _, p := range polygon[0] {
					if cross(r[i], r[i+1], p) < 0 {
						t.Fatalf("corner %v lies outside the hull", p)
					}
				}
			}
		}
		if ring := h.planar()[0][0]; ring.Orientation() != orb.CCW || planar.Area(h.planar()) < planar.Area(s.planar()) {
			t.Errorf("orientation %v, area %v of %v", ring.Orientation(), planar.Area(h.planar()), planar.Area(s.planar()))
		}
	}
}
