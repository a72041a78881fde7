package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Kinds of obstacles and changes in the truth.
const (
	bulge            = "bulge"
	overhang         = "overhang"
	recess           = "recess"
	overhangingBulge = "overhanging bulge"

	loss = "loss"
	gain = "gain"
)

const shrubRadiusM = 0.6

// A builder makes the solid and its truth side by side, from the same numbers.
type builder struct {
	site     *Site
	season   int
	cliff    cliff
	features []feature
	truth    Truth
	shrub    frame
}

func newBuilder(s *Site, season int) *builder {
	return &builder{site: s, season: season, cliff: newCliff()}
}

func (b *builder) solid() solid {
	s := solid{cliff: b.cliff, features: b.features}
	for i := range b.features {
		s.all = append(s.all, i)
	}
	return s
}

// box is the truth's box of a range in the frame.
func (b *builder) box(f frame, halfA, loB, hiB, loN, hiN float64) Box {
	return Box{
		Centre: position(b.site.toWorld(f.at(0, (loB+hiB)/2, (loN+hiN)/2))),
		Along:  position(b.site.turn(f.a)),
		Up:     position(b.site.turn(f.b)),
		Out:    position(b.site.turn(f.n)),
		HalfM:  [3]float64{halfA, (hiB - loB) / 2, (hiN - loN) / 2},
	}
}

// profileBox is the box of the visible part of a profile.
func (b *builder) profileBox(f frame, v profile, halfA float64) Box {
	lo, hi := extent(v)
	return b.box(f, halfA, lo[0], hi[0], lo[1], hi[1])
}

func inclinationDeg(n r3.Vec) float64 {
	return math.Atan2(math.Hypot(n.X, n.Y), n.Z) * 180 / math.Pi
}

// block adds a prism that stands proud of the face.
func (b *builder) block(name, kind string, f frame, p profile, halfA float64) {
	t := newPrism(name, f, p, halfA)
	t.tint = 1.12
	b.features = append(b.features, t)
	v := visible(p, false)
	lo, hi := extent(v)
	b.truth.Obstacles = append(b.truth.Obstacles, Obstacle{
		Name: name, Kind: kind, Box: b.profileBox(f, v, halfA),
		HeightM: hi[1], ReachM: roofOf(p, f, false).reach,
		AreaM2: (hi[0] - lo[0]) * 2 * halfA, VolumeM3: areaOf(v) * 2 * halfA,
		FaceInclinationDeg: inclinationDeg(f.n),
	})
}

// boss adds half an ellipsoid.
func (b *builder) boss(name string, f frame, a, up, out float64) {
	t := newEllipsoid(name, f, a, up, out)
	t.tint = 1.08
	b.features = append(b.features, t)
	// On its middle profile the outermost point, where the surface is vertical,
	// and the root lie so far apart horizontally:
	h, v := math.Hypot(f.n.X, f.n.Y), math.Hypot(f.b.X, f.b.Y)
	reach := math.Hypot(up*v, out*h) - up*v
	kind := bulge
	if f.n.Z < 0.5 {
		kind = overhangingBulge
	} else {
		reach = 0 // steeper than vertical only in its last centimetres
	}
	b.truth.Obstacles = append(b.truth.Obstacles, Obstacle{
		Name: name, Kind: kind, Box: b.box(f, a, -up, up, 0, out),
		HeightM: out, ReachM: reach, AreaM2: math.Pi * a * up,
		VolumeM3: 2 * math.Pi / 3 * a * up * out, FaceInclinationDeg: inclinationDeg(f.n),
	})
}

// cut removes a prism from the face.
func (b *builder) cut(name string, f frame, p profile, halfA float64) {
	t := newPrism(name, f, p, halfA)
	t.cut, t.tint = true, 0.8
	b.features = append(b.features, t)
}

// niche cuts a recess.
func (b *builder) niche(name string, f frame, p profile, halfA float64) {
	b.cut(name, f, p, halfA)
	v := visible(p, true)
	lo, hi := extent(v)
	b.truth.Obstacles = append(b.truth.Obstacles, Obstacle{
		Name: name, Kind: recess, Box: b.profileBox(f, v, halfA),
		HeightM: -lo[1], AreaM2: (hi[0] - lo[0]) * 2 * halfA, VolumeM3: areaOf(v) * 2 * halfA,
		FaceInclinationDeg: inclinationDeg(f.n),
	})
}

// undercut cuts a notch too shallow for a recess, with a roof.
func (b *builder) undercut(name string, f frame, p profile, halfA float64) {
	b.cut(name, f, p, halfA)
	b.roof(name, f, p, halfA)
}

// roofedNiche cuts a recess and notes its roof as an overhang too.
func (b *builder) roofedNiche(name string, f frame, p profile, halfA float64) {
	b.niche(name, f, p, halfA)
	b.truth.Obstacles[len(b.truth.Obstacles)-1].ReachM = roofOf(p, f, true).reach
	b.roof(name+" roof", f, p, halfA)
}

func (b *builder) roof(name string, f frame, p profile, halfA float64) {
	r := roofOf(p, f, true)
	b.truth.Obstacles = append(b.truth.Obstacles, Obstacle{
		Name: name, Kind: overhang, Box: b.box(f, halfA, r.lo[0], r.hi[0], r.lo[1], r.hi[1]),
		HeightM: r.reach, ReachM: r.reach, AreaM2: r.length * 2 * halfA,
		FaceInclinationDeg: inclinationDeg(f.n),
	})
}

// fallen leaves the scar of a block that was there in season 1.
func (b *builder) fallen(name string, f frame, p profile, halfA, deep float64) {
	was := visible(p, false)
	_, hi := extent(was)
	c := Change{Name: name, Kind: loss, VolumeM3: areaOf(was) * 2 * halfA, DepthM: hi[1] + deep}
	lo := 0.0
	if deep > 0 {
		scar := scarProfile(p, deep)
		b.cut(name+" scar", f, scar, halfA)
		v := visible(scar, true)
		c.VolumeM3 += areaOf(v) * 2 * halfA
		lo = -deep
		box := b.profileBox(f, v, halfA)
		b.truth.Distractors = append(b.truth.Distractors, Distractor{
			Name: name + " scar", Reason: "shallow hollow", Box: &box,
		})
	}
	low, high := extent(was)
	c.Box = b.box(f, halfA, low[0], high[0], lo, high[1])
	b.truth.Changes = append(b.truth.Changes, c)
}

// leaning adds a block that has moved out since season 1.
func (b *builder) leaning(name string, f frame, p profile, halfA, by float64) {
	now := shifted(p, by)
	b.block(name, overhangingBulge, f, now, halfA)
	o := b.truth.Obstacles[len(b.truth.Obstacles)-1]
	b.truth.Changes = append(b.truth.Changes, Change{
		Name: name, Kind: gain, DepthM: by, Box: o.Box,
		VolumeM3: o.VolumeM3 - areaOf(visible(p, false))*2*halfA,
	})
}

// tooSmall adds a feature that must not be found.
func (b *builder) tooSmall(name, reason string, f frame, t feature, height float64) {
	b.features = append(b.features, t)
	half := r3.Scale(0.5, r3.Sub(t.hi, t.lo))
	radius := r3.Norm(half)
	lo, hi := 0.0, height
	if t.cut {
		lo, hi = -height, 0
	}
	box := b.box(f, radius, -radius, radius, lo, hi)
	b.truth.Distractors = append(b.truth.Distractors, Distractor{Name: name, Reason: reason, Box: &box})
}

// ledge cuts everything above a tread between x0 and x1. The tread starts at
// the lip (y, z), rises inwards with the given inclination, and ends at the
// riser, which leans back by cot per metre. It returns where the riser starts.
func (b *builder) ledge(name string, x0, x1, y, z, depth, deg, cot float64) (backY, backZ float64) {
	s, c := sincosDeg(deg)
	rise := s / c
	backY, backZ = y-depth, z+depth*rise
	const out, up = 1.0, 30.0 // beyond the rock that is there
	f := frame{o: r3.Vec{X: (x0 + x1) / 2}, a: r3.Vec{X: 1}, b: r3.Vec{Y: -1}, n: r3.Vec{Z: 1}}
	half := (x1 - x0) / 2
	t := newPrism(name, f, profile{
		{-y - out, z - out*rise}, {-backY, backZ}, {-backY + up*cot, backZ + up}, {-y - out, backZ + up},
	}, half)
	t.cut = true
	b.features = append(b.features, t)
	corner := func(x, y, z float64) Position { return position(b.site.toWorld(r3.Vec{X: x, Y: y, Z: z})) }
	const person = 0.4 // m, radius
	a := math.Atan2(1, cot)
	riser := frame{
		o: r3.Vec{X: f.o.X, Y: y, Z: z}, a: f.a,
		b: r3.Vec{Y: -math.Cos(a), Z: math.Sin(a)}, n: r3.Vec{Y: math.Sin(a), Z: math.Cos(a)},
	}
	high := bisect(0, up, func(t float64) float64 { return b.cliff.crest.distance(riser.at(0, t, 0)) })
	b.truth.Ledges = append(b.truth.Ledges, Ledge{
		Name:    name,
		Corners: [4]Position{corner(x0, y, z), corner(x1, y, z), corner(x1, backY, backZ), corner(x0, backY, backZ)},
		Bay:     b.box(riser, half, 0, high, -depth*math.Sin(a), 0),
		DepthM:  depth, LengthM: x1 - x0, InclinationDeg: deg,
		FitsPerson: depth >= 2*person+0.2 && x1-x0 >= 2*person && deg <= 25,
	})
	return backY, backZ
}

// plane notes a part of the site that is exactly a plane.
func (b *builder) plane(name string, f frame, halfA, halfB float64) {
	n := b.site.turn(f.n)
	const thick = 0.1 // takes in all noise and nothing else
	b.truth.Planes = append(b.truth.Planes, Plane{
		Name: name, Point: position(b.site.toWorld(f.o)), Normal: position(n),
		InclinationDeg: inclinationDeg(n), DipDirectionDeg: azimuth(n),
		Box: b.box(f, halfA, -halfB, halfB, -thick, thick),
	})
}

// line notes an edge.
func (b *builder) line(name, reason string, points []r3.Vec) {
	d := Distractor{Name: name, Reason: reason}
	for _, p := range points {
		d.Line = append(d.Line, position(b.site.toWorld(p)))
	}
	b.truth.Distractors = append(b.truth.Distractors, d)
}
