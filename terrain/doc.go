// Package terrain is the model of a surveyed surface: raw points as they
// stream in, and the moment voxels they are summed into.
//
// Coordinates are metres in a projected working CRS, axes east (X), north (Y)
// and up (Z). The packages below terrain each read one format; none of them
// knows how a surface is judged.
package terrain
