package survey

import (
	"errors"
	"math"

	"ledgework/terrain"
)

// extentSteps is how finely an extent is sampled on each axis when it goes
// through a projection. The edge of a box of 100 km bows by less than 400 m in
// UTM; with 8 steps the bow is missed by a 64th of that.
const extentSteps = 8

// lattice returns the nodes of a regular grid over an extent.
func lattice(e terrain.Extent) (x, y, z []float64) {
	at := func(axis, i int) float64 {
		return e.Min[axis] + (e.Max[axis]-e.Min[axis])*float64(i)/extentSteps
	}
	for i := range extentSteps + 1 {
		for j := range extentSteps + 1 {
			for k := 0; k <= extentSteps; k += extentSteps / 2 {
				x, y, z = append(x, at(0, i)), append(y, at(1, j)), append(z, at(2, k))
			}
		}
	}
	return x, y, z
}

// errNowhere says that a projection has no place for an extent.
var errNowhere = errors.New("the transform gives no finite coordinates")

// extent brings an extent of the source into the working CRS.
func (t *Transformer) extent(e terrain.Extent) (terrain.Extent, error) {
	x, y, z := lattice(e)
	if err := t.apply(x, y, z); err != nil {
		return terrain.Extent{}, err
	}
	out := terrain.EmptyExtent()
	for i := range x {
		if finite(x[i], y[i], z[i]) {
			out.Add(x[i], y[i], z[i])
		}
	}
	if out.Empty() {
		return out, errNowhere
	}
	return out, nil
}

// moves reports whether the transform does no more to plan positions in an
// extent of the source than multiply them by unit.
func (t *Transformer) moves(e terrain.Extent, unit float64) (same bool, err error) {
	if unit <= 0 {
		return false, nil
	}
	x, y, z := lattice(e)
	px, py := append([]float64(nil), x...), append([]float64(nil), y...)
	if err := t.apply(x, y, z); err != nil {
		return false, err
	}
	for i := range x {
		if !(math.Hypot(x[i]-px[i]*unit, y[i]-py[i]*unit) <= sameM) {
			return false, nil
		}
	}
	return true, nil
}

// cellQuantumM is what lengths of a lattice are multiples of.
const cellQuantumM = 2e-4

// cell returns the longer side of a grid's square cell in the middle of the
// extent, in metres of the working CRS, rounded up to cellQuantumM; 0 for no
// grid.
func (t *Transformer) cell(e terrain.Extent, side float64) float64 {
	if side <= 0 {
		return 0
	}
	cx, cy, cz := (e.Min[0]+e.Max[0])/2, (e.Min[1]+e.Max[1])/2, (e.Min[2]+e.Max[2])/2
	x := []float64{cx - side/2, cx + side/2, cx, cx}
	y := []float64{cy, cy, cy - side/2, cy + side/2}
	z := []float64{cz, cz, cz, cz}
	if err := t.apply(x, y, z); err != nil {
		return 0
	}
	return roundUp(max(math.Hypot(x[1]-x[0], y[1]-y[0]), math.Hypot(x[3]-x[2], y[3]-y[2])), cellQuantumM)
}

// roundUp returns the smallest multiple of step that is not below v, taking a
// v within a millionth of a step for the multiple.
func roundUp(v, step float64) float64 {
	const slack = 1e-6
	return math.Ceil(v/step-slack) / math.Round(1/step)
}

// middle is the middle of all sources that have a place on earth, in degrees.
func middle(probes []*probe) (lon, lat float64, err error) {
	box := terrain.EmptyExtent()
	for _, p := range probes {
		if p.system.kind == local {
			continue
		}
		x, y, z := lattice(p.extent)
		if err := lonLat(p.system, x, y, z); err != nil {
			return 0, 0, placeError(p.src.Path, "its coordinates have no place on earth: "+err.Error(), "check its CRS")
		}
		for i := range x {
			if finite(x[i], y[i], 0) {
				// Sources on both sides of 180° stay together.
				if !box.Empty() && x[i]-box.Min[0] > 180 {
					x[i] -= 360
				} else if !box.Empty() && box.Min[0]-x[i] > 180 {
					x[i] += 360
				}
				box.Add(x[i], y[i], 0)
			}
		}
	}
	if box.Empty() {
		return 0, 0, errors.New("survey: the coordinates have no place on earth; check the CRS")
	}
	return (box.Min[0] + box.Max[0]) / 2, (box.Min[1] + box.Max[1]) / 2, nil
}

// lonLat turns coordinates of a system into degrees, in place.
func lonLat(s system, x, y, z []float64) error {
	t, err := s.toWGS84()
	if err != nil {
		return err
	}
	err = passed(t.Apply(x, y, z))
	return errors.Join(err, t.Close())
}

// scaleError is how much the scale of a projected system is off in the middle
// of an extent: the larger of |k−1| along its two axes, k being distance on
// the map by distance on the ellipsoid, from positions baseM apart.
func scaleError(s system, e terrain.Extent) (float64, error) {
	const baseM = 100.0
	half := baseM / 2 / s.unit
	cx, cy := (e.Min[0]+e.Max[0])/2, (e.Min[1]+e.Max[1])/2
	x := []float64{cx - half, cx + half, cx, cx}
	y := []float64{cy, cy, cy - half, cy + half}
	if err := lonLat(s, x, y, nil); err != nil {
		return 0, err
	}
	worst := 0.0
	for i := 0; i < 4; i += 2 {
		d := ground(x[i], y[i], x[i+1], y[i+1])
		if !finite(d, 0, 0) || d == 0 {
			return 0, errNowhere
		}
		worst = max(worst, abs(baseM/d-1))
	}
	return worst, nil
}

// ground is the distance in metres between two near places in degrees on the
// WGS 84 ellipsoid, by the radii of curvature at the middle latitude: good to
// 1e-6 of it over a few hundred metres.
func ground(lon1, lat1, lon2, lat2 float64) float64 {
	const (
		a  = 6378137.0             // NGA.STND.0036, WGS 84
		e2 = 0.0066943799901413165 // its first eccentricity squared
	)
	sin, cos := math.Sincos((lat1 + lat2) / 2 * math.Pi / 180)
	w := 1 - e2*sin*sin
	prime, meridian := a/math.Sqrt(w), a*(1-e2)/(w*math.Sqrt(w))
	dlon := math.Remainder(lon2-lon1, 360)
	return math.Hypot(dlon*cos*prime, (lat2-lat1)*meridian) * math.Pi / 180
}
