package terrain

import (
	"fmt"
	"math"
	"math/bits"

	"gonum.org/v1/gonum/spatial/r3"
)

// QuantaPerMetre is the resolution of all sums: 0.1 mm.
const QuantaPerMetre = 10000

// Limits of a lattice.
const (
	// MinSpacingM keeps 32 bit cell indices valid to ±10 737 km, more than any
	// metric projection of the Earth uses.
	MinSpacingM = 0.005

	// MaxSpacingM still leaves room for 7 378 points in a voxel: see MaxPoints.
	MaxSpacingM = 5000.0
)

// A Lattice divides space into cubes. Cell (0,0,0) has its lower corner in the
// origin of the working CRS, so every survey of a site shares one lattice.
type Lattice struct {
	edge int64 // quanta, even and positive
}

// NewLattice returns the lattice of the given edge in metres, rounded to a
// multiple of 0.2 mm: an even number of quanta puts the centres of all coarser
// voxels on whole quanta too.
func NewLattice(spacingM float64) (Lattice, error) {
	if !(spacingM >= MinSpacingM && spacingM <= MaxSpacingM) {
		return Lattice{}, fmt.Errorf("terrain: spacing %g m is outside %g to %g m", spacingM, MinSpacingM, MaxSpacingM)
	}
	return Lattice{edge: 2 * int64(math.Round(spacingM*QuantaPerMetre/2))}, nil
}

// SpacingM is the edge of a cell in metres.
func (l Lattice) SpacingM() float64 { return float64(l.edge) / QuantaPerMetre }

// Quanta is the edge of a cell in quanta of 0.1 mm.
func (l Lattice) Quanta() int64 { return l.edge }

// MaxPoints is the number of points that fit one voxel: an offset is at most
// half an edge, and with n·(edge/2)² ≤ 2^62 no sum overflows 63 bits.
func (l Lattice) MaxPoints() int64 {
	half := l.edge / 2
	return 1 << 62 / (half * half)
}

// A Cell is the index of a voxel: floor(coordinate / spacing) on each axis.
type Cell struct {
	I, J, K int32 // east, north, up
}

// Compare orders cells by K, then J, then I, so that a row of cells along east
// is contiguous in a sorted list.
func (c Cell) Compare(o Cell) int {
	switch {
	case c.K != o.K:
		return compareInt32(c.K, o.K)
	case c.J != o.J:
		return compareInt32(c.J, o.J)
	}
	return compareInt32(c.I, o.I)
}

func compareInt32(a, b int32) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}

// Corner is the lower corner of cell c in metres.
func (l Lattice) Corner(c Cell) r3.Vec {
	return r3.Vec{X: l.metres(c.I, 0), Y: l.metres(c.J, 0), Z: l.metres(c.K, 0)}
}

// Centre is the centre of cell c in metres.
func (l Lattice) Centre(c Cell) r3.Vec {
	h := l.edge / 2
	return r3.Vec{X: l.metres(c.I, h), Y: l.metres(c.J, h), Z: l.metres(c.K, h)}
}

func (l Lattice) metres(i int32, plus int64) float64 {
	return float64(int64(i)*l.edge+plus) / QuantaPerMetre
}

// CellOf is the cell that holds the point, after rounding its coordinates to
// whole quanta. The coordinates must be finite and within the lattice's reach.
func (l Lattice) CellOf(p r3.Vec) Cell {
	i, _ := l.locate(p.X)
	j, _ := l.locate(p.Y)
	k, _ := l.locate(p.Z)
	return Cell{i, j, k}
}

// locate returns the cell index of a coordinate in metres and its offset from
// that cell's centre in quanta, in [-edge/2, edge/2).
func (l Lattice) locate(x float64) (cell int32, offset int64) {
	q := int64(math.Floor(x*QuantaPerMetre + 0.5))
	c := q / l.edge
	r := q - c*l.edge
	if r < 0 {
		c--
		r += l.edge
	}
	return int32(c), r - l.edge/2
}

// Moments are the exact sums over the points of a voxel, of coordinates
// relative to the voxel's centre in quanta of 0.1 mm. Adding Moments with the
// same centre is exact and associative, hence independent of order.
type Moments struct {
	N                      int64
	X, Y, Z                int64
	XX, XY, XZ, YY, YZ, ZZ int64
}

// Add adds o, whose centre must be m's.
func (m *Moments) Add(o *Moments) {
	m.N += o.N
	m.X += o.X
	m.Y += o.Y
	m.Z += o.Z
	m.XX += o.XX
	m.XY += o.XY
	m.XZ += o.XZ
	m.YY += o.YY
	m.YZ += o.YZ
	m.ZZ += o.ZZ
}

// AddPoint adds one point at the given offset from the centre, in quanta.
func (m *Moments) AddPoint(x, y, z int64) {
	m.N++
	m.X += x
	m.Y += y
	m.Z += z
	m.XX += x * x
	m.XY += x * y
	m.XZ += x * z
	m.YY += y * y
	m.YZ += y * z
	m.ZZ += z * z
}

// Shifted returns the same sums relative to a centre that lies at -(dx,dy,dz)
// quanta from m's: every point's offset grows by (dx,dy,dz). It is exact as
// long as the result fits: N·(|offset|+|d|)² < 2^63 on each axis.
func (m *Moments) Shifted(dx, dy, dz int64) Moments {
	return Moments{
		N:  m.N,
		X:  m.X + m.N*dx,
		Y:  m.Y + m.N*dy,
		Z:  m.Z + m.N*dz,
		XX: m.XX + dx*(2*m.X+m.N*dx),
		XY: m.XY + dx*m.Y + dy*m.X + m.N*dx*dy,
		XZ: m.XZ + dx*m.Z + dz*m.X + m.N*dx*dz,
		YY: m.YY + dy*(2*m.Y+m.N*dy),
		YZ: m.YZ + dy*m.Z + dz*m.Y + m.N*dy*dz,
		ZZ: m.ZZ + dz*(2*m.Z+m.N*dz),
	}
}

// Mean is the mean offset from the centre in metres. It is zero without points.
func (m *Moments) Mean() r3.Vec {
	if m.N == 0 {
		return r3.Vec{}
	}
	s := 1 / (float64(m.N) * QuantaPerMetre)
	return r3.Vec{X: float64(m.X) * s, Y: float64(m.Y) * s, Z: float64(m.Z) * s}
}

// A Covariance is a symmetric 3×3 matrix in m², divided by n.
type Covariance struct {
	XX, XY, XZ, YY, YZ, ZZ float64
}

// Covariance is that of the points summed, in m² and divided by n, zero
// without points. n·Σxx − Σx² is formed in 128 bit integers, so nothing is
// lost to cancellation before the one final rounding.
func (m *Moments) Covariance() Covariance {
	if m.N == 0 {
		return Covariance{}
	}
	s := 1 / (float64(m.N) * float64(m.N) * QuantaPerMetre * QuantaPerMetre)
	return Covariance{
		XX: s * diffProducts(m.N, m.XX, m.X, m.X),
		XY: s * diffProducts(m.N, m.XY, m.X, m.Y),
		XZ: s * diffProducts(m.N, m.XZ, m.X, m.Z),
		YY: s * diffProducts(m.N, m.YY, m.Y, m.Y),
		YZ: s * diffProducts(m.N, m.YZ, m.Y, m.Z),
		ZZ: s * diffProducts(m.N, m.ZZ, m.Z, m.Z),
	}
}

// diffProducts returns a·b − c·d with one rounding.
func diffProducts(a, b, c, d int64) float64 {
	h1, l1 := mulSigned(a, b)
	h2, l2 := mulSigned(c, d)
	lo, borrow := bits.Sub64(l1, l2, 0)
	hi, _ := bits.Sub64(uint64(h1), uint64(h2), borrow)
	if int64(hi) >= 0 {
		return float64(hi)*(1<<64) + float64(lo)
	}
	// The magnitude, since float64(lo) of a small negative number would lose it.
	lo, borrow = bits.Sub64(0, lo, 0)
	hi, _ = bits.Sub64(0, hi, borrow)
	return -(float64(hi)*(1<<64) + float64(lo))
}

// mulSigned returns the 128 bit product of a and b in two's complement.
func mulSigned(a, b int64) (hi int64, lo uint64) {
	h, l := bits.Mul64(uint64(a), uint64(b))
	return int64(h) - (a>>63)&b - (b>>63)&a, l
}
