package gdal

/*
#include <stdlib.h>
#include "binding.h"
#cgo noescape lw_crs_parse
#cgo nocallback lw_crs_parse
#cgo noescape lw_crs_horizontal
#cgo nocallback lw_crs_horizontal
#cgo nocallback lw_crs_close
*/
import "C"

import (
	"fmt"
	"regexp"
	"runtime"
	"strings"
	"unsafe"

	"ledgework/terrain"
)

// A CRS is a coordinate reference system. Coordinates go with it in the order
// longitude, latitude or east, north, whatever the order of its own axes.
// Everything but HorizontalOnly also works after Close.
type CRS struct {
	handle  unsafe.Pointer // nil after Close
	cleanup runtime.Cleanup

	projected, geographic, compound, geocentric, local bool
	utmZone                                            int
	utmNorth                                           bool
	name, authority, wkt, projjson                     string
	linearUnit, verticalUnit, verticalName             string
	linearMetres, verticalMetres                       float64
}

// ParseCRS understands an authority code ("EPSG:32633", "EPSG:25832+5941"), a
// URN, WKT of either generation, PROJJSON and a PROJ string ("+proj=utm …").
// Names of files and URLs are refused: only definitions are read. Other text is
// a terrain.FormatError.
func ParseCRS(s string) (*CRS, error) {
	s = strings.TrimSpace(s)
	place := fmt.Sprintf("coordinate system %q", abridge(s))
	if !isDefinition(s) {
		return nil, &terrain.FormatError{Format: "gdal", Place: place, Reason: "not a definition",
			Remedy: "give a code such as EPSG:32633, WKT, PROJJSON or a PROJ string"}
	}
	text := C.CString(s)
	defer C.free(unsafe.Pointer(text))
	var info C.lw_crs
	var log C.lw_log
	if C.lw_crs_parse(text, &info, &log) == 0 {
		return nil, failure(&log, place, "not understood")
	}
	takeLog(&log)
	return newCRS(&info), nil
}

// abridge shortens a definition for an error message.
func abridge(s string) string {
	const most = 60
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "…"
	}
	return s
}

// isDefinition reports whether s has the form of one of the definitions that
// ParseCRS takes. GDAL by itself would also try file names and URLs.
func isDefinition(s string) bool {
	if strings.ContainsRune(s, 0) {
		return false
	}
	if strings.HasPrefix(s, "+") || strings.HasPrefix(strings.ToLower(s), "proj=") {
		// init= reads a file of definitions; grids are looked up by PROJ itself.
		return strings.Contains(s, "proj=") && !strings.Contains(s, "init=")
	}
	if strings.HasPrefix(s, "{") {
		return true
	}
	code := regexp.MustCompile(`^[A-Za-z][A-Za-z_]*(_[0-9]{4})?:[A-Za-z0-9_.]+(\+([A-Za-z][A-Za-z_]*:)?[0-9]+)?$`)
	urn := regexp.MustCompile(`^(?i:urn:ogc:def:crs[:,])[A-Za-z0-9_.:,\-]+$`)
	wkt := regexp.MustCompile(`^[A-Za-z_0-9]+\s*[\[(]`)
	return code.MatchString(s) || urn.MatchString(s) || wkt.MatchString(s)
}

func newCRS(info *C.lw_crs) *CRS {
	c := &CRS{
		handle:    info.handle,
		projected: info.projected != 0, geographic: info.geographic != 0, compound: info.compound != 0,
		geocentric: info.geocentric != 0, local: info.local != 0,
		utmZone: int(info.utm_zone), utmNorth: info.utm_north != 0,
		name: takeString(info.name), authority: takeString(info.authority),
		wkt: takeString(info.wkt), projjson: takeString(info.projjson),
		linearUnit: takeString(info.linear_unit), linearMetres: float64(info.linear_factor),
		verticalUnit: takeString(info.vertical_unit), verticalMetres: float64(info.vertical_factor),
		verticalName: takeString(info.vertical_name),
	}
	c.cleanup = runtime.AddCleanup(c, func(h unsafe.Pointer) { C.lw_crs_close(h) }, info.handle)
	return c
}

// Close frees the C side. Later calls do nothing.
func (c *CRS) Close() error {
	if c.handle != nil {
		c.cleanup.Stop()
		C.lw_crs_close(c.handle)
		c.handle = nil
	}
	return nil
}

// IsProjected reports whether the horizontal part is a map projection.
func (c *CRS) IsProjected() bool { return c.projected }

// IsGeographic reports whether the horizontal part is longitude and latitude.
func (c *CRS) IsGeographic() bool { return c.geographic }

// IsCompound reports whether c joins a horizontal and a vertical system.
func (c *CRS) IsCompound() bool { return c.compound }

// IsGeocentric reports whether coordinates are X, Y, Z from the Earth's centre.
func (c *CRS) IsGeocentric() bool { return c.geocentric }

// IsLocal reports whether c is a local grid with no tie to the Earth.
func (c *CRS) IsLocal() bool { return c.local }

// LinearUnit is the name and length in metres of the unit of horizontal (or
// geocentric) coordinates; "" and 0 for longitude and latitude.
func (c *CRS) LinearUnit() (name string, metres float64) { return c.linearUnit, c.linearMetres }

// VerticalUnit is the name and length in metres of the unit of heights; "" and
// 0 if c says nothing of heights.
func (c *CRS) VerticalUnit() (name string, metres float64) { return c.verticalUnit, c.verticalMetres }

// Name is the name in the definition: "WGS 84 / UTM zone 33N".
func (c *CRS) Name() string { return c.name }

// AuthorityCode is "EPSG:32633", "EPSG:25832+5941" for a compound of two coded
// parts, and empty where there is no code.
func (c *CRS) AuthorityCode() string { return c.authority }

// WKT2 is the definition in WKT, 2019 edition (ISO 19162), on one line.
func (c *CRS) WKT2() string { return c.wkt }

// PROJJSON is the definition in PROJJSON, empty where it has no such form.
func (c *CRS) PROJJSON() string { return c.projjson }

// VerticalName is the name of the vertical part, "ellipsoidal height" for a
// three-dimensional system, and empty where c says nothing of heights.
func (c *CRS) VerticalName() string { return c.verticalName }

// UTMZone is the zone number, 1 to 60, and whether it is on the northern side.
// The zone is 0 where c is not a UTM zone.
func (c *CRS) UTMZone() (zone int, north bool) { return c.utmZone, c.utmNorth }

// HorizontalOnly returns a new CRS without the vertical part of c.
func (c *CRS) HorizontalOnly() (*CRS, error) {
	if c.handle == nil {
		return nil, ErrClosed
	}
	var info C.lw_crs
	var log C.lw_log
	ok := C.lw_crs_horizontal(c.handle, &info, &log)
	runtime.KeepAlive(c)
	if ok == 0 {
		return nil, failure(&log, fmt.Sprintf("coordinate system %q", c.name), "has no horizontal part")
	}
	takeLog(&log)
	return newCRS(&info), nil
}
