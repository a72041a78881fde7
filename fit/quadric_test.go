package fit

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// patchOf is a neighbourhood of one piece: members on the height field over
// the plane through the origin with normal n, within radius.
func patchOf(rng *rand.Rand, n r3.Vec, radius, noise float64, height func(u, v float64) float64) *neighbourhood {
	h := &neighbourhood{spacing: 0.2}
	u := orthogonal(n)
	v := r3.Cross(n, u)
	for len(h.members) < 2000 {
		a, b := radius*(2*rng.Float64()-1), radius*(2*rng.Float64()-1)
		if math.Hypot(a, b) > radius {
			continue
		}
		z := height(a, b) + noise*rng.NormFloat64()
		p := r3.Add(r3.Scale(a, u), r3.Add(r3.Scale(b, v), r3.Scale(z, n)))
		h.pieces[0] = append(h.pieces[0], int32(len(h.members)))
		h.members = append(h.members, hoodMember{p, n, 0.04, 0})
	}
	return h
}

// A curved face is followed to within a centimetre, of which a plane would be
// off by up to R²/2ρ; a third of the members off the face don't matter.
func TestQuadricFollowsCurvature(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const radius = 5.0
	for _, rho := range []float64{40, 80, -40} {
		for range 5 {
			n := randomUnit(rng)
			height := func(u, v float64) float64 { return -u * u / (2 * rho) }
			h := patchOf(rng, n, radius, 0.01, height)
			for i := range h.members {
				if i%3 == 0 { // outliers within the cutoff's reach
					h.members[i].pos = r3.Add(h.members[i].pos, r3.Scale(0.6, n))
				}
			}
			q := h.fitQuadric(facePlane{n, -radius * radius / (8 * rho)}, 0, 0.24, radius)
			for range 50 {
				a, b := radius*(2*rng.Float64()-1)/1.5, radius*(2*rng.Float64()-1)/1.5
				p := r3.Add(r3.Scale(a, q.u), r3.Add(r3.Scale(b, q.v), r3.Scale(height(a, b)+0.3, n)))
				d, normal := q.at(p)
				near(t, "distance", d, 0.3, 0.01)
				near(t, "length of the normal", r3.Norm(normal), 1, 1e-12)
				want := r3.Unit(r3.Add(n, r3.Scale(a/rho, q.u)))
				if angle := angleBetween(normal, want); angle > 0.01 {
					t.Errorf("normal %g rad off", angle)
				}
			}
		}
	}
}

// A strip too narrow to show curvature across is not bent across.
func TestQuadricOfStrip(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	n := r3.Vec{Z: 1}
	h := &neighbourhood{spacing: 0.2}
	for i := range 500 {
		p := r3.Vec{X: 0.15 * rng.NormFloat64(), Y: 8*rng.Float64() - 4, Z: 0.01 * rng.NormFloat64()}
		h.members = append(h.members, hoodMember{p, n, 0.04, 0})
		h.pieces[0] = append(h.pieces[0], int32(i))
	}
	q := h.fitQuadric(facePlane{n, 0}, 0, 0.12, 5)
	d, _ := q.at(r3.Vec{X: 1.5})
	near(t, "height 1.5 m off the strip", d, 0, 0.15)
}

// Without weight the plane stays.
func TestQuadricOfNothing(t *testing.T) {
	var h neighbourhood
	q := h.fitQuadric(facePlane{r3.Vec{X: 1}, 2}, 0, 0.1, 5)
	d, n := q.at(r3.Vec{X: 3, Y: 5})
	near(t, "distance", d, 1, 1e-12)
	near(t, "normal", r3.Norm(r3.Sub(n, r3.Vec{X: 1})), 0, 1e-12)
}

func TestOrthogonal(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 200 {
		n := randomUnit(rng)
		o := orthogonal(n)
		near(t, "length", r3.Norm(o), 1, 1e-14)
		near(t, "cosine", r3.Dot(o, n), 0, 1e-15)
	}
}
