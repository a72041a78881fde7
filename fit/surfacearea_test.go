package fit

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mathext"
)

// The tables of Carlson 1995 (doi 10.1007/BF02198293), as carried by SciPy's
// TestEllipCarlson. R_F and R_D are gonum's; the identity that makes R_G of
// them is ours.
func TestEllipticIntegrals(t *testing.T) {
	near(t, "R_F(1,2,0)", mathext.EllipticRF(1, 2, 0), 1.3110287771461, 1e-13)
	near(t, "R_F(2,3,4)", mathext.EllipticRF(2, 3, 4), 0.58408284167715, 1e-14)
	near(t, "R_D(0,2,1)", mathext.EllipticRD(0, 2, 1), 1.7972103521034, 1e-13)
	near(t, "R_D(2,3,4)", mathext.EllipticRD(2, 3, 4), 0.16510527294261, 1e-14)
	near(t, "R_G(0,16,16)", ellipticRG(0, 16, 16), math.Pi, 1e-14)
	near(t, "R_G(2,3,4)", ellipticRG(2, 3, 4), 1.7255030280692, 1e-13)
	near(t, "R_G(2,4,3)", ellipticRG(2, 4, 3), 1.7255030280692, 1e-13)
	near(t, "R_G(0,.0796,4)", ellipticRG(0, 4, 0.0796), 1.0284758090288, 1e-13)

	// Legendre's integrals, from the tables of gonum's own tests.
	near(t, "F(π/3|.5)", mathext.EllipticF(math.Pi/3, 0.5), 1.1424290580457773, 1e-14)
	near(t, "E(π/3|.5)", mathext.EllipticE(math.Pi/3, 0.5), 0.96495145764299258, 1e-14)
}
