package gdal

/*
#cgo pkg-config: gdal proj
#include <stdlib.h>
#include "binding.h"
#cgo noescape lw_log_free
#cgo nocallback lw_log_free
#cgo nocallback lw_version
#cgo nocallback lw_free
*/
import "C"

import (
	"errors"
	"fmt"
	"os"
	"strings"
	"unsafe"

	"ledgework/terrain"
)

// ErrClosed is returned by a method of a value that has been closed.
var ErrClosed = errors.New("gdal: used after Close")

// Version names the libraries in use: "GDAL 3.6.2, PROJ 9.1.1".
func Version() string { return takeString(C.lw_version()) }

// takeString copies a C string of the libraries and frees it; nil is "".
func takeString(s *C.char) string {
	if s == nil {
		return ""
	}
	defer C.lw_free(unsafe.Pointer(s))
	return C.GoString(s)
}

// takeBytes copies n bytes that the C side allocated, and frees them.
func takeBytes(p *C.uint8_t, n C.size_t) []byte {
	if p == nil {
		return nil
	}
	defer C.lw_free(unsafe.Pointer(p))
	return append([]byte(nil), unsafe.Slice((*byte)(p), int(n))...)
}

// takeLog returns the messages of one call, in one line, and frees them.
func takeLog(l *C.lw_log) string {
	if l.text == nil {
		return ""
	}
	s := strings.ReplaceAll(C.GoStringN(l.text, C.int(l.len)), "\n", "; ")
	if l.dropped > 0 {
		s += fmt.Sprintf("; and %d more", int(l.dropped))
	}
	C.lw_log_free(l)
	return s
}

// failure is the FormatError of a call that failed; place is the file or thing
// it was asked about, what is what could not be done.
func failure(l *C.lw_log, place, what string) error {
	e := &terrain.FormatError{Format: "gdal", Place: place, Reason: what}
	if text := takeLog(l); text != "" {
		e.Err = errors.New(text)
	}
	return e
}

// localFile makes sure that path names a local file or folder, and not one of
// the connection strings that GDAL opens as well.
func localFile(path string) error {
	if strings.ContainsRune(path, 0) {
		return &terrain.FormatError{Format: "gdal", Place: fmt.Sprintf("%q", path), Reason: "not a file name"}
	}
	if strings.HasPrefix(path, "/vsi") || strings.Contains(path, "://") {
		return &terrain.FormatError{Format: "gdal", Place: path, Reason: "not a local file",
			Remedy: "download or unpack it and give the file's own path"}
	}
	if _, err := os.Stat(path); err != nil {
		return fmt.Errorf("gdal: %w", err)
	}
	return nil
}
