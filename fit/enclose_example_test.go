package fit_test

import (
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

func ExampleEncloseOnFace() {
	// A block of 2 × 1 × 0.5 m on level ground at a height of 100 m.
	var corners []r3.Vec
	for i := range 8 {
		corners = append(corners, r3.Vec{
			X: 2 * float64(i&1), Y: float64(i >> 1 & 1), Z: 100 + 0.5*float64(i>>2),
		})
	}
	e, gap, err := fit.EncloseOnFace(corners, r3.Vec{Z: 100}, r3.Vec{Z: 1}, 0, 1e-6)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("centre %.2f %.2f %.2f\n", e.Centre.X, e.Centre.Y, e.Centre.Z)
	fmt.Printf("semi-axes %.3f %.3f %.3f m\n", e.SemiAxes[0], e.SemiAxes[1], e.SemiAxes[2])
	fmt.Println("certified:", gap.Volume <= 1e-6)
	// Output:
	// centre 1.00 0.50 100.00
	// semi-axes 1.732 0.866 0.866 m
	// certified: true
}

func ExampleEllipsoid_Inflate() {
	e := fit.Ellipsoid{SemiAxes: [3]float64{2, 1, 1}, Axes: [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}}}
	p := r3.Vec{X: 2.1, Y: 0.7}
	fmt.Printf("%.3f m away\n", e.DistanceTo(p))
	fmt.Println("within the clearance:", e.Inflate(0.5).Contains(p))
	// Output:
	// 0.399 m away
	// within the clearance: true
}
