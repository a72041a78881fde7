package fit_test

import (
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

func ExamplePlaneFromMoments() {
	// A grid of points on a slope of 45° that faces east, 1 mm rough.
	var m terrain.Moments
	for i := range 100 {
		x, y, rough := int64(i%10)*1000, int64(i/10)*1000, int64(i*7%3-1)*10
		m.AddPoint(x, y, -x+rough)
	}
	p, ok := fit.PlaneFromMoments(&m, r3.Vec{X: 500, Y: 600, Z: 70}, 25)
	if p.Normal.Z < 0 {
		p = p.Flipped()
	}
	dip, _ := p.DipDirectionDeg()
	rms, _ := p.Roughness()
	fmt.Println(ok)
	fmt.Printf("inclination %.2f°, dip direction %.1f°, roughness %.2f mm\n", p.InclinationDeg(), dip, 1000*rms)
	// Output:
	// true
	// inclination 45.00°, dip direction 90.0°, roughness 0.59 mm
}
