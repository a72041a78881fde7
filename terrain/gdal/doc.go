// Package gdal is a thin binding to the installed libgdal (3.6 or later) and
// the libproj it is built on: rasters and vector layers for reading, coordinate
// reference systems and their transforms, and the few geometry questions that
// GEOS answers.
//
// # Calls
//
// Whole blocks, arrays of coordinates and WKB cross the border to C, never one
// value at a time. The messages that the libraries emit during a call, warnings
// too, are collected by a handler that is in place for exactly that call on
// exactly that thread, so none is lost, printed, or credited to somebody else.
//
// # Ownership
//
// A [Dataset], [CRS] or [Transform] holds C memory. Close frees it; a second
// Close does nothing. A value that becomes unreachable without Close is closed
// by the garbage collector some time later. Different values may be used by
// different goroutines at once; one value is used by one goroutine at a time,
// which Dataset alone enforces with a lock.
//
// # Reach
//
// Only local files are opened, and nothing is written beside them; a world file
// or an .aux.xml that stands there is read, for it may hold the georeference.
// Drivers that
// are clients of network services are taken away and network file systems
// refuse, so that a VRT cannot name a host either; PROJ's network grids are off,
// and so is Python in VRT files.
package gdal
