package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Names of the blocks that change between the seasons.
const (
	fallenProw    = "Prow"
	fallenLantern = "Lantern"
	fallenStone   = "Brow Stone"
	leaningAnvil  = "Anvil"
	leanM         = 0.06 // by which the Anvil leans out in season 2
)

// build makes the site of the season.
func (b *builder) build() {
	b.ledges()
	b.mainFace()
	b.bend()
	b.westWall()
	b.gentleGround()
	b.belowThreshold()
	b.planes()
	b.edges()
}

// mainFace has its features on the plane part, 70°.
func (b *builder) mainFace() {
	at := b.cliff.onMain
	prow := prowProfile(0.60, 0.60, 0.5, faceDeg)
	if b.season == 1 {
		b.block(fallenProw, bulge, at(6.5, 5), prow, 0.80)
	} else {
		b.fallen(fallenProw, at(6.5, 5), prow, 0.80, 0.15)
	}
	b.niche("Cove", at(12, 4.2), recessProfile(0.60, 0.60, 0.5), 0.70)
	b.boss("Loaf", at(14.5, 11.5), 1.2, 0.9, 0.70)

	// The underside rises inwards less than the face's normal does.
	anvil := undercutProfile(1.00, 1.30, 0.27)
	if b.season == 2 {
		b.leaning(leaningAnvil, at(18.5, 5.5), anvil, 0.90, leanM)
	} else {
		b.block(leaningAnvil, overhangingBulge, at(18.5, 5.5), anvil, 0.90)
	}
	b.roofedNiche("Gullet", at(20.5, 12), nicheProfile(0.80, -0.6, 0.8, 0.7), 0.90)
}

// bend has its features on the cone.
func (b *builder) bend() {
	at := b.cliff.onMain
	b.boss("Kettle", at(28, 5.5), 0.9, 0.8, 0.65)
	b.block("Fin", bulge, at(27.5, 11.5), prowProfile(0.48, 0.7, 0.4, faceDeg), 0.60)
	b.niche("Pocket", at(34, 5), recessProfile(0.55, 0.50, 0.4), 0.65)
	b.undercut("Stoop", at(25.5, 16.2), undercutNotch(0.30, 1.0), 1.25)
	b.block("Quoin", bulge, at(b.cornerArc(8)-0.53, 8), prowProfile(0.50, 0.5, 0.3, faceDeg), 0.40)
	b.shrub = at(35, 15.5).moved(0, 0, 0.45)
	b.truth.Scatter = append(b.truth.Scatter, Scatter{
		Name: "Shrub", Centre: position(b.site.toWorld(b.shrub.o)), RadiusM: shrubRadiusM,
	})
}

// westWall has its features on the two faces of 84°.
func (b *builder) westWall() {
	wall, side := b.cliff.wall, b.cliff.side
	lantern := undercutProfile(0.70, 1.40, 0.19)
	if b.season == 1 {
		b.block(fallenLantern, overhangingBulge, onPlane(wall, 59.5, 0, 5.5), lantern, 0.70)
	} else {
		b.fallen(fallenLantern, onPlane(wall, 59.5, 0, 5.5), lantern, 0.70, 0.12)
	}
	b.undercut("Eave", onPlane(wall, 60, 0, 14), undercutNotch(0.30, 1.0), 1.50)
	b.roofedNiche("Slot", onPlane(side, 0, -10.3, 12), nicheProfile(0.60, -0.5, 0.7, 0.5), 0.60)
}

// gentleGround has what lies on the crest slope and the platform.
func (b *builder) gentleGround() {
	stone := prowProfile(0.70, 1.0, 0.3, crestDeg)
	edge := b.cliff.onMain(18.5, crestZ).o
	place := onPlane(b.cliff.crest, edge.X, edge.Y-1.4, 0)
	if b.season == 1 {
		b.block(fallenStone, bulge, place, stone, 0.60)
	} else {
		b.fallen(fallenStone, place, stone, 0.60, 0)
	}
	b.boss("Stray Boulder", onPlane(b.cliff.platform, 15.5, 2.6, 0), 0.9, 0.7, 0.80)
	if b.season == 2 {
		b.boss("Prow Boulder", onPlane(b.cliff.platform, 8.5, 5.5, 0), 0.75, 0.65, 0.60)
		o := b.truth.Obstacles[len(b.truth.Obstacles)-1]
		b.truth.Changes = append(b.truth.Changes, Change{
			Name: o.Name, Kind: gain, VolumeM3: o.VolumeM3, DepthM: o.HeightM, Box: o.Box,
		})
	}
}

// belowThreshold has what is too small to be an obstacle.
func (b *builder) belowThreshold() {
	at := b.cliff.onMain
	b.tooSmall("Low Slab", "0.15 m proud", at(15.5, 16.3),
		newPrism("Low Slab", at(15.5, 16.3), prowProfile(0.15, 1.0, 0.2, faceDeg), 0.75), 0.15)
	b.tooSmall("Blister", "0.2 m² and 0.25 m proud", at(31, 8.3),
		newEllipsoid("Blister", at(31, 8.3), 0.25, 0.25, 0.25), 0.25)
	b.tooSmall("Spike", "0.05 m² and 0.36 m proud", onPlane(b.cliff.wall, 43.8, 0, 9.5),
		newEllipsoid("Spike", onPlane(b.cliff.wall, 43.8, 0, 9.5), 0.12, 0.12, 0.36), 0.36)
	b.tooSmall("Pebble", "0.18 m high", onPlane(b.cliff.platform, 38, 7, 0),
		newEllipsoid("Pebble", onPlane(b.cliff.platform, 38, 7, 0), 0.4, 0.3, 0.18), 0.18)
	dish := newPrism("Dish", at(38, 14), recessProfile(0.20, 0.8, 0.4), 0.60)
	dish.cut = true
	b.tooSmall("Dish", "0.20 m deep", at(38, 14), dish, 0.20)
}

// ledges come first: whatever stands on a face is put there after its ledges
// were cut.
func (b *builder) ledges() {
	cot := func(deg float64) float64 { s, c := sincosDeg(deg); return c / s }
	face, wall := cot(faceDeg), cot(wallDeg)
	// Each riser is parallel to the face it is cut from. The next ledge of a
	// flight starts on the riser of the last.
	y, z := b.ledge("Narrow Step", -4.5, 3.5, -4.5*face, 4.5, 0.5, 5, face)
	b.ledge("East Step", -4, 3, y-(10-z)*face, 10, 2.2, 6, face)
	b.ledge("Top Step", 5, 12, -16.4*face, 16.4, 1.2, 3, face)
	y, z = b.ledge("Gannet Ledge", 46.5, 56, wallY-8*wall, 8, 1.6, 4, wall)
	b.ledge("Upper Gannet", 48, 54.5, y-(15-z)*wall, 15, 1.3, 8, wall)
}

// planes are parts without features; a test fits them.
func (b *builder) planes() {
	k := &b.cliff
	b.plane("east face", k.onMain(8.3, 12), 3.0, 2.7)
	b.plane("west wall", onPlane(k.wall, 51.5, 0, 4.2), 4.0, 3.0)
	b.plane("side face", onPlane(k.side, 0, -8.7, 4.5), 2.2, 2.2)
	b.plane("platform", onPlane(k.platform, 28, 5, 0), 4.0, 3.5)
	b.plane("crest slope", onPlane(k.crest, 23, -14, 0), 4.0, 3.5)
}

// edges are where faces meet and the undulation: no obstacles.
func (b *builder) edges() {
	k := &b.cliff
	const least, most = -6.0, 64.0
	var crest, foot, corner, wallCrest, wallFoot, inner []r3.Vec
	for s := least; s <= b.cornerArc(21); s += 2 {
		crest = append(crest, b.meet(s, k.crest))
		foot = append(foot, b.meet(s, k.platform))
	}
	for z := 0.0; z <= 22; z += 2 {
		corner = append(corner, k.onMain(b.cornerArc(z), z).o)
		_, c := sincosDeg(wallDeg)
		lean := z * c / math.Sqrt(1-c*c)
		inner = append(inner, r3.Vec{X: k.cornerX - lean, Y: wallY - lean, Z: z})
	}
	for _, x := range []float64{k.cornerX, most} {
		for _, edge := range []struct {
			line  *[]r3.Vec
			plane halfSpace
		}{{&wallCrest, k.crest}, {&wallFoot, k.platform}} {
			// Heights at which the wall is below and above the other plane.
			f := func(z float64) r3.Vec { return onPlane(k.wall, x, 0, z).o }
			*edge.line = append(*edge.line, f(bisect(0, 30, func(z float64) float64 { return edge.plane.distance(f(z)) })))
		}
	}
	b.line("crest", "slope edge", crest)
	b.line("foot", "slope foot", foot)
	b.line("corner", "convex corner of two faces", corner)
	b.line("inner corner", "concave corner of two faces", inner)
	b.line("wall crest", "slope edge", wallCrest)
	b.line("wall foot", "slope foot", wallFoot)

	f := k.onMain(bendX+10.75, 15)
	box := b.box(f, 6.5, -7.5, 7.5, -0.4, 0.4)
	b.truth.Distractors = append(b.truth.Distractors, Distractor{
		Name: "undulation", Reason: "amplitude 0.1 m, wavelengths 13 m and 14 m", Box: &box,
	})
}

// meet is the point of the main face at s that lies in the plane.
func (b *builder) meet(s float64, h halfSpace) r3.Vec {
	z := bisect(-2, 30, func(z float64) float64 { return h.distance(b.cliff.onMain(s, z).o) })
	return b.cliff.onMain(s, z).o
}

// cornerArc is the arc length along the foot at which the main face meets the
// side face, at height z.
func (b *builder) cornerArc(z float64) float64 {
	return bisect(bendX, bendX+1.2*bendR*bendAngle, func(s float64) float64 {
		return b.cliff.side.distance(b.cliff.onMain(s, z).o)
	})
}

// bisect finds the zero of a rising function between lo and hi.
func bisect(lo, hi float64, f func(float64) float64) float64 {
	for range 60 { // 2^-60 of 60 m is below the spacing of float64
		mid := (lo + hi) / 2
		if f(mid) < 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2
}
