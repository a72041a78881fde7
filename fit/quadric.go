package fit

import (
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"
)

// A quadric is a height field over a plane: h(u,v) = a + bu + cv + du² + euv +
// fv² along n, with u and v along two unit vectors in the plane and the origin
// at the neighbourhood's centre.
type quadric struct {
	n, u, v r3.Vec
	coef    [6]float64
}

// softCurvature is the curvature, times R, that a face has before its members
// say anything: it keeps the fit to a narrow strip from bending across it, and
// is nothing against a full disc.
const softCurvature = 0.25

// at returns the signed distance of x from the surface, to first order in the
// slope of the surface against its plane, and the surface's unit normal there.
func (q *quadric) at(x r3.Vec) (signed float64, normal r3.Vec) {
	u, v, h := r3.Dot(q.u, x), r3.Dot(q.v, x), r3.Dot(q.n, x)
	c := &q.coef
	hu, hv := c[1]+2*c[3]*u+c[4]*v, c[2]+c[4]*u+2*c[5]*v
	s := 1 / math.Sqrt(1+hu*hu+hv*hv)
	d := h - (c[0] + c[1]*u + c[2]*v + c[3]*u*u + c[4]*u*v + c[5]*v*v)
	normal = r3.Sub(q.n, r3.Add(r3.Scale(hu, q.u), r3.Scale(hv, q.v)))
	return d * s, r3.Scale(s, normal)
}

// fitQuadric fits a piece around the plane p, by
// iteratively reweighted least squares with Tukey's biweight. A plane alone
// would put the middle of a face that curves with radius ρ off by R²/4ρ: 16 cm
// at R = 5 m and ρ = 40 m, half of the height that is looked for.
func (h *neighbourhood) fitQuadric(p facePlane, piece int, cutoff, radiusM float64) quadric {
	q := quadric{n: p.n}
	q.u = orthogonal(p.n)
	q.v = r3.Cross(p.n, q.u)
	q.coef[0] = p.d
	for range 3 {
		var a [21]float64 // upper triangle of the normal equations, row by row
		var b [6]float64
		var squares, weight float64
		for _, i := range h.pieces[piece] {
			x := h.members[i].pos
			d, _ := q.at(x)
			w := h.members[i].area * tukeyWeight(d/cutoff)
			if w == 0 {
				continue
			}
			u, v, z := r3.Dot(q.u, x), r3.Dot(q.v, x), r3.Dot(q.n, x)
			row := [6]float64{1, u, v, u * u, u * v, v * v}
			n := 0
			for r := range 6 {
				for c := r; c < 6; c++ {
					a[n] += w * row[r] * row[c]
					n++
				}
				b[r] += w * row[r] * z
			}
			squares += w * d * d
			weight += w
		}
		if weight == 0 {
			return q
		}
		// The prior weighs as a curvature softCurvature/R known to 1σ does
		// against residuals of the size found.
		variance := max(squares/weight, minFaceVarianceM2)
		soft := variance * radiusM * radiusM / (softCurvature * softCurvature)
		coef, ok := solveNormal(a, b, soft)
		if !ok {
			return q
		}
		q.coef = coef
	}
	return q
}

// minFaceVarianceM2 keeps the prior alive on surfaces without noise: 1 cm.
const minFaceVarianceM2 = 1e-4

// solveNormal solves the normal equations with soft added to the diagonal of
// the three quadratic terms (half-curvatures: a factor 4 and 1 for the mixed
// one is left out, it changes the prior only).
func solveNormal(a [21]float64, b [6]float64, soft float64) (coef [6]float64, ok bool) {
	m := mat.NewSymDense(6, nil)
	n := 0
	for r := range 6 {
		for c := r; c < 6; c++ {
			v := a[n]
			if r == c && r >= 3 {
				v += soft
			}
			m.SetSym(r, c, v)
			n++
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(m) {
		return coef, false
	}
	x := mat.NewVecDense(6, coef[:])
	if err := chol.SolveVecTo(x, mat.NewVecDense(6, b[:])); err != nil {
		return coef, false
	}
	return coef, true
}

// orthogonal returns a unit vector orthogonal to the unit vector n.
func orthogonal(n r3.Vec) r3.Vec {
	e := r3.Vec{X: 1}
	if math.Abs(n.X) > 0.6 {
		e = r3.Vec{Y: 1}
	}
	return r3.Unit(r3.Cross(n, e))
}
