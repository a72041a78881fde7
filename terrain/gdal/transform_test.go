package gdal

import (
	"errors"
	"fmt"
	"math"
	"runtime"
	"strings"
	"sync"
	"testing"
)

// dms is an angle in degrees.
func dms(d, m, s float64) float64 { return d + m/60 + s/3600 }

// parse parses a CRS for the length of a test.
func parse(t testing.TB, s string) *CRS {
	t.Helper()
	c, err := ParseCRS(s)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return c
}

// between returns the transform between two CRS, or that of a pipeline when dst
// is empty, for the length of a test.
func between(t testing.TB, src, dst string) *Transform {
	t.Helper()
	var tr *Transform
	var err error
	if dst == "" {
		tr, err = NewPipeline(src)
	} else {
		tr, err = NewTransform(parse(t, src), parse(t, dst))
	}
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { tr.Close() })
	return tr
}

// The examples are those of IOGP Publication 373-7-2, "Geomatics Guidance Note
// 7, part 2: Coordinate Conversions and Transformations including Formulas"
// (GN 7-2), unless the entry names another source.
func TestPublishedCoordinates(t *testing.T) {
	const osgb = "+proj=tmerc +lat_0=49 +lon_0=-2 +k_0=0.9996012717 +x_0=400000 +y_0=-100000 "
	tests := []struct {
		name, src, dst string
		in, want       [3]float64
		tol            [3]float64
	}{
		{"transverse Mercator: OSGB36, GN 7-2", "EPSG:4277", "EPSG:27700",
			[3]float64{0.5, 50.5}, [3]float64{577274.99, 69740.50}, [3]float64{0.011, 0.011}},
		{"transverse Mercator: OSGB36, GN 7-2, with the rounded flattening of its example", osgb + "+a=6377563.396 +rf=299.32496", "",
			[3]float64{0.5, 50.5}, [3]float64{577274.9838, 69740.4923}, [3]float64{0.001, 0.001}},
		{"transverse Mercator: Ordnance Survey, A guide to coordinate systems in Great Britain, annex C", "EPSG:4277", "EPSG:27700",
			[3]float64{dms(1, 43, 4.5177), dms(52, 39, 27.2531)}, [3]float64{651409.903, 313177.270}, [3]float64{0.001, 0.001}},
		{"UTM 32, GRS 80: PROJ documentation and tests (test/gie)", "+proj=utm +zone=32 +ellps=GRS80", "",
			[3]float64{12, 55}, [3]float64{691875.6321, 6098907.8250}, [3]float64{1e-4, 1e-4}},
		{"UTM 33, WGS 84, central meridian: Krueger series of order n^6", "EPSG:4326", "EPSG:32633",
			[3]float64{15, 47.5}, [3]float64{500000, 5260729.7331}, [3]float64{1e-4, 1e-4}},
		{"UTM 33, WGS 84: Krueger series of order n^6", "EPSG:4326", "EPSG:32633",
			[3]float64{13.3, 47.1}, [3]float64{370999.2216, 5217678.9592}, [3]float64{1e-4, 1e-4}},
		{"UTM 18 south, WGS 84: Krueger series of order n^6", "EPSG:4326", "EPSG:32718",
			[3]float64{-74, -13.5}, [3]float64{608225.0981, 8507349.5938}, [3]float64{1e-4, 1e-4}},
		{"far from the central meridian: IOGP GIGS 5101, JHS formula, 80 N", osgb + "+ellps=WGS84", "",
			[3]float64{3, 80}, [3]float64{496813.178, 3358297.326}, [3]float64{0.03, 0.03}},
		{"far from the central meridian: IOGP GIGS 5101, JHS formula, 49 N", osgb + "+ellps=WGS84", "",
			[3]float64{3, 49}, [3]float64{765648.501, -87944.74}, [3]float64{0.03, 0.03}},
		// GN 7-2 prints centimetres, in feet for Texas and Michigan.
		{"Lambert conic, one parallel: Jamaica, GN 7-2", "+proj=lcc +lat_1=18 +lat_0=18 +lon_0=-77 +k_0=1 +x_0=250000 +y_0=150000 +ellps=clrk66", "",
			[3]float64{-dms(76, 56, 37.26), dms(17, 55, 55.80)}, [3]float64{255966.58, 142493.51}, [3]float64{0.01, 0.01}},
		{"Lambert conic, two parallels: Texas South Central, GN 7-2", "EPSG:4267", "EPSG:32040",
			[3]float64{-96, 28.5}, [3]float64{2963503.91, 254759.80}, [3]float64{0.01, 0.01}},
		{"Lambert conic, Michigan: GN 7-2", "EPSG:4268", "EPSG:6201",
			[3]float64{-dms(83, 10, 0), 43.75}, [3]float64{2308335.75, 160210.48}, [3]float64{0.01, 0.01}},
		{"Lambert conic, Belgium 1972: IOGP GIGS 5103", "EPSG:4313", "EPSG:31370",
			[3]float64{5, 57}, [3]float64{188698.877, 857277.135}, [3]float64{0.001, 0.001}},
		{"web Mercator: GN 7-2", "EPSG:4326", "EPSG:3857",
			[3]float64{-100.33333333, 24.46358028}, [3]float64{-11169055.58, 2810000.00}, [3]float64{0.01, 0.01}},
		{"geographic to geocentric: GN 7-2", "EPSG:4979", "EPSG:4978",
			[3]float64{dms(2, 7, 46.380), dms(53, 48, 33.820), 73}, [3]float64{3771793.968, 140253.342, 5124304.349}, [3]float64{0.001, 0.001, 0.001}},
		{"geocentric to topocentric: GN 7-2", "+proj=topocentric +ellps=WGS84 +X_0=3652755.3058 +Y_0=319574.6799 +Z_0=5201547.3536", "",
			[3]float64{3771793.968, 140253.342, 5124304.349}, [3]float64{-189013.869, -128642.040, -4220.171}, [3]float64{0.001, 0.001, 0.001}},
		// The seven parameters and the test point are Geoscience Australia's, in
		// PROJ's documentation of the Helmert transform; the tolerance, 75 um, is
		// that of its test.
		{"coordinate frame: GDA94 to GDA2020 at Alice Springs, ICSM", "+proj=helmert +convention=coordinate_frame +x=0.06155 +rx=-0.0394924 +y=-0.01087 +ry=-0.0327221 +z=-0.04019 +rz=-0.0328979 +s=-0.009994", "",
			[3]float64{-4052051.7643, 4212836.2017, -2545106.0245}, [3]float64{-4052052.7379, 4212835.9897, -2545104.5898}, [3]float64{75e-6, 75e-6, 75e-6}},
		{"vertical offset and slope: GN 7-2", "+proj=vertoffset +lat_0=46.9166666666666666 +lon_0=8.183333333333334 +dh=-0.245 +slope_lat=-0.210 +slope_lon=-0.032 +ellps=GRS80", "",
			[3]float64{dms(9, 40, 0), dms(47, 20, 0), 473}, [3]float64{dms(9, 40, 0), dms(47, 20, 0), 472.690}, [3]float64{1e-9, 1e-9, 0.001}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			tr := between(t, tt.src, tt.dst)
			x, y, z := tt.in[:1:1], tt.in[1:2:2], tt.in[2:3:3]
			start := tt.in
			if err := tr.Apply(x, y, z); err != nil {
				t.Fatal(err)
			}
			for i, got := range tt.in {
				if math.Abs(got-tt.want[i]) > tt.tol[i] {
					t.Errorf("coordinate %d is %.6f, want %.6f within %g", i, got, tt.want[i], tt.tol[i])
				}
			}
			if err := tr.Inverse(x, y, z); err != nil {
				t.Fatal(err)
			}
			for i, got := range tt.in {
				// A micrometre, or what is one in degrees; the Helmert step
				// inverts to first order only, good to 0.1 mm.
				tol := 1e-6
				if strings.Contains(tt.src, "helmert") {
					tol = 1e-4
				}
				if math.Abs(got-start[i]) > tol {
					t.Errorf("back to %.9f, want %.9f", got, start[i])
				}
			}
		})
	}
}

func TestApplyReportsFailures(t *testing.T) {
	tr := between(t, "EPSG:4326", "EPSG:32633")
	x := []float64{15, 15, math.NaN(), 15}
	y := []float64{47, 1e6, 47, 47.5}
	z := []float64{1, 2, 3, 4}
	err := tr.Apply(x, y, z)
	var te *TransformError
	if !errors.As(err, &te) || te.Failed != 2 || te.First != 1 || te.Reason == "" {
		t.Fatalf("error %#v (%v), want 2 failures, the first at 1, with PROJ's reason", err, err)
	}
	for i, bad := range []bool{false, true, true, false} {
		if got := math.IsInf(x[i], 1) && math.IsInf(y[i], 1) && math.IsInf(z[i], 1); got != bad {
			t.Errorf("point %d is %g %g %g", i, x[i], y[i], z[i])
		}
	}
	if math.Abs(x[3]-500000) > 1e-4 || z[3] != 4 {
		t.Errorf("the point after the failures is %g %g %g", x[3], y[3], z[3])
	}
	if err := tr.Apply(nil, nil, nil); err != nil {
		t.Error(err)
	}
}

func TestUnitsOfHeight(t *testing.T) {
	// Both units of a compound CRS count: US survey feet are 1200/3937 m.
	tr := between(t, "EPSG:2225+6360", "EPSG:26910+5703")
	x, y, z := []float64{6000000}, []float64{2000000}, []float64{1000}
	if err := tr.Apply(x, y, z); err != nil {
		t.Fatal(err)
	}
	if want := 1000 * 1200.0 / 3937; math.Abs(z[0]-want) > 1e-9 {
		t.Errorf("height %.9f m, want %.9f", z[0], want)
	}
}

func TestAccuracy(t *testing.T) {
	plain := between(t, "EPSG:4326", "EPSG:32633")
	if m, ballpark := plain.Accuracy(); m > 0 || ballpark {
		t.Errorf("a map projection: %g m, ballpark %t", m, ballpark)
	}
	// No operation is registered between these two datums: PROJ guesses.
	guess := between(t, "EPSG:4326", "+proj=utm +zone=33 +ellps=intl")
	x, y := []float64{15}, []float64{47}
	if err := guess.Apply(x, y, nil); err != nil {
		t.Fatal(err)
	}
	if _, ballpark := guess.Accuracy(); !ballpark {
		t.Errorf("%q is not called a ballpark operation", guess.Operation())
	}
	// ED50 to WGS 84: whichever of the registered ones is taken, it has metres.
	shift := between(t, "EPSG:4230", "EPSG:4326")
	x, y = []float64{10}, []float64{50}
	if err := shift.Apply(x, y, nil); err != nil {
		t.Fatal(err)
	}
	if m, ballpark := shift.Accuracy(); !(m > 0) || ballpark || shift.Operation() == "" {
		t.Errorf("%q: %g m, ballpark %t", shift.Operation(), m, ballpark)
	}
}

func TestPipelineRefuses(t *testing.T) {
	for s, want := range map[string]string{
		"":                                    "not a PROJ string",
		"EPSG:4326":                           "not a PROJ string",
		"+init=epsg:4326":                     "not a PROJ string",
		"+proj=utm +init=/x/y:1":              "not a PROJ string",
		"+proj=nosuchthing":                   "no such coordinate operation",
		"+proj=utm +zone=99":                  "no such coordinate operation",
		"+proj=hgridshift +grids=nowhere.gsb": "nowhere.gsb",
	} {
		tr, err := NewPipeline(s)
		if err == nil {
			tr.Close()
			t.Errorf("%q: no error", s)
			continue
		}
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error %q, want it to say %q", s, err, want)
		}
	}
}

func TestTransformAfterClose(t *testing.T) {
	tr := between(t, "+proj=utm +zone=33", "")
	for range 2 {
		if err := tr.Close(); err != nil {
			t.Fatal(err)
		}
	}
	if err := tr.Apply([]float64{1}, []float64{2}, nil); !errors.Is(err, ErrClosed) {
		t.Errorf("error %v, want ErrClosed", err)
	}
	if m, _ := tr.Accuracy(); m != -1 {
		t.Errorf("accuracy %g", m)
	}
}

// Each goroutine has its own CRS and Transform, and is moved between threads.
func TestTransformsInParallel(t *testing.T) {
	defer runtime.GC()
	var wg sync.WaitGroup
	for g := range 8 {
		wg.Go(func() {
			for i := range 5 {
				zone := 31 + (g+i)%4
				src, err := ParseCRS("EPSG:4326")
				if err != nil {
					t.Error(err)
					return
				}
				dst, err := ParseCRS(fmt.Sprintf("EPSG:326%d", zone))
				if err != nil {
					t.Error(err)
					return
				}
				tr, err := NewTransform(src, dst)
				if err != nil {
					t.Error(err)
					return
				}
				x, y := []float64{float64(zone*6 - 183)}, []float64{47.5}
				if _, err := ParseCRS("EPSG:999999"); err == nil || !strings.Contains(err.Error(), "crs not found") {
					t.Errorf("error %v, want PROJ's own", err)
				}
				runtime.Gosched()
				if err := tr.Apply(x, y, nil); err != nil {
					t.Error(err)
				}
				// The northing is that of the published entry for zone 33.
				if math.Abs(x[0]-500000) > 1e-4 || math.Abs(y[0]-5260729.7331) > 1e-4 {
					t.Errorf("zone %d: %.4f %.4f", zone, x[0], y[0])
				}
				tr.Close()
				if g%2 == 0 {
					src.Close()
					dst.Close() // the others are left to the garbage collector
				}
			}
		})
	}
	wg.Wait()
}

func BenchmarkApply(b *testing.B) {
	tr := between(b, "EPSG:4326", "EPSG:32633")
	const n = 4096
	lon, lat := make([]float64, n), make([]float64, n)
	x, y, z := make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range lon {
		lon[i], lat[i] = 13+float64(i)/n, 47+float64(i%64)/64
	}
	b.ReportAllocs()
	for b.Loop() {
		copy(x, lon)
		copy(y, lat)
		if err := tr.Apply(x, y, z); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/n, "ns/point")
}

func ExampleTransform_Apply() {
	lonlat, err := ParseCRS("EPSG:4326")
	if err != nil {
		panic(err)
	}
	defer lonlat.Close()
	utm, err := ParseCRS("EPSG:32633")
	if err != nil {
		panic(err)
	}
	defer utm.Close()
	t, err := NewTransform(lonlat, utm)
	if err != nil {
		panic(err)
	}
	defer t.Close()
	x, y := []float64{15, 13.3}, []float64{47.5, 47.1}
	if err := t.Apply(x, y, nil); err != nil {
		panic(err)
	}
	fmt.Printf("%.3f %.3f\n", x, y)
	// Output: [500000.000 370999.222] [5260729.733 5217678.959]
}
