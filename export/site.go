package export

import (
	"errors"

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
	Name     string
	CRS      CRS
	Frame    string   // how coordinates were brought into the working CRS, for the reader
	Dates    []string // survey dates, YYYY-MM-DD
	Voxels   *terrain.Voxels
	Findings hazards.Findings
	Profile  hazards.Profile

	// InflatedByM is the distance in metres by which the Inflated ellipsoids
	// were grown.
	InflatedByM float64
}

// A Projector turns working coordinates into WGS 84 (OGC:CRS84).
type Projector interface {
	// ToWGS84 replaces x and y by longitude and latitude in degrees, and z by
	// the height that goes with them in metres. The slices have one length.
	ToWGS84(x, y, z []float64) error
}

// A ValidityCheck says whether a geometry in well-known binary is valid by the
// OGC Simple Features rules, and why not. Nil asks GEOS through GDAL.
type ValidityCheck func(wkb []byte) (ok bool, reason string, err error)
