package survey

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"

	"github.com/paulmach/orb"

	"ledgework/terrain/gdal"
)

// A Crop is an area of the working CRS that points must lie in. It may be used
// by several goroutines.
type Crop struct {
	bound orb.Bound
	areas orb.MultiPolygon
	rows  [][]edge // edges by row of the bound; nil for a box
	scale float64  // rows per metre north
}

// An edge is a segment of a ring, from its lower end up, and the number of the
// polygon it belongs to.
type edge struct {
	x0, y0, y1, slope float64
	polygon           int
}

// CropBox returns the crop of a box [Emin, Nmin, Emax, Nmax] in metres of the
// working CRS, edges included.
func CropBox(box [4]float64) (*Crop, error) {
	if !finite(box[0], box[1], 0) || !finite(box[2], box[3], 0) || box[0] >= box[2] || box[1] >= box[3] {
		return nil, fmt.Errorf("survey: crop [%g, %g, %g, %g] encloses nothing; give [Emin, Nmin, Emax, Nmax]", box[0], box[1], box[2], box[3])
	}
	b := orb.Bound{Min: orb.Point{box[0], box[1]}, Max: orb.Point{box[2], box[3]}}
	return &Crop{bound: b, areas: orb.MultiPolygon{b.ToPolygon()}}, nil
}

// CropFile reads the polygons of a vector file that GDAL opens and brings them
// into the working CRS of frame, vertex by vertex. A file without a CRS is
// taken to be in it.
func CropFile(path string, frame *Frame) (*Crop, error) {
	blobs, crs, err := gdal.ReadPolygons(path)
	if err != nil {
		return nil, fmt.Errorf("%s: survey: crop: %w", path, err)
	}
	var areas orb.MultiPolygon
	for _, blob := range blobs {
		if areas, err = appendWKB(areas, blob); err != nil {
			return nil, fmt.Errorf("%s: survey: crop: %w", path, err)
		}
	}
	if crs != "" {
		if err := project(areas, crs, frame); err != nil {
			return nil, fmt.Errorf("%s: survey: crop: %w", path, err)
		}
	}
	c, err := newCrop(areas)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	return c, nil
}

// project brings areas from a CRS into the working CRS, in place.
func project(areas orb.MultiPolygon, crs string, frame *Frame) error {
	if frame.Local {
		return errNoCRS
	}
	s, err := parseSystem(crs)
	if err != nil {
		return err
	}
	t, err := s.transformTo(frame.work)
	if err != nil {
		return err
	}
	defer t.Close()
	for _, polygon := range areas {
		for _, ring := range polygon {
			x, y := make([]float64, len(ring)), make([]float64, len(ring))
			for i, p := range ring {
				x[i], y[i] = p[0], p[1]
			}
			if err := t.Apply(x, y, nil); err != nil {
				return err
			}
			for i := range ring {
				ring[i] = orb.Point{x[i], y[i]}
			}
		}
	}
	return nil
}

// maxRows and rowsPerEdge bound the index: no more rows than edges, and no
// edge in more than rowsPerEdge rows on average.
const (
	maxRows     = 1 << 14
	rowsPerEdge = 8
)

// newCrop indexes polygons, whose first ring is the outer one.
func newCrop(areas orb.MultiPolygon) (*Crop, error) {
	c := &Crop{bound: areas.Bound(), areas: areas}
	var edges []edge
	for n, polygon := range areas {
		for _, ring := range polygon {
			for i, p := range ring {
				q := ring[(i+1)%len(ring)] // closed, if it isn't
				if !finite(p[0], p[1], 0) {
					return nil, errors.New("survey: crop: a coordinate is not finite; repair the polygon")
				}
				if p[1] == q[1] {
					continue
				}
				if p[1] > q[1] {
					p, q = q, p
				}
				edges = append(edges, edge{x0: p[0], y0: p[1], y1: q[1], slope: (q[0] - p[0]) / (q[1] - p[1]), polygon: n})
			}
		}
	}
	height := c.bound.Max[1] - c.bound.Min[1]
	if len(edges) == 0 || !(height > 0) || c.bound.Max[0] <= c.bound.Min[0] {
		return nil, errors.New("survey: crop: the polygons enclose nothing; draw an area")
	}
	climb := 0.0
	for _, e := range edges {
		climb += e.y1 - e.y0
	}
	n := max(1, min(maxRows, len(edges), int(rowsPerEdge*float64(len(edges))*height/climb)))
	c.rows = make([][]edge, n)
	c.scale = float64(n) / height
	for _, e := range edges {
		for row := c.row(e.y0); row <= c.row(e.y1); row++ {
			c.rows[row] = append(c.rows[row], e)
		}
	}
	return c, nil
}

// row is the row of the index that a northing within the bound falls into.
func (c *Crop) row(y float64) int {
	return min(max(0, int((y-c.bound.Min[1])*c.scale)), len(c.rows)-1)
}

// Contains reports whether a place lies in the crop: in any of its polygons and
// not in a hole of it, by counting edges to the west of it. A place on an edge
// of a polygon may go either way.
func (c *Crop) Contains(x, y float64) bool {
	if !(x >= c.bound.Min[0] && x <= c.bound.Max[0] && y >= c.bound.Min[1] && y <= c.bound.Max[1]) {
		return false
	}
	if c.rows == nil {
		return true
	}
	inside, polygon := false, -1
	for i := range c.rows[c.row(y)] {
		e := &c.rows[c.row(y)][i]
		if e.polygon != polygon { // edges of one polygon stand together
			if inside {
				return true
			}
			polygon = e.polygon
		}
		if y >= e.y0 && y < e.y1 && x > e.x0+(y-e.y0)*e.slope {
			inside = !inside
		}
	}
	return inside
}

// Area returns the polygons of the crop, in the working CRS. They must not be
// changed.
func (c *Crop) Area() orb.MultiPolygon { return c.areas }

// appendWKB adds the polygons of an ISO WKB polygon or multipolygon, little
// endian and of any dimension, without their heights.
func appendWKB(to orb.MultiPolygon, b []byte) (orb.MultiPolygon, error) {
	r := wkbReader{b: b}
	if err := r.geometry(&to, 0); err != nil {
		return nil, err
	}
	return to, nil
}

// A wkbReader reads WKB (OGC 06-103r4, section 8).
type wkbReader struct{ b []byte }

var errWKB = errors.New("survey: crop: the geometry is damaged or no polygon")

func (r *wkbReader) uint32() (uint32, bool) {
	if len(r.b) < 4 {
		return 0, false
	}
	v := binary.LittleEndian.Uint32(r.b)
	r.b = r.b[4:]
	return v, true
}

func (r *wkbReader) geometry(to *orb.MultiPolygon, depth int) error {
	const polygon, multi = 3, 6
	if len(r.b) < 9 || r.b[0] != 1 {
		return errWKB
	}
	r.b = r.b[1:]
	code, _ := r.uint32()
	n, _ := r.uint32()
	dims := [4]int{2, 3, 3, 4}
	switch kind := code % 1000; {
	case kind == multi && depth == 0:
		for range n {
			if err := r.geometry(to, 1); err != nil {
				return err
			}
		}
		return nil
	case kind == polygon && code < 4000:
		var p orb.Polygon
		for range n {
			ring, ok := r.ring(8 * dims[code/1000])
			if !ok {
				return errWKB
			}
			p = append(p, ring)
		}
		if len(p) > 0 {
			*to = append(*to, p)
		}
		return nil
	}
	return errWKB
}

// ring reads one ring whose positions have size bytes.
func (r *wkbReader) ring(size int) (orb.Ring, bool) {
	n, ok := r.uint32()
	if !ok || uint64(len(r.b)) < uint64(n)*uint64(size) {
		return nil, false
	}
	ring := make(orb.Ring, n)
	for i := range ring {
		ring[i] = orb.Point{
			math.Float64frombits(binary.LittleEndian.Uint64(r.b)),
			math.Float64frombits(binary.LittleEndian.Uint64(r.b[8:])),
		}
		r.b = r.b[size:]
	}
	return ring, true
}
