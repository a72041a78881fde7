package demo

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func TestHitIsExactOnPlanesAndEllipsoids(t *testing.T) {
	se := NewSite(1).Season(1)
	rng := rand.New(rand.NewPCG(1, 1))
	seen := map[int]int{}
	for range 20000 {
		from := se.setups[rng.IntN(len(se.setups))].at
		at := r3.Vec{X: -6 + 70*rng.Float64(), Y: -20 + 28*rng.Float64(), Z: 26 * rng.Float64()}
		dir := r3.Unit(r3.Sub(at, from))
		got, surface, ok := se.first(from, dir, make([]int, 0, 64))
		if !ok {
			continue
		}
		seen[surface]++
		// The same hit from the equations of plane and ellipsoid.
		k := &se.solid.cliff
		var want float64
		plane := func(h halfSpace) float64 { return -h.distance(from) / r3.Dot(h.normal, dir) }
		p := along(from, dir, got)
		switch {
		case surface == onSide:
			want = plane(k.side)
		case surface == onWall:
			want = plane(k.wall)
		case surface == onCrest:
			want = plane(k.crest)
		case surface == onPlatform:
			want = plane(k.platform)
		case surface == onFace && p.X < bendX:
			want = plane(halfSpace{normal: r3.Vec{Y: k.sin, Z: k.cos}})
		case surface == onFace:
			continue // undulating
		default:
			f := &se.solid.features[surface]
			if f.sides != nil {
				best := 0
				for i := range f.sides {
					if math.Abs(f.sides[i].distance(p)) < math.Abs(f.sides[best].distance(p)) {
						best = i
					}
				}
				want = plane(f.sides[best])
				break
			}
			q, d := f.scaled(from), r3.Vec{
				X: r3.Dot(dir, f.frame.a) / f.semi.X,
				Y: r3.Dot(dir, f.frame.b) / f.semi.Y,
				Z: r3.Dot(dir, f.frame.n) / f.semi.Z,
			}
			a, b, c := r3.Dot(d, d), r3.Dot(q, d), r3.Dot(q, q)-1
			want = (-b - math.Sqrt(b*b-a*c)) / a
		}
		if math.Abs(got-want) > 1e-6 {
			t.Fatalf("hit of surface %d at %.9f, want %.9f", surface, got, want)
		}
	}
	if len(seen) < 25 { // of 30, some of them tiny
		t.Errorf("only %d surfaces were hit: %v", len(seen), seen)
	}
}

// A ray advanced in small even steps with every feature in play finds the same
// first rock as the tracing with its shortcuts.
func TestHitMissesNothing(t *testing.T) {
	se := NewSite(1).Season(1)
	rng := rand.New(rand.NewPCG(1, 1))
	lo, hi := surveyed()
	differ := 0
	const rays, step = 400, 0.01
	for range rays {
		from := se.setups[rng.IntN(len(se.setups))].at
		at := r3.Vec{X: -6 + 70*rng.Float64(), Y: -20 + 28*rng.Float64(), Z: 26 * rng.Float64()}
		dir := r3.Unit(r3.Sub(at, from))
		in, out := slab(from, r3.Vec{X: 1 / dir.X, Y: 1 / dir.Y, Z: 1 / dir.Z}, lo, hi)
		want := math.Inf(1)
		for u := in; u < out; u += step {
			if d, _ := se.solid.eval(along(from, dir, u), se.solid.all); d <= 0 {
				want = u
				break
			}
		}
		got, _, ok := se.first(from, dir, make([]int, 0, 64))
		if !ok {
			got = math.Inf(1)
		}
		if got != want && !(got <= want+1e-9 && got >= want-step-1e-9) {
			differ++ // a corner that the even steps jump over
		}
	}
	if differ > rays/100 {
		t.Errorf("%d of %d rays end elsewhere", differ, rays)
	}
}

func TestNormalIsTheGradient(t *testing.T) {
	se := NewSite(1).Season(1)
	rng := rand.New(rand.NewPCG(1, 1))
	const h = 1e-5
	for range 3000 {
		from := se.setups[rng.IntN(len(se.setups))].at
		at := r3.Vec{X: -6 + 70*rng.Float64(), Y: -20 + 28*rng.Float64(), Z: 26 * rng.Float64()}
		dir := r3.Unit(r3.Sub(at, from))
		u, surface, ok := se.first(from, dir, make([]int, 0, 64))
		if !ok {
			continue
		}
		p := along(from, dir, u)
		diff := func(e r3.Vec) (float64, bool) {
			a, sa := se.solid.eval(r3.Add(p, r3.Scale(h, e)), se.solid.all)
			b, sb := se.solid.eval(r3.Sub(p, r3.Scale(h, e)), se.solid.all)
			return a - b, sa == surface && sb == surface
		}
		x, okX := diff(r3.Vec{X: 1})
		y, okY := diff(r3.Vec{Y: 1})
		z, okZ := diff(r3.Vec{Z: 1})
		if !okX || !okY || !okZ {
			continue // an edge
		}
		want := r3.Unit(r3.Vec{X: x, Y: y, Z: z})
		if got := se.solid.normal(p, surface); r3.Norm(r3.Sub(got, want)) > 1e-5 {
			t.Fatalf("normal of surface %d at %v is %v, want %v", surface, p, got, want)
		}
	}
}
