package fit

import "gonum.org/v1/gonum/spatial/r3"

// A Plane is the total least squares plane of a set of raw points.
type Plane struct {
	Centroid r3.Vec     // mean of the points, m
	Normal   r3.Vec     // unit; its sign is arbitrary until the outward side is known
	Points   int64      // raw points summed
	Voxels   int        // voxels they lie in
	Lambda   [3]float64 // eigenvalues of the covariance (divided by n), ascending, m²
}
