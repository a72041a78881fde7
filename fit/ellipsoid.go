package fit

import "gonum.org/v1/gonum/spatial/r3"

// An Ellipsoid has its semi-axes along three orthonormal right-handed unit
// vectors.
type Ellipsoid struct {
	Centre   r3.Vec     // m
	SemiAxes [3]float64 // descending, m
	Axes     [3]r3.Vec  // unit vectors of the semi-axes, right-handed
}
