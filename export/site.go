package export

import (
	"cmp"
	"errors"
	"fmt"

	"ledgework/hazards"
	"ledgework/terrain"
)

// Caution is carried by every output.
const Caution = "Screening aid only. It does not replace local codes, the judgement of a competent person on site, or licensed engineering practice: those decide."

// ErrNoCRS says that a layer in longitude and latitude was asked for although
// nothing tells where on Earth the survey lies.
var ErrNoCRS = errors.New("the survey names no coordinate reference system, so layers in longitude and latitude cannot be written; give it with crs: in the worksite file")

// A CRS describes the working coordinate reference system. Its zero value is a
// local system of unknown place on Earth.
type CRS struct {
	Authority string `json:"authority,omitempty"` // "EPSG", empty if none defines it
	Code      string `json:"code,omitempty"`      // the authority's code
	Name      string `json:"name,omitempty"`      // as a surveyor would say it
	WKT       string `json:"wkt,omitempty"`       // empty for local coordinates
	Vertical  string `json:"vertical,omitempty"`  // vertical datum, empty if unknown
}

// Local reports whether c is a local system of unknown place on Earth.
func (c CRS) Local() bool { return c.WKT == "" }

// A Site is what one run found, with what is needed to write it. Writers only
// read it.
type Site struct {
	Name        string
	CRS         CRS
	Conversions string   // what was assumed, converted or left undone on the way into the working CRS, empty if nothing
	Dates       []string // survey dates, YYYY-MM-DD
	Voxels      *terrain.Voxels
	Findings    hazards.Findings
	Profile     hazards.Profile

	// InflatedByM is the distance in metres by which the Inflated ellipsoids
	// were grown.
	InflatedByM float64
}

// Frame says what the coordinates of s mean: axes, units, what heights refer to,
// and the lattice of the voxels.
func (s *Site) Frame() string {
	return fmt.Sprintf("axes east, north and height (up) of the working CRS (%s), metres; heights are as in the survey, vertical datum: %s; "+
		"the third coordinate of GeoJSON is that height, where RFC 7946 means height above the WGS 84 ellipsoid: no geoid is applied; "+
		"a voxel's cell index is floor(coordinate / %g m) on each axis, from the origin 0, 0, 0 of the working CRS",
		cmp.Or(s.CRS.Name, "local coordinates"), s.CRS.verticalDatum(), s.Voxels.Lattice.SpacingM())
}

// verticalDatum is the name of what heights refer to, or "unknown".
func (c CRS) verticalDatum() string { return cmp.Or(c.Vertical, "unknown") }

// A Projector turns working coordinates into WGS 84 (OGC:CRS84).
type Projector interface {
	// ToWGS84 replaces x and y by longitude and latitude in degrees, and z by
	// the height that goes with them in metres. The slices have one length.
	ToWGS84(x, y, z []float64) error
}

// A ValidityCheck says whether a geometry in well-known binary is valid by the
// OGC Simple Features rules, and why not. Nil asks GEOS through GDAL.
type ValidityCheck func(wkb []byte) (ok bool, reason string, err error)
