package hazards

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

// The tree must find what a look at every ellipsoid finds.
func TestNearnessAgainstBruteForce(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, count := range []int{0, 1, 2, 3, 7, 100} {
		var obstacles []Obstacle
		for range count {
			x := randomDirection(rng)
			y := r3.Unit(r3.Cross(x, randomDirection(rng)))
			a := 0.2 + 2*rng.Float64()
			obstacles = append(obstacles, Obstacle{Ellipsoid: fit.Ellipsoid{
				Centre:   r3.Vec{X: 40 * rng.Float64(), Y: 40 * rng.Float64(), Z: 10 * rng.Float64()},
				SemiAxes: [3]float64{a, 0.7 * a, 0.1 * a},
				Axes:     [3]r3.Vec{x, y, r3.Cross(x, y)},
			}})
		}
		near := newNearness(obstacles)
		for range 300 {
			p := r3.Vec{X: 50*rng.Float64() - 5, Y: 50*rng.Float64() - 5, Z: 20*rng.Float64() - 5}
			want := math.Inf(1)
			for i := range obstacles {
				want = min(want, obstacles[i].Ellipsoid.DistanceTo(p))
			}
			if got := near.distance(p, math.Inf(1)); got != want {
				t.Fatalf("%d ellipsoids: distance %g, want %g", count, got, want)
			}
			for _, limit := range []float64{0, 0.5, 3} {
				if got := near.distance(p, limit); got != min(want, limit) {
					t.Fatalf("%d ellipsoids: distance %g up to %g, want %g", count, got, limit, min(want, limit))
				}
			}
		}
	}
}

// Ellipsoids that all have one centre, and flat ones without extent.
func TestNearnessDegenerate(t *testing.T) {
	ball := func(r float64) Obstacle {
		return Obstacle{Ellipsoid: fit.Ellipsoid{SemiAxes: [3]float64{r, r, r}, Axes: [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}}}}
	}
	n := newNearness([]Obstacle{ball(1), ball(2), ball(1.5), ball(2)})
	near(t, "distance", n.distance(r3.Vec{X: 5}, math.Inf(1)), 3, 1e-12)
	near(t, "inside", n.distance(r3.Vec{X: 1}, math.Inf(1)), 0, 0)
}
