// Package las reads and writes point clouds in the LAS format, versions 1.0 to
// 1.4 and point formats 0 to 10, uncompressed.
//
// It follows "LAS Specification 1.4 - R15" of the American Society for
// Photogrammetry and Remote Sensing (ASPRS, 2019); section numbers in comments
// are of that document. Files of version 1.5 are read as far as their header
// agrees with 1.4, which includes every field that is used here.
//
// The package trusts no count or offset of a file: records are read only where
// the file has bytes for them, and memory does not depend on what a header
// promises.
package las
