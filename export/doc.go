// Package export turns findings into files: GIS layers in longitude and
// latitude, plain tables in working coordinates, the moment voxels and the
// record of a run, all in one folder that is complete or not there at all.
//
// What a layer holds is said once, in the fields of [Dictionary]; every writer
// takes names, types and order from there. The same findings give the same
// bytes: nothing depends on time, map order or the number of workers.
package export
