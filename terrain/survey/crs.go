package survey

import (
	"fmt"
	"strings"

	"ledgework/terrain/gdal"
)

// A system is what a frame needs to know of one CRS.
type system struct {
	// crs is the horizontal part, or the whole of a geocentric CRS; nil where
	// there is none. Parsing one again may take a tenth of a second, so it is
	// kept, and left to the garbage collector: a Frame has no Close.
	crs *gdal.CRS

	wkt      string // of crs
	name     string // of the horizontal part
	code     string // "EPSG:32633", empty if it has none
	kind     kind
	unit     float64 // metres per horizontal unit; 0 for degrees
	unitName string
	vertical float64 // metres per unit of height; 0 if the CRS says nothing
	heights  string  // name of the vertical CRS, empty if the CRS says nothing
	turned   bool    // axes point west or south
	special  bool    // spherical web map projection, whose scale is off by 1/cos(latitude)
}

// A kind is what the coordinates of a CRS are.
type kind uint8

const (
	local      kind = iota // lengths in a frame nobody knows
	projected              // easting and northing
	geographic             // longitude and latitude
	geocentric             // X, Y, Z from the centre of the earth
)

// parseSystem reads a CRS given as EPSG:n, WKT or PROJJSON.
func parseSystem(text string) (system, error) {
	whole, err := gdal.ParseCRS(text)
	if err != nil {
		return system{}, err
	}
	crs := whole
	if whole.IsCompound() {
		if crs, err = whole.HorizontalOnly(); err != nil {
			return system{}, err
		}
		whole.Close()
	}

	s := system{crs: crs, wkt: crs.WKT2(), name: crs.Name(), code: crs.AuthorityCode(), heights: whole.VerticalName()}
	_, s.vertical = whole.VerticalUnit()
	switch {
	case crs.IsGeocentric():
		s.kind, s.vertical, s.heights = geocentric, 1, "ellipsoidal height"
	case crs.IsGeographic():
		s.kind = geographic
	case crs.IsProjected():
		s.kind = projected
	}
	if s.kind != geographic {
		s.unitName, s.unit = crs.LinearUnit()
		if !(s.unit > 0) {
			s.unitName, s.unit = "metre", 1
		}
	}
	if s.heights == "unknown" {
		s.heights = ""
	}
	if s.kind == local && (s.name == "unnamed" || s.name == "unknown") {
		s.crs, s.wkt, s.name = nil, "", "" // lengths in some unit, and that is all
	}
	s.turned = s.kind == projected && axesTurned(s.wkt)
	s.special = s.kind == projected && strings.Contains(s.wkt, "Pseudo Mercator")
	return s, nil
}

// systems are CRS parsed before, by their text: parsing one takes milliseconds,
// and the tiles of a mosaic all have the same.
type systems map[string]system

func (k systems) parse(text string) (system, error) {
	if s, ok := k[text]; ok {
		return s, nil
	}
	s, err := parseSystem(text)
	if err == nil {
		k[text] = s
	}
	return s, err
}

// transformTo returns the operation from s to another CRS.
func (s system) transformTo(to system) (*gdal.Transform, error) {
	return gdal.NewTransform(s.crs, to.crs)
}

// toWGS84 returns the operation from s to longitude and latitude.
func (s system) toWGS84() (*gdal.Transform, error) {
	to, err := gdal.ParseCRS(wgs84)
	if err != nil {
		return nil, err
	}
	defer to.Close()
	return gdal.NewTransform(s.crs, to)
}

// metric returns s with horizontal units of one metre, and s itself where it
// has them.
func (s system) metric() (system, error) {
	switch {
	case s.unit == 1 || s.kind == geographic:
		return s, nil
	case s.kind == local:
		s.unit, s.unitName = 1, "metre"
		return s, nil
	}
	wkt, ok := metricWKT(s.wkt)
	if !ok {
		return system{}, fmt.Errorf("survey: the axes of %q cannot be expressed in metres; give crs: a projected CRS in metres", s.name)
	}
	return parseSystem(wkt)
}
