package export

import (
	"cmp"
	"slices"
)

// hull is the convex hull of a shape in plan, as one ring (Andrew 1979,
// Information Processing Letters 9:216-219). It is what is left to write when
// an outline does not survive the projection.
func hull(s shape) shape {
	var all ring
	for _, polygon := range s {
		all = append(all, polygon[0]...)
	}
	slices.SortFunc(all, func(a, b vertex) int { return cmp.Or(cmp.Compare(a.E, b.E), cmp.Compare(a.N, b.N)) })
	half := func(points ring) ring {
		var h ring
		for _, p := range points {
			for len(h) > 1 && cross(h[len(h)-2], h[len(h)-1], p) <= 0 {
				h = h[:len(h)-1]
			}
			h = append(h, p)
		}
		return h
	}
	lower := half(all)
	slices.Reverse(all)
	upper := half(all)
	return shape{{append(lower, upper[1:]...)}}
}

// cross is twice the area of the triangle, positive if it turns left.
func cross(a, b, c vertex) float64 {
	return (b.E-a.E)*(c.N-a.N) - (c.E-a.E)*(b.N-a.N)
}
