package export

import (
	"fmt"
	"math"
	"slices"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/clip/smartclip"
	"github.com/paulmach/orb/encoding/wkb"
	"github.com/paulmach/orb/planar"

	"ledgework/terrain/gdal"
)

// lonLatPerDegree is the resolution of written longitudes and latitudes: 9
// decimals, 0.11 mm along a meridian.
const lonLatPerDegree = 1e9

// A globe is a shape in longitude and latitude, in degrees rounded to 9
// decimals, cut where it crosses the antimeridian. Outer rings are
// counter-clockwise, holes clockwise.
type globe struct {
	polygons orb.MultiPolygon
	heights  [][][]float64 // one for each position
	box      box
}

// A box is an extent of longitude, latitude and height. Longitudes are
// unwrapped: they run on past ±180 instead of jumping.
type box struct {
	min, max [3]float64
}

func emptyBox() box {
	inf := math.Inf(1)
	return box{min: [3]float64{inf, inf, inf}, max: [3]float64{-inf, -inf, -inf}}
}

func (b *box) empty() bool { return b.min[0] > b.max[0] }

func (b *box) add(lon, lat, h float64) {
	for i, v := range [3]float64{lon, lat, h} {
		b.min[i], b.max[i] = min(b.min[i], v), max(b.max[i], v)
	}
}

// union grows b to enclose o, moved by whole turns to where it lies closest.
func (b *box) union(o box) {
	if b.empty() {
		*b = o
		return
	}
	if o.empty() {
		return
	}
	turn := 360 * math.Round((b.min[0]+b.max[0]-o.min[0]-o.max[0])/720)
	b.add(o.min[0]+turn, o.min[1], o.min[2])
	b.add(o.max[0]+turn, o.max[1], o.max[2])
}

// wrapped returns the six values of RFC 7946, section 5: west, south, least
// height, east, north, greatest height. Over the antimeridian west exceeds
// east (section 5.2); right round a pole it is the full circle (section 5.3).
func (b *box) wrapped() [6]float64 {
	w, e := -180.0, 180.0
	if b.max[0]-b.min[0] < 360 {
		w, e = b.min[0]-360*math.Floor((b.min[0]+180)/360), b.max[0]-360*math.Ceil((b.max[0]-180)/360)
	}
	return [6]float64{roundLonLat(w), b.min[1], b.min[2], roundLonLat(e), b.max[1], b.max[2]}
}

func roundLonLat(v float64) float64 { return math.Round(v*lonLatPerDegree) / lonLatPerDegree }

// toGlobe projects a shape.
func toGlobe(s shape, p Projector) (globe, error) {
	var x, y, z []float64
	for _, polygon := range s {
		for _, r := range polygon {
			for _, v := range r {
				x, y, z = append(x, v.E), append(y, v.N), append(z, v.H)
			}
		}
	}
	if err := p.ToWGS84(x, y, z); err != nil {
		return globe{}, err
	}
	g := globe{box: emptyBox()}
	for i := range x {
		if !(math.Abs(x[i]) <= 540 && math.Abs(y[i]) <= 90) || math.IsNaN(z[i]) || math.IsInf(z[i], 0) {
			return globe{}, fmt.Errorf("the working coordinates have no place on Earth: longitude %g, latitude %g, height %g", x[i], y[i], z[i])
		}
		x[i], y[i] = roundLonLat(x[i]), roundLonLat(y[i])
	}
	for _, polygon := range s {
		rings, heights := make(orb.Polygon, len(polygon)), make([][]float64, len(polygon))
		for i, r := range polygon {
			n := len(r)
			rings[i], heights[i] = unwrap(x[:n], y[:n], z[:n])
			x, y, z = x[n:], y[n:], z[n:]
		}
		g.add(rings, heights)
	}
	return g, nil
}

// unwrap makes a ring of which no edge spans more than half a turn. One that
// goes right round a pole is cut at the antimeridian and led along the pole, so
// that it encloses it.
func unwrap(lon, lat, height []float64) (orb.Ring, []float64) {
	r, h := make(orb.Ring, 0, len(lon)+4), slices.Clone(height)
	last := lon[0]
	for i := range lon {
		last = lon[i] + 360*math.Round((last-lon[i])/360)
		r = append(r, orb.Point{roundLonLat(last), lat[i]})
	}
	if r[0] == r[len(r)-1] {
		return r, h
	}
	return roundPole(lon, lat, h)
}

// roundPole is the ring in longitudes -180 to 180 of a closed sequence of
// positions that goes round a pole once.
func roundPole(lon, lat, height []float64) (orb.Ring, []float64) {
	n := len(lon) - 1 // without the repeated first one
	seam := 0         // the first position after the antimeridian
	for i := range n {
		if math.Abs(lon[i]-lon[(i+n-1)%n]) > 180 {
			seam = i
			break
		}
	}
	before := (seam + n - 1) % n
	side := math.Copysign(180, lon[before])
	// Where the edge from before to seam meets the antimeridian.
	share := 0.0
	if gap := lon[seam] + 2*side - lon[before]; gap != 0 {
		share = (side - lon[before]) / gap
	}
	cut, cutHeight := lat[before]+share*(lat[seam]-lat[before]), height[before]+share*(height[seam]-height[before])
	pole := math.Copysign(90, lat[0])

	r, h := orb.Ring{{-side, cut}}, []float64{cutHeight}
	for i := range n {
		at := (seam + i) % n
		r, h = append(r, orb.Point{lon[at], lat[at]}), append(h, height[at])
	}
	r = append(r, orb.Point{side, cut}, orb.Point{side, pole}, orb.Point{-side, pole}, r[0])
	return r, append(h, cutHeight, cutHeight, cutHeight, cutHeight)
}

// add appends a polygon with unwrapped longitudes, cut at the antimeridian.
func (g *globe) add(rings orb.Polygon, heights [][]float64) {
	b := emptyBox()
	for j, p := range rings[0] {
		b.add(p[0], p[1], heights[0][j])
	}
	// A hole may have been unwrapped a turn away from its polygon.
	for i, r := range rings {
		turn := 360 * math.Round(((b.min[0]+b.max[0])/2-r[0][0])/360)
		for j := range r {
			if i > 0 {
				r[j][0] += turn
			}
			b.add(r[j][0], r[j][1], heights[i][j])
		}
		direct(r, heights[i], i == 0)
	}
	g.box.union(b)

	first, last := math.Floor((b.min[0]+180)/360), math.Ceil((b.max[0]-180)/360)
	if first == last {
		g.append(rings, heights, -360*first)
		return
	}
	at := make(map[orb.Point]float64)
	for i, r := range rings {
		for j, p := range r {
			at[p] = heights[i][j]
		}
	}
	for k := first; k <= last; k++ {
		window := orb.Bound{Min: orb.Point{360*k - 180, -91}, Max: orb.Point{360*k + 180, 91}}
		for _, piece := range smartclip.Polygon(window, rings.Clone(), orb.CCW) {
			g.append(piece, heightsOf(piece, at, rings[0], heights[0]), -360*k)
		}
	}
}

// heightsOf looks the positions of a cut polygon up; a position that the cut
// made takes the height of the nearest corner of the outer ring.
func heightsOf(piece orb.Polygon, at map[orb.Point]float64, outer orb.Ring, outerHeights []float64) [][]float64 {
	heights := make([][]float64, len(piece))
	for i, r := range piece {
		heights[i] = make([]float64, len(r))
		for j, p := range r {
			h, ok := at[p]
			if !ok {
				nearest := math.Inf(1)
				for k, q := range outer {
					if d := math.Hypot(p[0]-q[0], p[1]-q[1]); d < nearest {
						nearest, h = d, outerHeights[k]
					}
				}
			}
			heights[i][j] = h
		}
	}
	return heights
}

// append adds a polygon with its longitudes moved by turn, rounded, without
// repeated positions. What has no area is left out.
func (g *globe) append(rings orb.Polygon, heights [][]float64, turn float64) {
	var outRings orb.Polygon
	var outHeights [][]float64
	for i, r := range rings {
		var ring orb.Ring
		var hs []float64
		for j, p := range r {
			p = orb.Point{roundLonLat(p[0] + turn), roundLonLat(p[1])}
			if len(ring) == 0 || p != ring[len(ring)-1] {
				ring, hs = append(ring, p), append(hs, heights[i][j])
			}
		}
		if len(ring) < 4 || ring.Orientation() == 0 {
			if i == 0 {
				return
			}
			continue
		}
		hs[len(hs)-1] = hs[0]
		direct(ring, hs, i == 0)
		outRings, outHeights = append(outRings, ring), append(outHeights, hs)
	}
	g.polygons, g.heights = append(g.polygons, outRings), append(g.heights, outHeights)
}

// direct turns a ring counter-clockwise if it is an outer one, else clockwise.
func direct(r orb.Ring, heights []float64, outer bool) {
	want := orb.CW
	if outer {
		want = orb.CCW
	}
	if r.Orientation() == -want {
		r.Reverse()
		slices.Reverse(heights)
	}
}

// check asks whether the geometry is valid as written.
func (g *globe) check(valid ValidityCheck) (ok bool, reason string, err error) {
	if len(g.polygons) == 0 {
		return false, "no area is left", nil
	}
	b, err := wkb.Marshal(g.polygons)
	if err != nil {
		return false, "", err
	}
	return valid(b)
}

// maxAreaChange is the relative change of area up to which a repaired outline
// counts as the same. Splitting moves no corner, so the change is rounding: an
// ulp of a longitude near 180 is 6e-7 of the smallest cell, 5 mm.
const maxAreaChange = 1e-6

// repaired is g made valid by GEOS: what touches itself after the cut at the
// antimeridian is split. It is not ok if the area changes.
func (g *globe) repaired() (out globe, ok bool, err error) {
	if len(g.polygons) == 0 {
		return globe{}, false, nil
	}
	b, err := wkb.Marshal(g.polygons)
	if err != nil {
		return globe{}, false, err
	}
	if b, err = gdal.MakeValid(b); err != nil {
		return globe{}, false, err
	}
	geometry, err := wkb.Unmarshal(b)
	if err != nil {
		return globe{}, false, err
	}
	at := make(map[orb.Point]float64)
	var outer orb.Ring
	var outerHeights []float64
	for i, polygon := range g.polygons {
		outer, outerHeights = append(outer, polygon[0]...), append(outerHeights, g.heights[i][0]...)
		for j, r := range polygon {
			for k, p := range r {
				at[p] = g.heights[i][j][k]
			}
		}
	}
	out = globe{box: g.box}
	for _, polygon := range polygonsOf(geometry) {
		heights := heightsOf(polygon, at, outer, outerHeights)
		for i, r := range polygon {
			direct(r, heights[i], i == 0)
		}
		out.append(polygon, heights, 0)
	}
	before, after := planar.Area(g.polygons), planar.Area(out.polygons)
	return out, math.Abs(after-before) <= maxAreaChange*before, nil
}

// polygonsOf are the polygons in a geometry; lines and points are left out.
func polygonsOf(g orb.Geometry) orb.MultiPolygon {
	switch g := g.(type) {
	case orb.Polygon:
		return orb.MultiPolygon{g}
	case orb.MultiPolygon:
		return g
	case orb.Collection:
		var out orb.MultiPolygon
		for _, part := range g {
			out = append(out, polygonsOf(part)...)
		}
		return out
	}
	return nil
}
