package hazards

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// reach is the horizontal distance from lip to back of an overhanging set, in
// metres: the greatest extent along the outward azimuth of the face, within one
// vertical slice three spacings wide. Each voxel counts in the twelfth of the
// compass that its face looks to, so that a band around a pillar does not count
// the pillar. A level roof has no outward azimuth: there it is the extent across
// the roof, which a rope would have to pass at least.
func (s *Surface) reach(set []int32) float64 {
	var outs [sectors + 1]r3.Vec
	for _, i := range set {
		n := s.lookingTo(i)
		outs[sectorOf(n)] = r3.Add(outs[sectorOf(n)], r3.Vec{X: n.X, Y: n.Y})
	}
	for k := range sectors {
		outs[k] = r3.Unit(outs[k])
	}
	outs[sectors] = s.narrowest(set)

	width := 3 * s.Voxels.Lattice.SpacingM()
	origin := s.Index.Mean(int(set[0]))
	type slice struct{ sector, number int }
	type stretch struct{ low, high float64 }
	stretches := map[slice]stretch{}
	var most float64
	for _, i := range set {
		sector := sectorOf(s.lookingTo(i))
		out := outs[sector]
		d := r3.Sub(s.Index.Mean(int(i)), origin)
		along, across := d.X*out.X+d.Y*out.Y, d.X*out.Y-d.Y*out.X
		at := slice{sector, int(math.Floor(across / width))}
		e, ok := stretches[at]
		if !ok {
			e = stretch{along, along}
		}
		e = stretch{min(e.low, along), max(e.high, along)}
		stretches[at] = e
		most = max(most, e.high-e.low)
	}
	return most
}

// sectors divide the compass; one more number stands for no azimuth.
const sectors = 12

// sectorOf is the sector of the compass that a normal points to.
func sectorOf(n r3.Vec) int {
	if math.Hypot(n.X, n.Y) < levelShare {
		return sectors
	}
	return int(math.Round(math.Atan2(n.Y, n.X)*sectors/(2*math.Pi))+sectors) % sectors
}

// lookingTo is the normal of the face at voxel i, or the voxel's own where no
// face is known.
func (s *Surface) lookingTo(i int32) r3.Vec {
	if n := s.Relief.Normal[i]; n != (r3.Vec{}) {
		return n
	}
	return s.Planes.Normal[i]
}

// levelShare is the least horizontal part of a normal that tells an azimuth: it
// belongs to a roof inclined by 5°, and is well above the noise of normals.
const levelShare = 0.087

// narrowest is the horizontal direction in which a set is narrowest.
func (s *Surface) narrowest(set []int32) r3.Vec {
	origin := s.Index.Mean(int(set[0]))
	var x, y, xx, xy, yy float64
	for _, i := range set {
		d := r3.Sub(s.Index.Mean(int(i)), origin)
		x, y, xx, xy, yy = x+d.X, y+d.Y, xx+d.X*d.X, xy+d.X*d.Y, yy+d.Y*d.Y
	}
	n := float64(len(set))
	sin, cos := math.Sincos(math.Atan2(2*(xy-x*y/n), xx-x*x/n-(yy-y*y/n)) / 2)
	return r3.Vec{X: -sin, Y: cos} // across the longer principal axis
}
