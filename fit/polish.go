package fit

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"
)

const (
	// polishSteps is how often a solver that is still short of its goal tries
	// Newton's method. Nearly all sets are done before; sets with many points
	// within a hair of the ellipsoid, such as a dome that is part of a sphere,
	// would need more steps than maxEncloseSteps.
	polishSteps = 512

	// polishRounds bounds how often points are exchanged, polishPoints how
	// many points without a weight take part at a time.
	polishRounds = 12
	polishPoints = 32

	// polishIterations bounds Newton's iterations; it needs about twenty.
	polishIterations = 60
)

// polish solves for the weights of the few points that matter by an interior
// point method, as Sun & Freund 2004 do (doi 10.1287/opre.1040.0115), and
// exchanges points until none lies outside. Where it fails the weights are
// merely other weights, and the first-order steps go on from them.
func (s *solver) polish(goal float64) {
	for range polishRounds {
		m := s.gather()
		s.newton(m, 3+(goal-3)/4)
		if s.furthest(s.active) <= goal {
			return
		}
	}
}

// gather moves the points that have a weight, and those furthest out, to the
// front, takes the weights of all others away and returns their number.
func (s *solver) gather() int {
	const negligible = 1e-9 // weights that would not be missed
	forms := make([]float64, s.active)
	m := polishPoints
	for i := range forms {
		d := r3.Sub(s.points[i], s.mean)
		forms[i] = r3.Dot(d, apply(s.inv, d))
		if s.weights[i] > negligible {
			forms[i] = math.Inf(1) // before all others
			m++
		}
	}
	sort.Sort(&byForm{forms, s})
	m = min(m, s.active)
	clear(s.weights[m:])
	return m
}

// byForm sorts the active points of a solver by falling form.
type byForm struct {
	forms []float64
	s     *solver
}

func (b *byForm) Len() int           { return len(b.forms) }
func (b *byForm) Less(i, j int) bool { return b.forms[i] > b.forms[j] }
func (b *byForm) Swap(i, j int) {
	b.forms[i], b.forms[j] = b.forms[j], b.forms[i]
	b.s.points[i], b.s.points[j] = b.s.points[j], b.s.points[i]
	b.s.weights[i], b.s.weights[j] = b.s.weights[j], b.s.weights[i]
}

// newton maximises the determinant over the weights of the first m points,
// until none of these reaches beyond goal.
//
// With slacks z the optimum is g(w) + z = 4, w·z = 0 for each point, where g is
// the lifted form (1 more than the form, over the sum of weights). The step
// relaxes w·z to a falling μ and eliminates the slacks' change; the derivative
// of g is −H with H positive semi-definite, so the system is definite.
func (s *solver) newton(m int, goal float64) {
	const (
		floor   = 1e-3 // least start of m·w and of a slack, to be well inside
		falling = 0.15 // μ from step to step
		inside  = 0.95 // share of the way to the nearest bound
	)
	w := s.weights[:m]
	z := make([]float64, m)
	for i := range w {
		w[i] = max(w[i], floor/float64(m))
	}
	s.refresh()
	offset := make([]r3.Vec, m) // from the mean, and that times the inverse
	scaled := make([]r3.Vec, m)
	g := make([]float64, m)
	h := mat.NewSymDense(m, nil)
	rhs, dw := mat.NewVecDense(m, nil), mat.NewVecDense(m, nil)
	dz := make([]float64, m)
	var factor mat.Cholesky
	for round := range polishIterations {
		far, complement := 0.0, 0.0
		for i := range w {
			offset[i] = r3.Sub(s.points[i], s.mean)
			scaled[i] = apply(s.inv, offset[i])
			form := r3.Dot(offset[i], scaled[i])
			g[i] = form + 1
			far = max(far, form)
			if round == 0 {
				z[i] = max(liftedDim-g[i], floor)
			}
			complement += w[i] * z[i]
		}
		if far <= goal {
			break
		}
		mu := falling * complement / float64(m)
		for i := range m {
			for j := i; j < m; j++ {
				h.SetSym(i, j, s.curvature(offset[i], scaled[j]))
			}
			h.SetSym(i, i, h.At(i, i)+z[i]/w[i])
			rhs.SetVec(i, mu/w[i]-liftedDim+g[i])
		}
		if !factor.Factorize(h) || factor.SolveVecTo(dw, rhs) != nil {
			break
		}
		length := 1.0
		for i := range m {
			dz[i] = mu/w[i] - z[i] - z[i]/w[i]*dw.AtVec(i)
			if d := dw.AtVec(i); d < 0 {
				length = min(length, -inside*w[i]/d)
			}
			if dz[i] < 0 {
				length = min(length, -inside*z[i]/dz[i])
			}
		}
		for i := range m {
			w[i] += length * dw.AtVec(i)
			z[i] += length * dz[i]
		}
		s.refresh()
	}
}

// curvature is an element of H: the squared product of two lifted points in the
// metric of the ellipsoid, or the mean of that over mirror images.
func (s *solver) curvature(a, scaledB r3.Vec) float64 {
	if !s.mirrored {
		p := 1 + r3.Dot(a, scaledB)
		return p * p
	}
	p := 1 + a.X*scaledB.X + a.Y*scaledB.Y
	q := a.Z * scaledB.Z
	return p*p + q*q
}
