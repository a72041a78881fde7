// Package ply reads point clouds in the PLY format, version 1.0: ascii and both
// binary byte orders, with any scalar types, any order of properties and any
// other elements beside the vertices.
//
// It follows the format's original description (G. Turk, "The PLY Polygon File
// Format", 1994). The format has no extent, CRS or date; the names of
// properties other than x, y and z are conventions.
package ply
