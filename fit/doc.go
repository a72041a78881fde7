// Package fit turns moment voxels into numbers: local planes, the side that
// faces the air, reference faces, enclosing ellipsoids, directions and their
// spread. It judges nothing; package hazards does.
//
// Lengths are metres. Angles are degrees in every exported name.
package fit
