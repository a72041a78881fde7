package demo

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// over is the frame of a truth's box, in E, N, H.
func over(b *Box) frame {
	return frame{o: b.Centre.Vec(), a: b.Along.Vec(), b: b.Up.Vec(), n: b.Out.Vec()}
}

// drop returns the height above the box's centre at which a ray that comes
// down the face's normal enters rock.
func drop(f func(r3.Vec) float64, g frame, a, b, from float64) float64 {
	for t := from; t > from-5; {
		step := max(stepShare*f(g.at(a, b, t)), 0.002)
		if f(g.at(a, b, t-step)) < 0 {
			return bisect(-t, step-t, func(t float64) float64 { return -f(g.at(a, b, -t)) }) * -1
		}
		t -= step
	}
	return math.NaN()
}

// Heights and volumes of the truth against rays cast on the solid, with and
// without its features.
func TestObstaclesStandAsTold(t *testing.T) {
	for n := 1; n <= Seasons; n++ {
		se := NewSite(1).Season(n)
		bare := func(p r3.Vec) float64 {
			d, _ := se.solid.cliff.eval(se.site.toSite(p))
			return d
		}
		for _, o := range se.truth.Obstacles {
			if o.Kind == overhang {
				continue // see TestOverhangsReachAsTold
			}
			g := over(&o.Box)
			const cells = 50
			height, volume := 0.0, 0.0
			for i := range cells {
				for j := range cells {
					a := o.Box.HalfM[0] * (float64(2*i+1)/cells - 1)
					b := o.Box.HalfM[1] * (float64(2*j+1)/cells - 1)
					from := o.Box.HalfM[2] + 0.5
					h := drop(se.SignedDistance, g, a, b, from) - drop(bare, g, a, b, from)
					if o.Kind == recess {
						h = -h
					}
					height = max(height, h)
					volume += h
				}
			}
			volume *= 4 * o.Box.HalfM[0] * o.Box.HalfM[1] / (cells * cells)
			// On the cone the face falls off a centimetre to both sides.
			if math.Abs(height-o.HeightM) > 0.01 {
				t.Errorf("season %d, %s: height %.3f, truth %.3f", n, o.Name, height, o.HeightM)
			}
			if math.Abs(volume-o.VolumeM3) > 0.02*o.VolumeM3 {
				t.Errorf("season %d, %s: volume %.3f, truth %.3f", n, o.Name, volume, o.VolumeM3)
			}
		}
	}
}

// The horizontal extent of what overhangs, from rays cast straight up.
func TestOverhangsReachAsTold(t *testing.T) {
	se := NewSite(1).Season(1)
	s := se.site
	_, limit := sincosDeg(overhangDeg)
	for _, o := range se.truth.Obstacles {
		g := over(&o.Box)
		out := r3.Unit(r3.Vec{X: g.n.X, Y: g.n.Y})
		lo, hi := math.Inf(1), math.Inf(-1)
		hits := 0
		for h := -1.5; h < 1.5; h += 0.005 {
			for z := -1.5; z < 1.5; z += 0.05 {
				p := r3.Add(g.o, r3.Add(r3.Scale(h, out), r3.Vec{Z: z}))
				if se.SignedDistance(p) <= 0 {
					continue
				}
				u, surface, ok := se.solid.hit(s.toSite(p), r3.Vec{Z: 1}, 0, 0.06, make([]int, 0, 64))
				if !ok || surface < 0 || se.solid.features[surface].name != strings.TrimSuffix(o.Name, " roof") {
					continue
				}
				q := along(s.toSite(p), r3.Vec{Z: 1}, u)
				if se.solid.normal(q, surface).Z < limit {
					lo, hi = min(lo, h), max(hi, h)
					hits++
				}
			}
		}
		got := 0.0
		if hits > 0 {
			got = hi - lo
		}
		if math.Abs(got-o.ReachM) > 0.03 && !(o.Kind == bulge && got < 0.06) {
			t.Errorf("%s: reach %.3f, truth %.3f", o.Name, got, o.ReachM)
		}
		switch overhangs := o.ReachM >= 0.2; {
		case o.Kind == bulge && overhangs, o.Kind == overhangingBulge && !overhangs, o.Kind == overhang && !overhangs:
			t.Errorf("%s is no %s with a reach of %.2f m", o.Name, o.Kind, o.ReachM)
		}
	}
}

// The site has what a demonstration needs.
func TestSiteIsRich(t *testing.T) {
	tr := NewSite(1).Season(1).Truth()
	count := map[string]int{}
	for _, o := range tr.Obstacles {
		count[o.Kind]++
		if o.AreaM2 < 0.5 || o.AreaM2 > 6 {
			t.Errorf("%s covers %.2f m²", o.Name, o.AreaM2)
		}
	}
	if n := count[bulge] + count[overhangingBulge]; n < 6 {
		t.Errorf("%d bulges", n)
	}
	if n := count[overhang]; n < 3 {
		t.Errorf("%d overhangs", n)
	}
	if n := count[recess]; n < 3 {
		t.Errorf("%d recesses", n)
	}
	fits := 0
	for _, l := range tr.Ledges {
		if l.FitsPerson {
			fits++
		}
	}
	if fits < 3 || fits == len(tr.Ledges) {
		t.Errorf("%d of %d ledges fit a person", fits, len(tr.Ledges))
	}
}

func TestLedgesAreTreads(t *testing.T) {
	se := NewSite(1).Season(1)
	for _, l := range se.truth.Ledges {
		lip := r3.Sub(l.Corners[1].Vec(), l.Corners[0].Vec())
		back := r3.Sub(l.Corners[3].Vec(), l.Corners[0].Vec())
		if got := r3.Norm(lip); math.Abs(got-l.LengthM) > 1e-6 {
			t.Errorf("%s: length %g, want %g", l.Name, got, l.LengthM)
		}
		if got := math.Hypot(back.X, back.Y); math.Abs(got-l.DepthM) > 1e-6 {
			t.Errorf("%s: depth %g, want %g", l.Name, got, l.DepthM)
		}
		inclination := inclinationDeg(r3.Unit(r3.Cross(back, lip)))
		if inclination > 90 {
			inclination = 180 - inclination
		}
		if math.Abs(inclination-l.InclinationDeg) > 1e-6 {
			t.Errorf("%s: inclination %g, want %g", l.Name, inclination, l.InclinationDeg)
		}
		// The middle is tread, the air above is free up to the sky.
		mid := r3.Add(l.Corners[0].Vec(), r3.Scale(0.5, r3.Add(lip, back)))
		if d := se.SignedDistance(mid); math.Abs(d) > 1e-6 {
			t.Errorf("%s: its middle lies %g m off the surface", l.Name, d)
		}
		for up := 0.1; up < 25; up += 0.1 {
			if se.SignedDistance(r3.Add(mid, r3.Vec{Z: up})) <= 0 {
				t.Errorf("%s: rock %.1f m above", l.Name, up)
				break
			}
		}
		// Beyond lip and back the ground falls and rises.
		out := r3.Scale(0.02, r3.Unit(back))
		if d := se.SignedDistance(r3.Sub(r3.Sub(mid, r3.Scale(0.5, back)), out)); d <= 0 {
			t.Errorf("%s: rock beyond the lip", l.Name)
		}
		if d := se.SignedDistance(r3.Add(r3.Add(mid, r3.Scale(0.5, back)), r3.Add(out, r3.Vec{Z: 0.05}))); d >= 0 {
			t.Errorf("%s: no rock behind the back", l.Name)
		}
	}
}
