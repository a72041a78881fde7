package terrain

import (
	"fmt"
	"math/bits"
)

// Coarser returns the voxels of twice the edge, each the exact sum of up to
// 2×2×2 voxels of v, and for every voxel of v the index of its parent.
// Attributes are not carried over. It fails when the coarser lattice is past
// MaxSpacingM or a parent's sums would not fit 63 bits.
func (v *Voxels) Coarser() (*Voxels, []int32, error) {
	l, err := NewLattice(2 * v.Lattice.SpacingM())
	if err != nil {
		return nil, nil, err
	}
	refs := v.byParent()
	parent := make([]int32, v.Len())
	c := &Voxels{Lattice: l}
	half := v.Lattice.edge / 2
	for _, r := range refs {
		cell := v.Cells[r]
		p := Cell{cell.I >> 1, cell.J >> 1, cell.K >> 1}
		if n := c.Len(); n == 0 || c.Cells[n-1] != p {
			c.Cells = append(c.Cells, p)
			c.Moments = append(c.Moments, Moments{})
		}
		at := c.Len() - 1
		parent[r] = int32(at)
		m := &c.Moments[at]
		// Before the sums are formed, so that none has wrapped when it is seen.
		if m.N+v.Moments[r].N > l.MaxPoints() {
			return nil, nil, fmt.Errorf("terrain: more than %d points in a voxel of %g m; give a smaller reference radius", l.MaxPoints(), l.SpacingM())
		}
		// The child's centre lies half a child's edge to either side.
		s := v.Moments[r].Shifted(towards(cell.I, half), towards(cell.J, half), towards(cell.K, half))
		m.Add(&s)
	}
	return c, parent, nil
}

// towards is the child's centre relative to its parent's on one axis.
func towards(cell int32, half int64) int64 {
	if cell&1 == 0 {
		return -half
	}
	return half
}

// byParent returns the indices of v's voxels in the order of their parents.
func (v *Voxels) byParent() []uint32 {
	lo, hi := v.cellRange()
	ni := uint(bits.Len32(uint32(hi.I>>1 - lo.I>>1)))
	nj := uint(bits.Len32(uint32(hi.J>>1 - lo.J>>1)))
	keys, refs := make([]uint64, v.Len()), make([]uint32, v.Len())
	for i, c := range v.Cells {
		keys[i] = uint64(c.K>>1-lo.K>>1)<<(ni+nj) | uint64(c.J>>1-lo.J>>1)<<ni | uint64(c.I>>1-lo.I>>1)
		refs[i] = uint32(i)
	}
	_, refs = sortPairs(keys, refs)
	return refs
}

// cellRange is the box of occupied cells, zero without voxels.
func (v *Voxels) cellRange() (lo, hi Cell) {
	if v.Len() == 0 {
		return
	}
	lo, hi = v.Cells[0], v.Cells[0]
	for _, c := range v.Cells {
		lo = Cell{min(lo.I, c.I), min(lo.J, c.J), min(lo.K, c.K)}
		hi = Cell{max(hi.I, c.I), max(hi.J, c.J), max(hi.K, c.K)}
	}
	return lo, hi
}

// Pyramid returns v and its coarser levels up to a spacing of at most atMostM,
// with the parent of each voxel one level up. Level 0 is v, whatever its spacing;
// parents has one entry less than levels.
func (v *Voxels) Pyramid(atMostM float64) (levels []*Voxels, parents [][]int32, err error) {
	levels = []*Voxels{v}
	for 2*levels[len(levels)-1].Lattice.SpacingM() <= atMostM {
		c, p, err := levels[len(levels)-1].Coarser()
		if err != nil {
			return nil, nil, err
		}
		levels, parents = append(levels, c), append(parents, p)
	}
	return levels, parents, nil
}
