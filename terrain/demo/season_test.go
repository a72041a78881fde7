package demo

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func TestDeliveredCoordinatesAreOff(t *testing.T) {
	s := NewSite(1)
	rng := rand.New(rand.NewPCG(1, 1))
	for n, want := range map[int]struct{ shift, deg float64 }{1: {0, 0}, 2: {0.15, 0.3}} {
		se := s.Season(n)
		d := se.Truth().Delivered
		pivot := d.Pivot.Vec()
		if got := r3.Norm(r3.Sub(se.ToDelivered(pivot), pivot)); math.Abs(got-want.shift) > 1e-9 {
			t.Errorf("season %d: shift %g, want %g", n, got, want.shift)
		}
		trace := d.Rotation[0][0] + d.Rotation[1][1] + d.Rotation[2][2]
		if got := math.Acos(min((trace-1)/2, 1)) * 180 / math.Pi; math.Abs(got-want.deg) > 1e-6 {
			t.Errorf("season %d: rotation %g°, want %g°", n, got, want.deg)
		}
		for range 100 {
			p := s.toWorld(r3.Vec{X: 60 * rng.Float64(), Y: 30 * rng.Float64(), Z: 20 * rng.Float64()})
			if got := r3.Norm(r3.Sub(se.FromDelivered(se.ToDelivered(p)), p)); got > 2e-9 { // two ulps at 6.5e6
				t.Fatalf("season %d: there and back again misses by %g m", n, got)
			}
			if got := r3.Norm(r3.Sub(s.toWorld(s.toSite(p)), p)); got > 2e-9 {
				t.Fatalf("site frame there and back again misses by %g m", got)
			}
		}
	}
}

// Rock is the same in both seasons except in the boxes of the changes, and in
// these by the volumes told.
func TestSeasonsDifferWhereTold(t *testing.T) {
	s := NewSite(1)
	before, after := s.Season(1), s.Season(2)
	changes := after.Truth().Changes
	if len(before.Truth().Changes) != 0 || len(changes) != 5 {
		t.Fatalf("%d and %d changes", len(before.Truth().Changes), len(changes))
	}
	rng := rand.New(rand.NewPCG(1, 1))
	lo, hi := surveyed()
	differ := 0
	for range 400_000 {
		p := s.toWorld(r3.Vec{
			X: lo.X + (hi.X-lo.X)*rng.Float64(),
			Y: lo.Y + (hi.Y-lo.Y)*rng.Float64(),
			Z: lo.Z + (hi.Z-lo.Z)*rng.Float64(),
		})
		if before.SignedDistance(p) < 0 == (after.SignedDistance(p) < 0) {
			continue
		}
		differ++
		inside := false
		for i := range changes {
			inside = inside || changes[i].Box.Contains(p, 1e-6)
		}
		if !inside {
			t.Fatalf("rock differs at %v, where nothing is told to have changed", s.toSite(p))
		}
	}
	if differ == 0 {
		t.Error("no change was met")
	}
	for _, c := range changes {
		const n = 200_000
		g, sum := over(&c.Box), 0
		for range n {
			p := g.at(c.Box.HalfM[0]*(2*rng.Float64()-1), c.Box.HalfM[1]*(2*rng.Float64()-1), c.Box.HalfM[2]*(2*rng.Float64()-1))
			a, b := before.SignedDistance(p) < 0, after.SignedDistance(p) < 0
			switch {
			case a && !b:
				sum--
			case b && !a:
				sum++
			}
		}
		all := 8 * c.Box.HalfM[0] * c.Box.HalfM[1] * c.Box.HalfM[2]
		got := all * float64(sum) / n
		if c.Kind == loss {
			got = -got
		}
		share := c.VolumeM3 / all
		sigma := all * math.Sqrt(share*(1-share)/n)
		if math.Abs(got-c.VolumeM3) > 4*sigma {
			t.Errorf("%s: %s of %.4f m³, told %.4f ± %.4f", c.Name, c.Kind, got, c.VolumeM3, sigma)
		}
	}
}

func TestSeasonPanics(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("season 3 exists")
		}
	}()
	NewSite(1).Season(3)
}
