package demo

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func TestProfiles(t *testing.T) {
	k := newCliff()
	face := k.onMain(0, 5)
	steep := onPlane(k.wall, 50, 0, 5)
	s70, c70 := sincosDeg(70)
	s84, c84 := sincosDeg(84)
	for _, tt := range []struct {
		name  string
		p     profile
		f     frame
		cut   bool
		area  float64 // visible
		reach float64
	}{
		// Trapezia and triangles, by hand.
		{"prow", prowProfile(0.6, 0.8, 0.5, 70), face, false, 0.6 * (0.8 + (0.5+0.6*s70/c70)/2), 0},
		{"undercut block", undercutProfile(1, 1.3, 0.27), face, false, 1.3 - 0.27/2 - 0.2/2, s70 - 0.27*c70},
		{"undercut block, steep", undercutProfile(0.7, 1.4, 0.19), steep, false, 0.7 * (1.4 - 0.19/2 - 0.2/2), 0.7*s84 - 0.19*c84},
		{"recess", recessProfile(0.6, 0.6, 0.5), face, true, 0.6 * (0.6 + (0.5+0.6*s70/c70)/2), 0},
		{"niche", nicheProfile(0.8, -0.6, 0.8, 0.7), face, true, 0.8 * (1.4 + 0.35), 0.8 * s70},
		{"notch", undercutNotch(0.3, 1), steep, true, 0.15, 0.3 * s84},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if got := areaOf(tt.p); got <= 0 {
				t.Errorf("profile runs clockwise: area %g", got)
			}
			for i := range tt.p {
				a, b, c := tt.p[i], tt.p[(i+1)%len(tt.p)], tt.p[(i+2)%len(tt.p)]
				if (b[0]-a[0])*(c[1]-b[1])-(b[1]-a[1])*(c[0]-b[0]) < -1e-12 {
					t.Errorf("profile is not convex at point %d", i+1)
				}
			}
			if got := math.Abs(areaOf(visible(tt.p, tt.cut))); math.Abs(got-tt.area) > 1e-9 {
				t.Errorf("area %.9f, want %.9f", got, tt.area)
			}
			if got := roofOf(tt.p, tt.f, tt.cut).reach; math.Abs(got-tt.reach) > 1e-9 {
				t.Errorf("reach %.9f, want %.9f", got, tt.reach)
			}
		})
	}
}

func TestPrismIsItsProfile(t *testing.T) {
	k := newCliff()
	f := k.onMain(10, 5)
	p := prowProfile(0.6, 0.8, 0.5, 70)
	prism := newPrism("prow", f, p, 0.7)
	for _, tt := range []struct {
		a, b, n float64
		inside  bool
	}{
		{0, 0, 0.59, true}, {0, 0, 0.61, false}, {0.69, 0, 0.3, true}, {0.71, 0, 0.3, false},
		{0, 0.88, 0.01, true}, {0, 0.91, 0.01, false}, {0, -1.2, 0.25, true}, {0, -1.2, 0.35, false},
		{0, 0, -0.49, true}, {0, 0, -0.51, false},
	} {
		q := f.at(tt.a, tt.b, tt.n)
		if got := prism.distance(q) < 0; got != tt.inside {
			t.Errorf("(%g, %g, %g): inside %t, want %t", tt.a, tt.b, tt.n, got, tt.inside)
		}
		lo, hi := grow(prism.lo, prism.hi, q)
		if tt.inside && (r3.Norm(r3.Sub(lo, prism.lo)) > 0 || r3.Norm(r3.Sub(hi, prism.hi)) > 0) {
			t.Errorf("(%g, %g, %g) lies outside of the bounding box", tt.a, tt.b, tt.n)
		}
	}
}
