package terrain

import (
	"sort"

	"gonum.org/v1/gonum/spatial/r3"
)

// Voxels are the occupied cells of a survey with their moments, sorted by
// Cell.Compare. Attribute columns have the length of Cells or are nil.
type Voxels struct {
	Lattice Lattice
	Cells   []Cell
	Moments []Moments

	Intensity        []uint64 // sum over the points
	Red, Green, Blue []uint64 // sums over the points
	Classes          []ClassCount
}

// A ClassCount says how many points of one class a voxel holds. Voxels.Classes
// is sorted by voxel, then class, and nil when the survey has no classes.
type ClassCount struct {
	Voxel int32 // index into Cells
	Class uint8
	N     int64
}

// Len is the number of occupied voxels.
func (v *Voxels) Len() int { return len(v.Cells) }

// Points is the number of raw points summed.
func (v *Voxels) Points() int64 {
	var n int64
	for i := range v.Moments {
		n += v.Moments[i].N
	}
	return n
}

// Mean is the mean of the points of voxel i, in the working CRS.
func (v *Voxels) Mean(i int) r3.Vec {
	return r3.Add(v.Lattice.Centre(v.Cells[i]), v.Moments[i].Mean())
}

// Find returns the index of cell c, or -1 if it is not occupied.
func (v *Voxels) Find(c Cell) int {
	i := sort.Search(len(v.Cells), func(i int) bool { return v.Cells[i].Compare(c) >= 0 })
	if i < len(v.Cells) && v.Cells[i] == c {
		return i
	}
	return -1
}

// Extent is the box around the voxel means.
func (v *Voxels) Extent() Extent {
	e := EmptyExtent()
	for i := range v.Cells {
		m := v.Mean(i)
		e.Add(m.X, m.Y, m.Z)
	}
	return e
}
