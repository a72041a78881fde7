package fit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// A ball that stands partly above a face: hundreds of points lie almost on the
// ellipsoid along a ring, and the first-order method alone leaves a gap of 1e-5
// after 100 000 steps.
func TestPolishBall(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 20 {
		points := randomPoints(rng, 600, "sphere")
		normal := randomUnit(rng)
		origin := r3.Scale(-2*rng.Float64(), normal)
		e, gap, err := EncloseOnFace(points, origin, normal, 0, 1e-6)
		if err != nil {
			t.Fatal(err)
		}
		checkEnclosed(t, "ball", e, gap, points, 1.01e-6)
		if gap.Steps > 4*polishSteps {
			t.Errorf("%d steps", gap.Steps)
		}
	}
}

// Newton's method alone, from any weights, finds the optimum that the
// first-order steps find.
func TestPolishAlone(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, mirrored := range []bool{false, true} {
		points := randomPoints(rng, 60, "cube")
		slow := solver{points: slices.Clone(points), mirrored: mirrored}
		slow.solve(1e-10)
		fast := solver{points: slices.Clone(points), mirrored: mirrored}
		fast.start()
		fast.newton(len(points), 3*(1+1e-11))
		near(t, "ratio of determinants", determinant(fast.cov)/determinant(slow.cov), 1, 1e-9)
		near(t, "furthest form", fast.furthest(len(points)), 3, 1e-9)
		sum := 0.0
		for _, w := range fast.weights {
			sum += w
		}
		near(t, "sum of weights", sum, 1, 1e-14)
	}
}

// The curvature is the negative derivative of the form with respect to a
// weight.
func TestPolishCurvature(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, mirrored := range []bool{false, true} {
		s := solver{points: randomPoints(rng, 12, "cube"), mirrored: mirrored}
		s.start()
		for i := range s.weights {
			s.weights[i] = 1. / 12
		}
		s.refresh()
		form := func(i int) float64 {
			d := r3.Sub(s.points[i], s.mean)
			return 1 + r3.Dot(d, apply(s.inv, d))
		}
		before := form(3)
		a, b := r3.Sub(s.points[3], s.mean), r3.Sub(s.points[7], s.mean)
		want := s.curvature(a, apply(s.inv, b))
		// refresh scales the weights to sum 1 again; the lifted form goes with
		// their inverse.
		const h = 1e-6
		s.weights[7] += h
		s.refresh()
		got := -(form(3)/(1+h) - before) / h
		if math.Abs(got-want) > 1e-4*(1+math.Abs(want)) {
			t.Errorf("mirrored %v: derivative %v, curvature %v", mirrored, got, want)
		}
	}
}
