package terrain

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

func mustLattice(t testing.TB, g float64) Lattice {
	t.Helper()
	l, err := NewLattice(g)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func TestNewLattice(t *testing.T) {
	for _, c := range []struct {
		spacing float64
		quanta  int64 // 0: refused
	}{
		{0.05, 500}, {0.0501, 502}, {0.07003, 700}, {1, 10000}, {30.87, 308700},
		{0.005, 50}, {0.0049, 0}, {5000, 50000000}, {5001, 0}, {0, 0}, {-1, 0}, {math.NaN(), 0}, {math.Inf(1), 0},
	} {
		l, err := NewLattice(c.spacing)
		if (err != nil) != (c.quanta == 0) || err == nil && l.Quanta() != c.quanta {
			t.Errorf("NewLattice(%g) = %d quanta, %v; want %d", c.spacing, l.Quanta(), err, c.quanta)
		}
	}
}

func TestCellOf(t *testing.T) {
	l := mustLattice(t, 0.05)
	for _, c := range []struct {
		p    r3.Vec
		want Cell
	}{
		{r3.Vec{}, Cell{}},
		{r3.Vec{X: 0.0499, Y: -0.0001, Z: 0.05}, Cell{0, -1, 1}},
		{r3.Vec{X: -0.05, Y: -0.0501, Z: 1e6}, Cell{-1, -2, 20000000}},
		{r3.Vec{X: 412000.02, Y: 6543000.07, Z: -12.34}, Cell{8240000, 130860001, -247}},
	} {
		if got := l.CellOf(c.p); got != c.want {
			t.Errorf("CellOf(%v) = %v, want %v", c.p, got, c.want)
		}
	}
}

// Published values of a set that one pass over squares loses: NIST StRD
// NumAcc4, 10000000.2 and then 500 times 10000000.1, 10000000.3, of mean
// 10000000.2 and standard deviation 0.1 (n − 1). The coordinates are quantised,
// not rounded, here, so the result is exact.
func TestCovarianceNumAcc4(t *testing.T) {
	l := mustLattice(t, 1000)
	points := []r3.Vec{{X: 10000000.2}}
	for range 500 {
		points = append(points, r3.Vec{X: 10000000.1}, r3.Vec{X: 10000000.3})
	}
	v, err := SumPoints(l, points)
	if err != nil {
		t.Fatal(err)
	}
	if v.Len() != 1 {
		t.Fatalf("%d voxels, want 1", v.Len())
	}
	n := float64(v.Moments[0].N)
	sd := math.Sqrt(v.Moments[0].Covariance().XX * n / (n - 1))
	if math.Abs(sd-0.1) > 1e-12 {
		t.Errorf("standard deviation %.15f, want 0.1", sd)
	}
	if m := v.Mean(0).X; math.Abs(m-10000000.2) > 2e-9 {
		t.Errorf("mean %.10f, want 10000000.2", m)
	}
}

// The covariance of quantised points, against rational arithmetic.
func TestCovarianceExact(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 200 {
		var m Moments
		n := 1 + rng.IntN(40)
		span := int64(1) << (1 + rng.IntN(28)) // 40 squares of 2^28 fit
		pts := make([][3]int64, n)
		for i := range pts {
			for a := range 3 {
				pts[i][a] = rng.Int64N(2*span) - span
			}
			m.AddPoint(pts[i][0], pts[i][1], pts[i][2])
		}
		c := m.Covariance()
		got := [6]float64{c.XX, c.XY, c.XZ, c.YY, c.YZ, c.ZZ}
		k := 0
		for a := range 3 {
			for b := a; b < 3; b++ {
				want := ratCovariance(pts, a, b)
				if err := math.Abs(got[k] - want); err > 4e-16*math.Abs(want) {
					t.Fatalf("n %d span %d axes %d %d: %g, want %g", n, span, a, b, got[k], want)
				}
				k++
			}
		}
	}
}

func ratCovariance(pts [][3]int64, a, b int) float64 {
	n := big.NewInt(int64(len(pts)))
	var sa, sb, sab big.Int
	for _, p := range pts {
		x, y := big.NewInt(p[a]), big.NewInt(p[b])
		sa.Add(&sa, x)
		sb.Add(&sb, y)
		sab.Add(&sab, new(big.Int).Mul(x, y))
	}
	num := new(big.Int).Sub(new(big.Int).Mul(n, &sab), new(big.Int).Mul(&sa, &sb))
	den := new(big.Int).Mul(new(big.Int).Mul(n, n), big.NewInt(QuantaPerMetre*QuantaPerMetre))
	f, _ := new(big.Rat).SetFrac(num, den).Float64()
	return f
}

// Shifting there and back, and shifting before or after adding, are the same.
func TestShifted(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for range 500 {
		var m, direct Moments
		dx, dy, dz := rng.Int64N(4e6)-2e6, rng.Int64N(4e6)-2e6, rng.Int64N(4e6)-2e6
		for range 1 + rng.IntN(20) {
			x, y, z := rng.Int64N(1000)-500, rng.Int64N(1000)-500, rng.Int64N(1000)-500
			m.AddPoint(x, y, z)
			direct.AddPoint(x+dx, y+dy, z+dz)
		}
		s := m.Shifted(dx, dy, dz)
		if s != direct {
			t.Fatalf("shifted %v, want %v", s, direct)
		}
		if back := s.Shifted(-dx, -dy, -dz); back != m {
			t.Fatalf("shifted back %v, want %v", back, m)
		}
	}
}
