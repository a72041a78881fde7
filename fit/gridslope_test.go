package fit

import (
	"math"
	"testing"
)

// Worked examples that stand in several public texts; each value agrees with
// gdaldem of GDAL 3.6.2 to its float32 and with NumPy.
func TestWindow(t *testing.T) {
	none := math.NaN()
	tests := []struct {
		name                    string
		w                       Window
		cell                    float64
		hornSlope, hornAspect   float64
		ztSlope, ztAspect       float64
		riley, wilson, tpi, rng float64
	}{
		{"75.26°", Window{50, 45, 50, 30, 30, 30, 8, 10, 10}, 5,
			75.2576576917, 180.7538483331, 74.0546040991, 180, 48.0520551069, 14.625, 0.875, 42},
		{"steep east", Window{101, 92, 85, 101, 92, 85, 101, 91, 84}, 1,
			82.9908852783, 92.6425452941, 82.8887168665, 93.5763343750, 20.1494416796, 6.25, -0.5, 17},
		{"asymmetric", Window{10, 13, 11, 9, 12, 17, 8, 6, 20}, 2,
			61.7943965425, 256.4295656148, 69.3792660515, 228.8140748343, 12.4899959968, 3.75, 0.25, 14},
		{"1 to 9", Window{1, 2, 3, 4, 5, 6, 7, 8, 9}, 1,
			72.4515993862, 341.5650511771, 72.4515993862, 341.5650511771, 7.7459666924, 2.5, 0, 8},
		{"pit", Window{1, 1, 1, 1, 0, 1, 1, 1, 1}, 1,
			0, none, 0, none, 2.8284271247, 1, -1, 1},
		{"level", Window{7, 7, 7, 7, 7, 7, 7, 7, 7}, 1, 0, none, 0, none, 0, 0, 0, 0},
	}
	for _, tt := range tests {
		for _, m := range []struct {
			gradient      func(float64) (float64, float64)
			slope, aspect float64
		}{{tt.w.Horn, tt.hornSlope, tt.hornAspect}, {tt.w.ZevenbergenThorne, tt.ztSlope, tt.ztAspect}} {
			e, n := m.gradient(tt.cell)
			near(t, tt.name+" slope", GradientSlopeDeg(e, n), m.slope, 1e-9)
			aspect, ok := GradientAspectDeg(e, n)
			if ok == math.IsNaN(m.aspect) {
				t.Errorf("%s: aspect ok = %v", tt.name, ok)
			}
			if ok {
				near(t, tt.name+" aspect", aspect, m.aspect, 1e-9)
			}
		}
		near(t, tt.name+" Riley", tt.w.RuggednessRiley(), tt.riley, 1e-9)
		near(t, tt.name+" Wilson", tt.w.RuggednessWilson(), tt.wilson, 1e-12)
		near(t, tt.name+" position", tt.w.Position(), tt.tpi, 1e-12)
		near(t, tt.name+" range", tt.w.Range(), tt.rng, 1e-12)
	}
	e, n := tests[0].w.Horn(5)
	near(t, "Horn east", e, 0.05, 1e-12)
	near(t, "Horn north", n, 3.8, 1e-12)
	near(t, "Horn percent", 100*math.Hypot(e, n), 380.03289331, 1e-8)
	e, n = tests[1].w.Horn(1)
	near(t, "Horn east", e, -8.125, 1e-12)
	near(t, "Horn north", n, 0.375, 1e-12)
}

// Both methods are exact on planes and quadratics; central differences keep a
// cubic's s² term.
func TestWindowExact(t *testing.T) {
	window := func(s float64, f func(x, y float64) float64) *Window {
		var w Window
		for i := range w {
			w[i] = f(float64(i%3-1)*s, float64(1-i/3)*s)
		}
		return &w
	}
	for _, s := range []float64{0.5, 1, 30} {
		plane := window(s, func(x, y float64) float64 { return 0.75*x + y + 100 })
		quadratic := window(s, func(x, y float64) float64 {
			return 0.05*x*x + 0.02*x*y - 0.03*y*y + 0.3*x - 0.4*y + 50
		})
		for _, tt := range []struct {
			w             *Window
			slope, aspect float64
		}{{plane, 51.34019174591, 216.86989764584}, {quadratic, 26.56505117708, 323.13010235}} {
			for _, gradient := range []func(float64) (float64, float64){tt.w.Horn, tt.w.ZevenbergenThorne} {
				e, n := gradient(s)
				aspect, _ := GradientAspectDeg(e, n)
				near(t, "slope", GradientSlopeDeg(e, n), tt.slope, 1e-10)
				near(t, "aspect", aspect, tt.aspect, 1e-8)
			}
		}
	}
	e, n := window(2, func(x, y float64) float64 { return 0.01*x*x*x + 0.5*y }).ZevenbergenThorne(2)
	near(t, "cubic east", e, 0.04, 1e-15)
	near(t, "cubic slope", GradientSlopeDeg(e, n), 26.63822601, 1e-8)
}

func TestWindowNoData(t *testing.T) {
	w := Window{math.NaN(), 2, 3, 4, 5, 6, 7, 8, 9}
	if e, n := w.Horn(1); !math.IsNaN(e) || !math.IsNaN(n) {
		t.Errorf("Horn beside a hole: %v, %v", e, n)
	}
	if e, n := w.ZevenbergenThorne(1); math.IsNaN(e) || math.IsNaN(n) {
		t.Error("Zevenbergen-Thorne uses no corner")
	}
	for i, v := range []float64{w.RuggednessRiley(), w.RuggednessWilson(), w.Position(), w.Range()} {
		if !math.IsNaN(v) {
			t.Errorf("measure %d beside a hole: %v", i, v)
		}
	}
	if _, ok := GradientAspectDeg(math.NaN(), 0); ok {
		t.Error("NaN has an aspect")
	}
	// Ground that faces north exactly has 0, never 360.
	if a, ok := GradientAspectDeg(1e-320, -1); !ok || a != 0 {
		t.Errorf("aspect of north %v, %v", a, ok)
	}
	if a, ok := GradientAspectDeg(0, -1); !ok || a != 0 || math.Signbit(a) {
		t.Errorf("aspect of north %v, %v", a, ok)
	}
}
