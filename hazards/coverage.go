package hazards

import (
	"math"
	"math/bits"
)

// A coverageGrid divides the plane of a footprint into square cells, centred on
// the footprint, and says which share of the disc holds data.
//
// Where a fully scanned plane cuts the lattice obliquely, one voxel's mean
// projects into some cells, none into a third of them and two into others, so
// "cells that hold a mean" is no measure of data. The rule is:
//
//	a cell of the disc is missing if it belongs to a block of 2 × 2 cells, in
//	any position, that holds no projected mean.
//
// It is the morphological opening of the empty cells by that block (Serra 1982,
// Image Analysis and Mathematical Morphology). Each part of a plane lies within
// √3/2 spacings of the mean of a fully scanned voxel's piece of it (half of the
// cube's diagonal), and a block holds a circle of radius 1, so a fully scanned
// plane of any direction has coverage exactly 1. At the least density of the
// automatic spacing, 2.25 points a cell at random, it is 0.99 or more on
// average.
//
// The price: an opening narrower than two cells is not seen, and a wider one
// appears smaller by half a cell along its edge, since a cell that the edge
// crosses holds data. On a footprint of ten cells' radius that lacks one half,
// this is 0.03. An elevation grid, one sample per column, covers faces up to
// acos(1/2) = 60°; on steeper ones samples along the dip are more than two cells
// apart and the gaps count as missing, rightly.
type coverageGrid struct {
	cell  float64 // edge, m
	per   float64 // 1/cell
	half  int     // cells from the centre to the edge of the grid
	reach float64 // data matter up to this distance from the centre, m
	disc  [maxCoverageRows]uint64
	cells int // in the disc: those whose centre lies in it
}

// maxCoverageRows keeps a row of cells in one machine word.
const maxCoverageRows = 64

// coverageMargin is how many cells beyond the disc can share a block with it.
const coverageMargin = 1

// occupancy marks the cells that hold data, one bit each.
type occupancy [maxCoverageRows]uint64

// newCoverageGrid lays out the grid for a footprint of radius r. Its cells are
// one spacing wide, or r/31 where that is more. A footprint smaller than a cell
// can have a grid without cells.
func newCoverageGrid(r, spacing float64) coverageGrid {
	g := coverageGrid{cell: max(spacing, r/(maxCoverageRows/2-coverageMargin))}
	g.per = 1 / g.cell
	// The rounding in r/31 must not push the grid over a word.
	g.half = min(int(math.Ceil(r/g.cell))+coverageMargin, maxCoverageRows/2)
	// The far corner of a cell that is a neighbour, by corners, of one whose
	// centre is at r.
	g.reach = r + 1.5*math.Sqrt2*g.cell
	for j := range 2 * g.half {
		b := (float64(j-g.half) + 0.5) * g.cell
		for i := range 2 * g.half {
			a := (float64(i-g.half) + 0.5) * g.cell
			if a*a+b*b <= r*r {
				g.disc[j] |= 1 << i
				g.cells++
			}
		}
	}
	return g
}

// mark records data at (a, b) from the centre, in metres.
func (g *coverageGrid) mark(o *occupancy, a, b float64) {
	// Conversion drops the fraction, so it must see no negative number. Within
	// reach nothing is further out than two cells beyond the grid.
	const shift = 2
	i := int(a*g.per+float64(g.half+shift)) - shift
	j := int(b*g.per+float64(g.half+shift)) - shift
	if n := uint(2 * g.half); uint(i) < n && uint(j) < n {
		o[j%maxCoverageRows] |= 1 << (i % maxCoverageRows)
	}
}

// share returns the share of the disc's cells that are not missing, and its
// standard uncertainty: binomial, for a quarter of the cells, since a cell's
// fate is decided with its block's. Both are 0 without cells.
func (g *coverageGrid) share(o *occupancy) estimate {
	if g.cells == 0 {
		return estimate{}
	}
	missing := 0
	var below uint64 // empty blocks whose upper row is j, by their first cell
	for j := range 2 * g.half {
		empty := ^o[j] & (^o[j] >> 1)
		var here uint64 // empty blocks whose lower row is j
		if j+1 < 2*g.half {
			here = empty & ^o[j+1] & (^o[j+1] >> 1)
		}
		blocks := below | here
		missing += bits.OnesCount64((blocks | blocks<<1) & g.disc[j])
		below = here
	}
	c := 1 - float64(missing)/float64(g.cells)
	return estimate{c, math.Sqrt(c * (1 - c) / (float64(g.cells) / 4))}
}
