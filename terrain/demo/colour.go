package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// rock is how the rock at p looks along dir from distance t: the intensity of a
// rough surface by Lambert's cosine law and the inverse square of the range,
// the colour in beds that dip gently, darker on wet ground.
func (c *scanner) rock(p, dir r3.Vec, t float64, surface int) look {
	s := &c.season.solid
	cos := max(-r3.Dot(s.normal(p, surface), dir), 0)
	bed := 0.5 + 0.5*math.Sin(2.1*(p.Z+0.08*p.X))*math.Sin(0.7*p.Z+0.02*p.X)
	tint := 0.75 + 0.25*bed
	switch {
	case surface >= 0:
		tint *= s.features[surface].tint
	case surface == onPlatform:
		tint *= 0.8
	}
	tint *= 1 + 0.06*(c.rng.Float64()-0.5)
	light := 0.35 + 0.65*cos
	return look{
		intensity: saturated(0.6 * tint * cos * sq(30/t)),
		red:       saturated(0.62 * tint * light),
		green:     saturated(0.56 * tint * light),
		blue:      saturated(0.50 * tint * light),
	}
}

// green is how a leaf looks from distance t.
func (c *scanner) green(t float64) look {
	v := 0.5 + 0.5*c.rng.Float64()
	return look{
		intensity: saturated(0.4 * v * sq(30/t)),
		red:       saturated(0.25 * v), green: saturated(0.45 * v), blue: saturated(0.15 * v),
	}
}

func saturated(x float64) uint16 { return uint16(math.Round(65535 * min(max(x, 0), 1))) }

// leaf reports where the ray meets the shrub before t, if it does. Leaves fill
// its sphere at random, so the free path in it is exponential.
func (c *scanner) leaf(dir r3.Vec, t float64) (u float64, ok bool) {
	const path = 0.8 // m, mean free path
	q := r3.Sub(c.sweep.from, c.season.shrub.o)
	half := r3.Dot(q, dir)
	disc := half*half - r3.Dot(q, q) + shrubRadiusM*shrubRadiusM
	if disc <= 0 {
		return 0, false
	}
	root := math.Sqrt(disc)
	u = -half - root + path*c.rng.ExpFloat64()
	return u, u < min(t, root-half)
}
