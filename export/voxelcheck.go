package export

import (
	"fmt"
	"math"
	"math/bits"

	"ledgework/terrain"
)

// checkVoxels checks what arithmetic on voxels relies on.
func checkVoxels(v *terrain.Voxels) error {
	half, limit := v.Lattice.Quanta()/2, v.Lattice.MaxPoints()
	attributes := attributes()
	for i := range v.Cells {
		m := &v.Moments[i]
		if i > 0 && v.Cells[i-1].Compare(v.Cells[i]) >= 0 {
			return voxelError(fmt.Sprintf("row %d", i), "voxels are out of order or repeated", nil)
		}
		if m.N < 1 || m.N > limit {
			return voxelError(fmt.Sprintf("row %d", i), fmt.Sprintf("%d points, not 1 to %d", m.N, limit), nil)
		}
		if !plausible(m.N, half, m.X, m.XX) || !plausible(m.N, half, m.Y, m.YY) || !plausible(m.N, half, m.Z, m.ZZ) ||
			!within(m.XY, m.XX, m.YY) || !within(m.XZ, m.XX, m.ZZ) || !within(m.YZ, m.YY, m.ZZ) {
			return voxelError(fmt.Sprintf("row %d", i), "no points within the voxel have these sums", nil)
		}
		for _, a := range attributes {
			if c := *a.column(v); c != nil && c[i] > uint64(m.N)*maxAttribute {
				return voxelError(fmt.Sprintf("row %d", i), fmt.Sprintf("%s %d is too large for %d points", a.name, c[i], m.N), nil)
			}
		}
	}
	return checkClasses(v)
}

// checkClasses checks that class counts are in order and fit their voxels.
func checkClasses(v *terrain.Voxels) error {
	var sum int64
	for i, c := range v.Classes {
		if i > 0 && v.Classes[i-1].Voxel == c.Voxel {
			if v.Classes[i-1].Class >= c.Class {
				return voxelError(fmt.Sprintf("row %d", c.Voxel), "classes are out of order or repeated", nil)
			}
		} else {
			sum = 0
		}
		if n := v.Moments[c.Voxel].N; c.N < 1 || c.N > n-sum {
			return voxelError(fmt.Sprintf("row %d", c.Voxel), fmt.Sprintf("more points in classes than its %d", n), nil)
		}
		sum += c.N
	}
	return nil
}

// plausible reports whether n offsets of at most half can have the sum s and
// the sum of squares ss. With n at most Lattice.MaxPoints nothing overflows.
func plausible(n, half, s, ss int64) bool {
	return s >= -n*half && s <= n*half && ss >= 0 && ss <= n*half*half && within(s, n, ss)
}

// within reports whether x² ≤ a·b, for a and b that are not negative: the
// inequality of Cauchy and Schwarz, which sums of products obey exactly.
func within(x, a, b int64) bool {
	u := uint64(max(x, -x))
	if x == math.MinInt64 {
		return false
	}
	h1, l1 := bits.Mul64(u, u)
	h2, l2 := bits.Mul64(uint64(a), uint64(b))
	return h1 < h2 || h1 == h2 && l1 <= l2
}
