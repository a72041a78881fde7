// Package xyz reads points from text: one point a line, with numbers between
// blanks, tabs, commas or semicolons. It covers plain XYZ files, CSV with or
// without a line of column names, and PTS with its line of the number of
// points. Numbers have decimal points.
//
// Such files have no specification; what a Reader takes them for is decided on
// the first lines and told in the notes of its header:
//
//   - Column names, in any case and with units in brackets ignored: x, easting,
//     east or e; y, northing, north or n; z, height, elevation, elev or h;
//     intensity or i; red or r; green or g; blue or b; classification or class.
//     They stand in the first line or in the last comment before the points.
//   - Without names, columns are x y z; x y z intensity; x y z red green blue,
//     if the latter are whole numbers from 0 to 255; or x y z intensity red
//     green blue as in PTS files. Other columns are left out.
//   - Colours from 0 to 255 are spread to 16 bits by 257, fractions of 1 by
//     65535, and colours beyond 255 are 16 bit ones.
//   - Intensities are whole numbers from 0 to 65535, or fractions of 1. Those
//     of PTS files go from -2048 to 2047 and are raised by 2048.
//   - Empty lines and lines that begin with # or // are passed over.
package xyz
