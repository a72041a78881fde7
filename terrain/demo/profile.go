package demo

import "math"

// A profile is a convex polygon of (up, out) pairs in a face's frame,
// anticlockwise. What lies outside the face (out > 0) of a block, or inside
// (out < 0) of a cut, is what can be seen of it.
type profile = [][2]float64

// rootedM is by how much a block reaches into the face, a cut out of it.
const rootedM = 0.5

// prowProfile is a block that overhangs nowhere on a face of the given
// inclination: it swells out of the face with an underside that is just
// vertical. It has a top of length flat and slopes back over the length above.
func prowProfile(proud, flat, above, faceDeg float64) profile {
	below := proud * math.Tan(faceDeg*math.Pi/180)
	lo, hi := -flat/2-below, flat/2+above
	return profile{{lo, -rootedM}, {hi, -rootedM}, {hi, 0}, {flat / 2, proud}, {-flat / 2, proud}, {lo, 0}}
}

// undercutProfile is a block whose underside hangs over: its lip lies the
// given length further up the face than its root.
func undercutProfile(proud, high, lip float64) profile {
	return profile{
		{-high / 2, -rootedM}, {high / 2, -rootedM}, {high / 2, 0},
		{high/2 - 0.2, proud}, {lip - high/2, proud}, {-high / 2, 0},
	}
}

// recessProfile is a hollow without a roof, open upwards in a face of faceDeg:
// its back is vertical above a flat part. Its floor slopes over the length
// below.
func recessProfile(deep, flat, below float64) profile {
	up := 1 / math.Tan((90-faceDeg)*math.Pi/180)
	out := rootedM
	return profile{{0, -deep}, {flat, -deep}, {flat + up*(deep+out), out}, {-below * (1 + out/deep), out}}
}

// nicheProfile is a hollow from lo to hi with a roof at hi that is
// perpendicular to the face and a floor that slopes over the length below.
func nicheProfile(deep, lo, hi, below float64) profile {
	out := rootedM
	return profile{{lo, -deep}, {hi, -deep}, {hi, out}, {lo - below*(1+out/deep), out}}
}

// undercutNotch is a roof over a back that leans into the face.
func undercutNotch(deep, high float64) profile {
	out := rootedM
	return profile{{0, -deep}, {0, out}, {-high * (1 + out/deep), out}}
}

// scarProfile is the shallow hollow that a fallen block of the given profile
// leaves.
func scarProfile(block profile, deep float64) profile {
	lo, hi := extent(visible(block, false))
	const slope = 3.0 // run of its rims over depth
	out := rootedM
	return profile{
		{lo[0] + slope*deep, -deep}, {hi[0] - slope*deep, -deep},
		{hi[0] + slope*out, out}, {lo[0] - slope*out, out},
	}
}

// shifted is the profile moved out of the face.
func shifted(p profile, out float64) profile {
	q := make(profile, len(p))
	for i := range p {
		q[i] = [2]float64{p[i][0], p[i][1] + out}
	}
	return q
}

// visible is the part of the profile outside the face, or inside for a cut.
func visible(p profile, cut bool) profile {
	sign := 1.0
	if cut {
		sign = -1
	}
	var q profile
	for i, a := range p {
		c := p[(i+1)%len(p)]
		ha, hc := sign*a[1], sign*c[1]
		if ha >= 0 {
			q = append(q, a)
		}
		if ha*hc < 0 {
			t := ha / (ha - hc)
			q = append(q, [2]float64{a[0] + t*(c[0]-a[0]), 0})
		}
	}
	return q
}

// extent is the bounding box of the profile.
func extent(p profile) (lo, hi [2]float64) {
	lo, hi = p[0], p[0]
	for _, a := range p {
		for i := range 2 {
			lo[i], hi[i] = min(lo[i], a[i]), max(hi[i], a[i])
		}
	}
	return lo, hi
}

// areaOf is the area of the profile, by the shoelace formula.
func areaOf(p profile) float64 {
	sum := 0.0
	for i, a := range p {
		c := p[(i+1)%len(p)]
		sum += a[0]*c[1] - a[1]*c[0]
	}
	return sum / 2
}

// overhangDeg is the inclination beyond which a surface is said to overhang.
const overhangDeg = 95.0

// A roof is the overhanging part of a profile.
type roof struct {
	reach  float64 // horizontal
	length float64 // of the underside
	lo, hi [2]float64
}

// roofOf measures what of the visible profile overhangs on the frame's face.
// In a convex profile that is one run of edges.
func roofOf(p profile, f frame, cut bool) roof {
	v := visible(p, cut)
	_, limit := sincosDeg(overhangDeg)
	var edge profile
	var r roof
	for i, a := range v {
		c := v[(i+1)%len(v)]
		db, dn := c[0]-a[0], c[1]-a[1]
		length := math.Hypot(db, dn)
		if length == 0 || a[1] == 0 && c[1] == 0 {
			continue // the face itself
		}
		z := (dn*f.b.Z - db*f.n.Z) / length
		if cut {
			z = -z
		}
		if z < limit {
			edge = append(edge, a, c)
			r.length += length
		}
	}
	if edge == nil {
		return roof{}
	}
	horizontal := func(a [2]float64) float64 {
		return a[1]*math.Hypot(f.n.X, f.n.Y) - a[0]*math.Hypot(f.b.X, f.b.Y)
	}
	lo, hi := horizontal(edge[0]), horizontal(edge[0])
	for _, a := range edge {
		lo, hi = min(lo, horizontal(a)), max(hi, horizontal(a))
	}
	r.reach = hi - lo
	r.lo, r.hi = extent(edge)
	return r
}
