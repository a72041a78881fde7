package gdal

/*
#include <stdlib.h>
#include "binding.h"
#cgo noescape lw_transform_new
#cgo nocallback lw_transform_new
#cgo noescape lw_transform_pipeline
#cgo nocallback lw_transform_pipeline
#cgo nocallback lw_transform_close
#cgo noescape lw_transform_apply
#cgo nocallback lw_transform_apply
#cgo noescape lw_transform_describe
#cgo nocallback lw_transform_describe
*/
import "C"

import (
	"fmt"
	"runtime"
	"strings"
	"unsafe"

	"ledgework/terrain"
)

// A Transform turns coordinates of one CRS into another's. Angles are in
// degrees, longitude before latitude; lengths are in the units of the CRS.
type Transform struct {
	handle  *C.lw_transform // nil after Close
	cleanup runtime.Cleanup
	name    string
}

// A TransformError says that some points of a call had no image.
type TransformError struct {
	Failed int    // how many
	First  int    // index of the first
	Name   string // the transform
	Reason string // why the first failed, as PROJ has it; may be empty
}

func (e *TransformError) Error() string {
	s := fmt.Sprintf("gdal: %s: point %d: no result", e.Name, e.First)
	if e.Reason != "" {
		s += ": " + e.Reason
	}
	if e.Failed > 1 {
		s += fmt.Sprintf(" (and %d more points)", e.Failed-1)
	}
	return s
}

// NewTransform returns the best operation from src to dst that needs no
// network and no grid file that is not installed. PROJ may choose among
// operations point by point, by their areas of use; see [Transform.Accuracy].
func NewTransform(src, dst *CRS) (*Transform, error) {
	from, to := C.CString(src.wkt), C.CString(dst.wkt)
	defer C.free(unsafe.Pointer(from))
	defer C.free(unsafe.Pointer(to))
	var log C.lw_log
	name := fmt.Sprintf("%s to %s", src.name, dst.name)
	return newTransform(C.lw_transform_new(from, to, &log), name, &log)
}

// NewPipeline returns the operation of a PROJ string, "+proj=pipeline +step …"
// or a single "+proj=…". A projection on its own takes degrees. Definition
// files (init=) are refused.
func NewPipeline(proj string) (*Transform, error) {
	if !isDefinition(proj) || !strings.Contains(proj, "proj=") {
		return nil, &terrain.FormatError{Format: "gdal", Place: fmt.Sprintf("pipeline %q", abridge(proj)), Reason: "not a PROJ string"}
	}
	text := C.CString(proj)
	defer C.free(unsafe.Pointer(text))
	var log C.lw_log
	return newTransform(C.lw_transform_pipeline(text, &log), "pipeline "+abridge(proj), &log)
}

func newTransform(h *C.lw_transform, name string, log *C.lw_log) (*Transform, error) {
	if h == nil {
		return nil, failure(log, name, "no such coordinate operation")
	}
	takeLog(log)
	t := &Transform{handle: h, name: name}
	t.cleanup = runtime.AddCleanup(t, func(h *C.lw_transform) { C.lw_transform_close(h) }, h)
	return t, nil
}

// Close frees the C side. Later calls do nothing.
func (t *Transform) Close() error {
	if t.handle != nil {
		t.cleanup.Stop()
		C.lw_transform_close(t.handle)
		t.handle = nil
	}
	return nil
}

// Apply replaces the points x[i], y[i], z[i] by their images. z may be nil. A
// point without an image becomes +Inf in all its coordinates and the others are
// still done; the error is then a *TransformError. It panics if the slices
// differ in length.
func (t *Transform) Apply(x, y, z []float64) error { return t.apply(x, y, z, 0) }

// Inverse does what Apply does, from the target back to the source.
func (t *Transform) Inverse(x, y, z []float64) error { return t.apply(x, y, z, 1) }

func (t *Transform) apply(x, y, z []float64, inverse C.int) error {
	if len(y) != len(x) || z != nil && len(z) != len(x) {
		panic("gdal: coordinate slices of different length")
	}
	if t.handle == nil {
		return ErrClosed
	}
	if len(x) == 0 {
		return nil
	}
	var first C.int64_t
	var log C.lw_log
	failed := C.lw_transform_apply(t.handle, inverse, doubles(x), doubles(y), doubles(z), C.int64_t(len(x)), &first, &log)
	runtime.KeepAlive(t)
	reason := takeLog(&log)
	if failed > 0 {
		return &TransformError{Failed: int(failed), First: int(first), Name: t.name, Reason: reason}
	}
	return nil
}

func doubles(s []float64) *C.double { return (*C.double)(unsafe.Pointer(unsafe.SliceData(s))) }

// Accuracy is what the EPSG registry states for the operation in metres, and
// whether it is a mere guess that ignores the difference between two datums
// ("ballpark"). Metres is negative where nothing is stated. After Apply it
// speaks of the operation used for the last point; before, where PROJ has
// several to choose from, nothing is stated.
func (t *Transform) Accuracy() (metres float64, ballpark bool) {
	_, metres, ballpark = t.describe()
	return metres, ballpark
}

// Operation names the operation used for the last point.
func (t *Transform) Operation() string {
	name, _, _ := t.describe()
	return name
}

func (t *Transform) describe() (name string, metres float64, ballpark bool) {
	if t.handle == nil {
		return "", -1, false
	}
	var accuracy C.double
	var guess C.int
	var log C.lw_log
	text := C.lw_transform_describe(t.handle, &accuracy, &guess, &log)
	runtime.KeepAlive(t)
	takeLog(&log)
	return takeString(text), float64(accuracy), guess != 0
}
