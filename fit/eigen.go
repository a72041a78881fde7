package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// EigenSym3 returns the eigenvalues of a covariance, ascending and in m², and
// its eigenvectors: unit, orthogonal, right-handed, each up to its sign. Where
// eigenvalues coincide the axes are some orthonormal basis of their space; the
// zero matrix has the axes of the frame. Rounding can make the smallest
// eigenvalue of a flat set negative; it is then 0, so c must be positive
// semi-definite. Elements that are not finite give NaN.
//
// The method finds one eigenvalue, the one that lies apart from the other two,
// by Newton's iteration on the characteristic cubic of the normalised
// deviator: there it is always well conditioned, unlike in the trigonometric
// form for all three (Kopp 2008, doi 10.1142/S0129183108012303). Its vector is
// a cross product of two rows, as in Eberly's note on the 3×3 problem, and what
// remains is a 2×2 problem that one Jacobi rotation solves.
//
// Accuracy, tested against LAPACK's method on random, graded, flat, linear and
// near-isotropic matrices: |A − V·Λ·Vᵀ|, |VᵀV − I|·|A| and every eigenvalue's
// error are at most 8·2⁻⁵²·|A|, |A| being the largest eigenvalue. The smallest
// eigenvalue hence has a relative error of about 2⁻⁴⁹·λ2/λ0: a noise of 0.1 mm
// on a face of 100 m still has 3 digits. That is what the rounding of the
// elements of c itself allows.
func EigenSym3(c terrain.Covariance) (lambda [3]float64, axes [3]r3.Vec) {
	mean := (c.XX + c.YY + c.ZZ) / 3
	// The deviator, whose eigenvalues sum to zero.
	xx, yy, zz := c.XX-mean, c.YY-mean, c.ZZ-mean
	q := (xx*xx+yy*yy+zz*zz)/6 + (c.XY*c.XY+c.XZ*c.XZ+c.YZ*c.YZ)/3
	if !(q >= minSquare && q <= maxSquare) {
		return eigenExtreme(c, q)
	}
	f := 1 / math.Sqrt(q)
	xx, yy, zz = f*xx, f*yy, f*zz
	xy, xz, yz := f*c.XY, f*c.XZ, f*c.YZ

	// Eigenvalues β of the normalised deviator solve β³ − 3β − 2h = 0 with
	// |h| ≤ 1. The one with the sign of h has a magnitude in [√3, 2] and is at
	// least √3 from the others.
	h := 0.5 * (xx*(yy*zz-yz*yz) - xy*(xy*zz-yz*xz) + xz*(xy*yz-yy*xz))
	b := isolatedRoot(min(math.Abs(h), 1))
	b = math.Copysign(b, h)

	n := nullVector(xx-b, yy-b, zz-b, xy, xz, yz)
	u, v := orthonormal(n)

	// The matrix in the basis u, v, n; n is an eigenvector up to rounding.
	cu, cv, cn := apply(c, u), apply(c, v), apply(c, n)
	uu, uv, vv, nn := r3.Dot(u, cu), r3.Dot(u, cv), r3.Dot(v, cv), r3.Dot(n, cn)
	low, high, cos, sin := rotate2(uu, uv, vv)
	e := r3.Vec{X: cos*u.X + sin*v.X, Y: cos*u.Y + sin*v.Y, Z: cos*u.Z + sin*v.Z}
	g := r3.Vec{X: cos*v.X - sin*u.X, Y: cos*v.Y - sin*u.Y, Z: cos*v.Z - sin*u.Z}

	if h >= 0 {
		lambda, axes = [3]float64{low, high, nn}, [3]r3.Vec{e, g, n}
	} else {
		lambda, axes = [3]float64{nn, low, high}, [3]r3.Vec{n, e, g}
	}
	// In a matrix that is isotropic but for rounding, n may be out of order, by
	// one place or by two.
	for _, i := range [3]int{0, 1, 0} {
		if lambda[i] > lambda[i+1] {
			lambda[i], lambda[i+1] = lambda[i+1], lambda[i]
			axes[i], axes[i+1] = axes[i+1], r3.Scale(-1, axes[i])
		}
	}
	for i := range lambda {
		lambda[i] = max(lambda[i], 0)
	}
	return lambda, axes
}

// Squares of the deviator outside these bounds would lose bits to underflow or
// overflow in a product of three elements.
const (
	minSquare = 1e-180
	maxSquare = 1e+180
)

// eigenExtreme handles what EigenSym3 cannot scale directly: multiples of the
// identity, matrices of extreme size, and elements that are not finite.
func eigenExtreme(c terrain.Covariance, q float64) (lambda [3]float64, axes [3]r3.Vec) {
	axes = [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}}
	size := 0.0
	for _, v := range [6]float64{c.XX, c.XY, c.XZ, c.YY, c.YZ, c.ZZ} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			nan := math.NaN()
			v := r3.Vec{X: nan, Y: nan, Z: nan}
			return [3]float64{nan, nan, nan}, [3]r3.Vec{v, v, v}
		}
		size = max(size, math.Abs(v))
	}
	// A deviator this small beside the mean is rounding of a multiple of I.
	if size == 0 || q < minSquare && size > math.Sqrt(minSquare)/epsilon {
		m := max((c.XX+c.YY+c.ZZ)/3, 0)
		return [3]float64{m, m, m}, axes
	}
	_, exp := math.Frexp(size)
	scale := func(v float64) float64 { return math.Ldexp(v, -exp) }
	s := terrain.Covariance{
		XX: scale(c.XX), XY: scale(c.XY), XZ: scale(c.XZ),
		YY: scale(c.YY), YZ: scale(c.YZ), ZZ: scale(c.ZZ),
	}
	lambda, axes = EigenSym3(s)
	for i := range lambda {
		lambda[i] = math.Ldexp(lambda[i], exp)
	}
	return lambda, axes
}

// isolatedRoot solves β³ − 3β − 2h = 0 for its root in [√3, 2], 0 ≤ h ≤ 1. The
// start is the quartic that meets the root and its slope at both ends and the
// root in the middle; it errs by at most 4.1e-5. A Newton step squares an error
// and multiplies it by less than 0.9, so two of them reach rounding.
func isolatedRoot(h float64) float64 {
	const (
		sqrt3  = 1.7320508075688772
		middle = 1.8793852415718169 // 2·cos 20°
		rest   = 2 - sqrt3 - 1./3
		slope  = 2./9 - 1./3
		c3     = slope - 2*rest
		c2     = rest - c3
		c4     = 16 * (middle - sqrt3 - (1./3+(c2+c3/2)/2)/2)
	)
	k := h * (1 - h)
	b := sqrt3 + h*(1./3+h*(c2+h*c3)) + c4*k*k
	for range 2 {
		s := b * b
		b -= ((s-3)*b - 2*h) / (3 * (s - 1))
	}
	return b
}

// nullVector returns the unit vector of the null space of a symmetric matrix
// of rank 2: the longest cross product of two of its rows.
func nullVector(xx, yy, zz, xy, xz, yz float64) r3.Vec {
	// The cross products of the rows are the columns of the adjugate, whose
	// diagonal elements are all of one sign; the largest is in the longest.
	ax := yy*zz - yz*yz
	ay := xx*zz - xz*xz
	az := xx*yy - xy*xy
	var n r3.Vec
	switch {
	case math.Abs(ax) >= math.Abs(ay) && math.Abs(ax) >= math.Abs(az):
		n = r3.Vec{X: ax, Y: xz*yz - xy*zz, Z: xy*yz - yy*xz}
	case math.Abs(ay) >= math.Abs(az):
		n = r3.Vec{X: xz*yz - xy*zz, Y: ay, Z: xy*xz - xx*yz}
	default:
		n = r3.Vec{X: xy*yz - yy*xz, Y: xy*xz - xx*yz, Z: az}
	}
	s := 1 / math.Sqrt(n.X*n.X+n.Y*n.Y+n.Z*n.Z)
	return r3.Vec{X: s * n.X, Y: s * n.Y, Z: s * n.Z}
}

// orthonormal completes a unit vector n to a right-handed basis u, v, n (Duff
// et al. 2017, Building an orthonormal basis, revisited, J. Comput. Graph.
// Tech. 6(1)).
func orthonormal(n r3.Vec) (u, v r3.Vec) {
	sign := math.Copysign(1, n.Z)
	a := -1 / (sign + n.Z)
	b := n.X * n.Y * a
	u = r3.Vec{X: 1 + sign*n.X*n.X*a, Y: sign * b, Z: -sign * n.X}
	v = r3.Vec{X: b, Y: sign + n.Y*n.Y*a, Z: -n.Y}
	return u, v
}

// apply returns c·v.
func apply(c terrain.Covariance, v r3.Vec) r3.Vec {
	return r3.Vec{
		X: c.XX*v.X + c.XY*v.Y + c.XZ*v.Z,
		Y: c.XY*v.X + c.YY*v.Y + c.YZ*v.Z,
		Z: c.XZ*v.X + c.YZ*v.Y + c.ZZ*v.Z,
	}
}

// rotate2 returns the eigenvalues of [[a, b], [b, d]], low ≤ high, and the unit
// eigenvector (cos, sin) of low; that of high is (−sin, cos).
func rotate2(a, b, d float64) (low, high, cos, sin float64) {
	t := 0.0
	if b != 0 {
		diff := d - a
		t = 2 * b / (math.Abs(diff) + math.Sqrt(diff*diff+4*b*b))
		if !(math.Abs(t) <= 1) { // diff² and b² underflowed
			t = math.Copysign(1, b)
		}
	}
	cos = 1 / math.Sqrt(1+t*t)
	sin = t * cos
	if a <= d {
		return a - t*b, d + t*b, cos, -sin
	}
	// The larger element stands first: turn by a right angle.
	return d - t*b, a + t*b, -sin, cos
}
