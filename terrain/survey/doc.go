// Package survey opens any survey that ledgework reads, told by its first
// bytes, brings the points of one or many files into one metric working CRS
// and streams them to several workers.
//
// The steps of a run are
//
//	paths := Expand(dir, patterns)          // files, folders, globs
//	frame := Plan(ctx, sources, "auto")     // the working CRS, see Frame
//	counts := Stream(ctx, frame, ...)       // every point, in metres
//
// Inspect says what is in one file; MedianSpacing and AutoSpacing choose the
// spacing of the voxels.
//
// # Coordinates
//
// Everything that leaves this package is in the working CRS: easting, northing
// and height in metres, in the order X, Y, Z of a terrain.Batch. Geographic
// coordinates are longitude first, latitude second, whatever order their
// authority prefers. Heights are scaled to metres but never moved from one
// vertical datum to another; Frame.VerticalName says which one they refer to.
package survey
