package fit

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// symmetric builds Q·diag(l)·Qᵀ from a random rotation.
func symmetric(rng *rand.Rand, l [3]float64) terrain.Covariance {
	w, x, y, z := rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
	n := math.Sqrt(w*w + x*x + y*y + z*z)
	w, x, y, z = w/n, x/n, y/n, z/n
	q := [3][3]float64{
		{1 - 2*(y*y+z*z), 2 * (x*y - w*z), 2 * (x*z + w*y)},
		{2 * (x*y + w*z), 1 - 2*(x*x+z*z), 2 * (y*z - w*x)},
		{2 * (x*z - w*y), 2 * (y*z + w*x), 1 - 2*(x*x+y*y)},
	}
	at := func(i, j int) float64 {
		return q[i][0]*l[0]*q[j][0] + q[i][1]*l[1]*q[j][1] + q[i][2]*l[2]*q[j][2]
	}
	return terrain.Covariance{XX: at(0, 0), XY: at(0, 1), XZ: at(0, 2), YY: at(1, 1), YZ: at(1, 2), ZZ: at(2, 2)}
}

func dense(c terrain.Covariance) *mat.SymDense {
	return mat.NewSymDense(3, []float64{c.XX, c.XY, c.XZ, c.XY, c.YY, c.YZ, c.XZ, c.YZ, c.ZZ})
}

// toUnit scales c by a power of two to elements of at most 1.
func toUnit(c terrain.Covariance) (terrain.Covariance, int) {
	_, exp := math.Frexp(max(c.XX, c.YY, c.ZZ))
	f := func(v float64) float64 { return math.Ldexp(v, -exp) }
	return terrain.Covariance{XX: f(c.XX), XY: f(c.XY), XZ: f(c.XZ), YY: f(c.YY), YZ: f(c.YZ), ZZ: f(c.ZZ)}, exp
}

// eigenErrors returns the residual, the loss of orthogonality and the largest
// eigenvalue error against LAPACK's algorithm in gonum, all in units of
// epsilon·|A|.
func eigenErrors(t *testing.T, c terrain.Covariance) (residual, orthogonality, value float64) {
	t.Helper()
	lambda, axes := EigenSym3(c)
	var ref mat.EigenSym
	// Gonum's dsterf panics on matrices that it must scale itself.
	scaled, exp := toUnit(c)
	if !ref.Factorize(dense(scaled), false) {
		t.Fatal("reference failed")
	}
	want := ref.Values(nil)
	for i := range want {
		want[i] = math.Ldexp(want[i], exp)
	}
	unit := epsilon * max(math.Abs(want[2]), math.Abs(want[0]))
	if unit == 0 {
		unit = epsilon
	}
	for i := range 3 {
		value = max(value, math.Abs(lambda[i]-max(want[i], 0))/unit)
		for j := range 3 {
			d := r3.Dot(axes[i], axes[j])
			if i == j {
				d--
			}
			orthogonality = max(orthogonality, math.Abs(d)/epsilon)
		}
	}
	if lambda[0] > lambda[1] || lambda[1] > lambda[2] || lambda[0] < 0 {
		t.Errorf("EigenSym3(%+v) = %v, not ascending from 0", c, lambda)
	}
	if det := r3.Dot(axes[0], r3.Cross(axes[1], axes[2])); math.Abs(det-1) > 1e-14 {
		t.Errorf("EigenSym3(%+v): determinant of axes %v", c, det)
	}
	v := mat.NewDense(3, 3, nil)
	for i, a := range axes {
		v.SetCol(i, []float64{a.X, a.Y, a.Z})
	}
	var back mat.Dense
	back.Product(v, mat.NewDiagDense(3, lambda[:]), v.T())
	back.Sub(&back, dense(c))
	return mat.Norm(&back, 2) / unit, orthogonality, value
}

func TestEigenSym3Accuracy(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	kinds := []struct {
		name   string
		lambda func() [3]float64
	}{
		{"random", func() [3]float64 { return [3]float64{rng.Float64(), rng.Float64(), rng.Float64()} }},
		{"graded", func() [3]float64 {
			return [3]float64{math.Pow(10, -12*rng.Float64()), math.Pow(10, -6*rng.Float64()), 1}
		}},
		{"flat", func() [3]float64 { return [3]float64{1e-12 * rng.Float64(), 0.5 + rng.Float64(), 1} }},
		{"linear", func() [3]float64 { return [3]float64{1e-12 * rng.Float64(), 1e-12 * rng.Float64(), 1} }},
		{"two equal", func() [3]float64 { return [3]float64{1, 1, rng.Float64()} }},
		{"near isotropic", func() [3]float64 { return [3]float64{1 + 1e-12*rng.Float64(), 1, 1 - 1e-14*rng.Float64()} }},
		{"rank one", func() [3]float64 { return [3]float64{0, 0, 1} }},
		{"tiny", func() [3]float64 { return [3]float64{1e-130 * rng.Float64(), 1e-120, 1e-119} }},
		{"minute", func() [3]float64 { return [3]float64{1e-230 * rng.Float64(), 1e-220, 1e-219} }},
		{"huge", func() [3]float64 { return [3]float64{1e200 * rng.Float64(), 1e220, 3e220} }},
	}
	const bound = 8 // promised by EigenSym3
	for _, k := range kinds {
		var worst [3]float64
		for range 3000 {
			r, o, v := eigenErrors(t, symmetric(rng, k.lambda()))
			worst = [3]float64{max(worst[0], r), max(worst[1], o), max(worst[2], v)}
		}
		t.Logf("%-15s residual %.2f orthogonality %.2f values %.2f, in eps·|A|", k.name, worst[0], worst[1], worst[2])
		for _, w := range worst {
			if !(w <= bound) {
				t.Errorf("%s: errors %v exceed %d", k.name, worst, bound)
			}
		}
	}
}

// Where nothing but rounding tells the eigenvalues apart, any of them may come
// out of the 2×2 problem and be the one that was set apart.
func TestEigenSym3OrdersIsotropic(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	ulps := func() float64 { return float64(rng.IntN(7)-3) * epsilon }
	for range 20000 {
		c := terrain.Covariance{XX: 1 + ulps(), YY: 1 + ulps(), ZZ: 1 + ulps(), XY: ulps(), XZ: ulps(), YZ: ulps()}
		lambda, axes := EigenSym3(c)
		if !(lambda[0] <= lambda[1] && lambda[1] <= lambda[2]) {
			t.Fatalf("%v: eigenvalues %v do not ascend", c, lambda)
		}
		if hand := r3.Dot(r3.Cross(axes[0], axes[1]), axes[2]); math.Abs(hand-1) > 1e-14 {
			t.Fatalf("%v: axes %v have the triple product %g, want 1", c, axes, hand)
		}
	}
}

func TestEigenSym3Values(t *testing.T) {
	tests := []struct {
		name string
		c    terrain.Covariance
		want [3]float64
		tol  float64
	}{
		// The second difference matrix, by hand: 2 − √2, 2, 2 + √2.
		{"second difference", terrain.Covariance{XX: 2, XY: -1, YY: 2, YZ: -1, ZZ: 2}, [3]float64{2 - math.Sqrt2, 2, 2 + math.Sqrt2}, 1e-14},
		// The trigonometric form gives −4.7e-9 here (Kopp 2008 on the pitfall).
		{"thin rod", terrain.Covariance{XX: 1e-9, YY: 1e-9, ZZ: 1}, [3]float64{1e-9, 1e-9, 1}, 1e-24},
		{"identity", terrain.Covariance{XX: 3, YY: 3, ZZ: 3}, [3]float64{3, 3, 3}, 0},
		{"zero", terrain.Covariance{}, [3]float64{}, 0},
		{"graded diagonal", terrain.Covariance{XX: 1, YY: 1e-10, ZZ: 1e-20}, [3]float64{1e-20, 1e-10, 1}, 1e-26},
	}
	for _, tt := range tests {
		got, _ := EigenSym3(tt.c)
		for i := range got {
			if math.Abs(got[i]-tt.want[i]) > tt.tol {
				t.Errorf("%s: eigenvalues %v, want %v", tt.name, got, tt.want)
				break
			}
		}
	}
	if got, _ := EigenSym3(terrain.Covariance{XX: math.NaN(), YY: 1}); !math.IsNaN(got[0]) {
		t.Errorf("of NaN: %v", got)
	}
}

func BenchmarkEigenSym3(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 1))
	cs := make([]terrain.Covariance, 1024)
	for i := range cs {
		cs[i] = symmetric(rng, [3]float64{1e-4 * rng.Float64(), 0.5 + rng.Float64(), 1 + rng.Float64()})
	}
	b.ReportAllocs()
	var sum float64
	for i := 0; b.Loop(); i++ {
		l, a := EigenSym3(cs[i&1023])
		sum += l[0] + a[0].X
	}
	if math.IsNaN(sum) {
		b.Fatal(sum)
	}
}
