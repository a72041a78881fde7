package gdal

/*
#include <stdlib.h>
#include "binding.h"
#cgo noescape lw_open
#cgo nocallback lw_open
#cgo noescape lw_close
#cgo nocallback lw_close
#cgo noescape lw_metadata
#cgo nocallback lw_metadata
*/
import "C"

import (
	"fmt"
	"runtime"
	"sync"
	"unsafe"
)

// A Dataset is an open raster or vector file. Its methods may be called from
// several goroutines, which then take turns.
type Dataset struct {
	mu      sync.Mutex
	handle  unsafe.Pointer // nil after Close
	cleanup runtime.Cleanup

	path, driver, crs string
	warnings          string
	width, height     int
	bands, layers     int
	transform         [6]float64
	hasTransform      bool
	gcps              int
}

// Open opens the raster file at path for reading. It fails with an error that
// wraps fs.ErrNotExist for a missing file, and with a terrain.FormatError for
// one that GDAL cannot read or that is not local.
func Open(path string) (*Dataset, error) { return open(path, 0) }

// OpenVector opens the vector file at path for reading; see [Dataset.Layers].
// It fails as [Open] does.
func OpenVector(path string) (*Dataset, error) { return open(path, 1) }

func open(path string, vector C.int) (*Dataset, error) {
	if err := localFile(path); err != nil {
		return nil, err
	}
	name := C.CString(path)
	defer C.free(unsafe.Pointer(name))
	var info C.lw_dataset
	var log C.lw_log
	if C.lw_open(name, vector, &info, &log) == 0 {
		return nil, failure(&log, path, "cannot be opened")
	}
	d := &Dataset{
		handle: info.handle, path: path,
		driver: takeString(info.driver), crs: takeString(info.crs), warnings: takeLog(&log),
		width: int(info.width), height: int(info.height), bands: int(info.bands), layers: int(info.layers),
		hasTransform: info.has_transform != 0, gcps: int(info.gcps),
	}
	for i, v := range info.transform {
		d.transform[i] = float64(v)
	}
	d.cleanup = runtime.AddCleanup(d, func(h unsafe.Pointer) {
		var log C.lw_log
		C.lw_close(h, &log)
		takeLog(&log)
	}, info.handle)
	return d, nil
}

// Close closes the file. Later calls do nothing and return nil.
func (d *Dataset) Close() error {
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.handle == nil {
		return nil
	}
	d.cleanup.Stop()
	var log C.lw_log
	ok := C.lw_close(d.handle, &log)
	d.handle = nil
	if ok == 0 {
		return failure(&log, d.path, "cannot be closed")
	}
	takeLog(&log)
	return nil
}

// Size is the raster's width and height in cells.
func (d *Dataset) Size() (w, h int) { return d.width, d.height }

// GeoTransform returns the affine map from cell corners to CRS coordinates,
//
//	x = t[0] + column·t[1] + row·t[2]
//	y = t[3] + column·t[4] + row·t[5]
//
// where whole columns and rows are corners and halves are cell centres. It is
// false if the file has none, be it that it has ground control points instead.
func (d *Dataset) GeoTransform() ([6]float64, bool) { return d.transform, d.hasTransform }

// GroundControlPoints is how many ground control points the raster has.
func (d *Dataset) GroundControlPoints() int { return d.gcps }

// CRS is the WKT of the raster's coordinate reference system in its 2019 form,
// empty if the file has none. Layers of a vector file have their own.
func (d *Dataset) CRS() string { return d.crs }

// Driver is the short name of the format: "GTiff".
func (d *Dataset) Driver() string { return d.driver }

// Bands is the number of bands of a raster, 0 for a vector file.
func (d *Dataset) Bands() int { return d.bands }

// Warnings is what the libraries said when the file was opened, empty if
// nothing.
func (d *Dataset) Warnings() string { return d.warnings }

// Metadata returns an item of the dataset's default metadata domain, such as
// "AREA_OR_POINT" or "TIFFTAG_DATETIME", and whether it is there.
func (d *Dataset) Metadata(key string) (string, bool) { return d.metadata(0, key) }

func (d *Dataset) metadata(band int, key string) (string, bool) {
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.handle == nil {
		return "", false
	}
	name := C.CString(key)
	defer C.free(unsafe.Pointer(name))
	var log C.lw_log
	value := C.lw_metadata(d.handle, C.int(band), name, nil, &log)
	takeLog(&log)
	return takeString(value), value != nil
}

// place names a part of the file in errors.
func (d *Dataset) place(format string, args ...any) string {
	return d.path + ": " + fmt.Sprintf(format, args...)
}
