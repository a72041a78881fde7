package fit

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// ellipticRG is Carlson's symmetric integral of the second kind R_G(x, y, z),
// with x and y at least 0 and z positive, by the identity of Carlson 1995
// (doi 10.1007/BF02198293):
//
//	2·R_G = z·R_F − (x−z)(y−z)·R_D/3 + √(xy/z)
//
// With z between x and y all three terms are positive and nothing cancels.
func ellipticRG(x, y, z float64) float64 {
	return 0.5 * (z*mathext.EllipticRF(x, y, z) -
		(x-z)*(y-z)*mathext.EllipticRD(x, y, z)/3 +
		math.Sqrt(x*y/z))
}
