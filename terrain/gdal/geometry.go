package gdal

/*
#include "binding.h"
#cgo noescape lw_geometry
#cgo nocallback lw_geometry
*/
import "C"

import (
	"fmt"
	"unsafe"

	"ledgework/terrain"
)

// ValidWKB asks GEOS whether the geometry is valid by the OGC's simple features
// rules, and if not why: "Self-intersection at or near point 1 1". The error is
// for bytes that are no WKB.
func ValidWKB(wkb []byte) (ok bool, reason string, err error) {
	valid, _, text, err := geometry(C.LW_VALID, wkb, false)
	if err != nil {
		return false, "", err
	}
	if valid != 0 {
		return true, "", nil
	}
	return false, text, nil
}

// Area is the planar area of the geometry in the square of its unit, 0 for
// points and lines.
func Area(wkb []byte) (float64, error) {
	area, _, _, err := geometry(C.LW_AREA, wkb, false)
	return area, err
}

// UnionPolygons merges the polygons of a polygon or multipolygon, which may
// overlap, into one valid geometry, by cascaded union.
func UnionPolygons(wkb []byte) ([]byte, error) {
	_, out, _, err := geometry(C.LW_UNION, wkb, true)
	return out, err
}

// MakeValid returns a valid geometry that covers what the given one covers, or
// most of it where that is ill-defined.
func MakeValid(wkb []byte) ([]byte, error) {
	_, out, _, err := geometry(C.LW_MAKE_VALID, wkb, true)
	return out, err
}

func geometry(what C.int, wkb []byte, result bool) (number float64, out []byte, text string, err error) {
	if len(wkb) == 0 {
		return 0, nil, "", &terrain.FormatError{Format: "gdal", Place: "WKB", Reason: "empty"}
	}
	var value C.double
	var data *C.uint8_t
	var size C.size_t
	var log C.lw_log
	var dst **C.uint8_t
	if result {
		dst = &data
	}
	ok := C.lw_geometry(what, (*C.uint8_t)(unsafe.Pointer(unsafe.SliceData(wkb))), C.size_t(len(wkb)), &value, dst, &size, &log)
	if ok == 0 {
		return 0, nil, "", failure(&log, fmt.Sprintf("WKB of %d bytes", len(wkb)), "cannot be processed")
	}
	return float64(value), takeBytes(data, size), takeLog(&log), nil
}
