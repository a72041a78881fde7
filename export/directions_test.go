package export

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/num/quat"
	"gonum.org/v1/gonum/spatial/r3"
)

// The quaternion rotates the unit vectors to the axes, by gonum's rotation.
func TestQuaternion(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	ex, ey, ez := r3.Vec{X: 1}, r3.Vec{Y: 1}, r3.Vec{Z: 1}
	sets := [][3]r3.Vec{
		{ex, ey, ez}, {ey, ez, ex}, {ez, ex, ey}, // identity and thirds of a turn
		{ex, r3.Scale(-1, ey), r3.Scale(-1, ez)}, {r3.Scale(-1, ex), ey, r3.Scale(-1, ez)}, {r3.Scale(-1, ex), r3.Scale(-1, ey), ez}, // half turns
	}
	for range 500 {
		a := r3.Unit(r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()})
		b := r3.Unit(r3.Cross(a, r3.Vec{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}))
		sets = append(sets, [3]r3.Vec{a, b, r3.Cross(a, b)})
	}
	for _, axes := range sets {
		q := quaternion(axes)
		rotation := r3.Rotation(quat.Number{Real: q[0], Imag: q[1], Jmag: q[2], Kmag: q[3]})
		for i, e := range [3]r3.Vec{ex, ey, ez} {
			if d := r3.Norm(r3.Sub(rotation.Rotate(e), axes[i])); d > 1e-14 {
				t.Errorf("axes %v: axis %d is off by %g", axes, i, d)
			}
		}
		norm := math.Sqrt(q[0]*q[0] + q[1]*q[1] + q[2]*q[2] + q[3]*q[3])
		if math.Abs(norm-1) > 1e-15 {
			t.Errorf("axes %v: norm %v", axes, norm)
		}
		for _, v := range q {
			if v != 0 {
				if v < 0 {
					t.Errorf("axes %v: first component of %v is negative", axes, q)
				}
				break
			}
		}
	}
}

func TestTrendPlunge(t *testing.T) {
	s := math.Sqrt(0.5)
	tests := []struct {
		v             r3.Vec
		trend, plunge float64
	}{
		{r3.Vec{Y: 1}, 0, 0},
		{r3.Vec{Y: -1}, 0, 0},
		{r3.Vec{X: 1}, 90, 0},
		{r3.Vec{X: -1}, 90, 0},
		{r3.Vec{X: s, Y: -s}, 135, 0},
		{r3.Vec{X: -s, Y: s}, 135, 0},
		{r3.Vec{Z: 1}, 0, 90},
		{r3.Vec{Z: -1}, 0, 90},
		{r3.Vec{X: s, Z: -s}, 90, 45},
		{r3.Vec{X: s, Z: s}, 270, 45}, // its downward end points west
		{r3.Vec{Y: -math.Sqrt(3) / 2, Z: -0.5}, 180, 30},
	}
	for _, tt := range tests {
		trend, plunge := trendPlunge(tt.v)
		if math.Abs(trend-tt.trend) > 1e-12 || math.Abs(plunge-tt.plunge) > 1e-12 {
			t.Errorf("%v: %v/%v, want %v/%v", tt.v, trend, plunge, tt.trend, tt.plunge)
		}
	}
}

func TestAzimuth(t *testing.T) {
	if got := azimuth(r3.Vec{X: -1e-300, Y: 1}); got != 0 {
		t.Errorf("a hair west of north: %v, want 0 rather than 360", got)
	}
	if got := azimuth(r3.Vec{Z: 1}); got != 0 {
		t.Errorf("vertical: %v, want 0", got)
	}
}

// The pole of plane 130/50 (dip direction/dip) is 310/40: Brady & Brown, Rock
// Mechanics for Underground Mining, appendix A.
func TestPole(t *testing.T) {
	trend, plunge := trendPlunge(normalOf(50, 130))
	if math.Abs(trend-310) > 1e-12 || math.Abs(plunge-40) > 1e-12 {
		t.Errorf("pole %v/%v, want 310/40", trend, plunge)
	}
}

func TestInclination(t *testing.T) {
	for _, want := range []float64{0, 1e-7, 30, 90, 110, 180} {
		if got := inclination(normalOf(want, 77)); math.Abs(got-want) > 1e-13 {
			t.Errorf("inclination %v, want %v", got, want)
		}
	}
}
