package fit

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// lineAlong is the unit vector of a line of the given trend and plunge.
func lineAlong(trendDeg, plungeDeg float64) r3.Vec {
	st, ct := math.Sincos(radians(trendDeg))
	sp, cp := math.Sincos(radians(plungeDeg))
	return r3.Vec{X: st * cp, Y: ct * cp, Z: -sp}
}

// Nine directions of remanent magnetism in Icelandic lava, Fisher 1953 (doi
// 10.1098/rspa.1953.0064), as listed in SciPy's test_morestats.py, with the
// mean published there; the digits beyond by NumPy and R.
func TestDirectionsFisher1953(t *testing.T) {
	declination := []float64{343.2, 62, 36.9, 27, 359, 5.7, 50.4, 357.6, 44}
	inclination := []float64{66.1, 68.7, 70.1, 82.1, 79.5, 73, 69.3, 58.8, 51.4}
	var d Directions
	for i := range declination {
		d.Add(lineAlong(declination[i], inclination[i]))
	}
	mean, r, ok := d.Mean()
	if !ok {
		t.Fatal("no mean")
	}
	near(t, "R", r, 8.771981493912, 1e-10)
	near(t, "mean north", mean.Y, 0.2984328685, 1e-9)
	near(t, "mean east", mean.X, 0.1345542774, 1e-9)
	near(t, "mean down", -mean.Z, 0.9448983911, 1e-9)
	trend, plunge := TrendPlunge(mean)
	near(t, "declination", trend, 24.2691609696, 1e-8)
	near(t, "inclination", plunge, 70.8911557385, 1e-8)
	k, _ := d.Concentration()
	near(t, "k", k, 35.0848715627, 1e-8)
	// The published estimate of κ by maximum likelihood solves coth κ − 1/κ = R/N.
	near(t, "R/N of likely kappa", r/9, langevin(39.4704805080), 1e-11)
	near(t, "alpha95", confidenceDeg(9, r, 0.05), 8.8131873116, 1e-8)
	near(t, "alpha99", confidenceDeg(9, r, 0.01), 11.5445363246, 1e-8)
	near(t, "dispersion", math.Cos(radians(d.DispersionDeg())), 0.974664610435, 1e-12)
}

// Fifty pole positions, data set polar of R package boot (Fisher, Lewis &
// Embleton 1987); R and NumPy agree on the values.
func TestDirectionsPolar(t *testing.T) {
	var d Directions
	var outer terrain.Covariance
	for _, row := range readColumns(t, dataFile(t, "reference/polar.txt")) {
		lat, long := radians(row[0]), radians(row[1])
		v := r3.Vec{X: math.Cos(lat) * math.Cos(long), Y: math.Cos(lat) * math.Sin(long), Z: math.Sin(lat)}
		d.Add(v)
		outer.XX, outer.XY, outer.XZ = outer.XX+v.X*v.X/50, outer.XY+v.X*v.Y/50, outer.XZ+v.X*v.Z/50
		outer.YY, outer.YZ, outer.ZZ = outer.YY+v.Y*v.Y/50, outer.YZ+v.Y*v.Z/50, outer.ZZ+v.Z*v.Z/50
	}
	mean, r, _ := d.Mean()
	near(t, "R", r, 38.4391702874, 1e-8)
	near(t, "latitude", degrees(math.Asin(mean.Z)), -78.4692462606, 1e-8)
	near(t, "longitude", degrees(math.Atan2(mean.Y, mean.X)), 87.2153899697, 1e-8)
	k, _ := d.Concentration()
	near(t, "k", k, 4.2384501129, 1e-8)
	near(t, "R/N of likely kappa", r/50, langevin(4.3183183999), 1e-10)
	near(t, "alpha95", confidenceDeg(50, r, 0.05), 11.1752935737, 1e-8)
	lambda, _ := EigenSym3(outer)
	for i, want := range [3]float64{0.1160097660, 0.2087879158, 0.6752023182} {
		near(t, "tensor", lambda[i], want, 1e-9)
	}
}

// Three nearly equal directions: N − R cancels. Values from memory of the
// formulas, recomputed in extended precision.
func TestDirectionsConcentrated(t *testing.T) {
	var d Directions
	for _, v := range [][2]float64{{180, 30}, {179, 29}, {182, 31}} {
		d.Add(lineAlong(v[0], v[1]))
	}
	mean, r, _ := d.Mean()
	near(t, "R", r, 2.9991636224, 1e-10)
	k, _ := d.Concentration()
	near(t, "k", k, 2391.2644984, 1e-6)
	near(t, "alpha95", confidenceDeg(3, r, 0.05), 2.5215765, 1e-7)
	trend, plunge := TrendPlunge(mean)
	near(t, "declination", trend, 180.3232004, 1e-7)
	near(t, "inclination", plunge, 30.0058654, 1e-7)
}

// langevin is the mean resultant length of Fisher's distribution.
func langevin(kappa float64) float64 { return 1/math.Tanh(kappa) - 1/kappa }

// confidenceDeg is Fisher's half angle of the cone that holds the true mean with
// probability 1−p: what n and R are published for.
func confidenceDeg(n, r, p float64) float64 {
	versine := (n - r) / r * math.Expm1(-math.Log(p)/(n-1))
	return degrees(2 * math.Asin(math.Sqrt(versine/2)))
}

func TestDirectionsDegenerate(t *testing.T) {
	var d Directions
	if _, _, ok := d.Mean(); ok || d.DispersionDeg() != 0 {
		t.Error("an empty sample has a mean or a dispersion")
	}
	if _, ok := d.CircularDeviationDeg(); ok {
		t.Error("an empty sample has a circular deviation")
	}
	d.Add(r3.Vec{X: 1})
	if _, ok := d.Concentration(); ok {
		t.Error("one direction has a concentration")
	}
	d.Add(r3.Vec{X: 1})
	if _, ok := d.Concentration(); ok || d.DispersionDeg() != 0 {
		t.Error("two equal directions have a concentration or a dispersion")
	}
	d.Add(r3.Vec{X: -1})
	d.Add(r3.Vec{X: -1})
	if _, _, ok := d.Mean(); ok {
		t.Error("directions that cancel have a mean")
	}
	if _, ok := d.CircularDeviationDeg(); ok {
		t.Error("directions that cancel have a circular deviation")
	}
	near(t, "dispersion of directions that cancel", d.DispersionDeg(), 90, 0)
}

// Two directions lie half their angle off their mean.
func TestDirectionsDispersion(t *testing.T) {
	for _, angle := range []float64{0.01, 1, 30, 89} {
		var d Directions
		d.Add(lineAlong(10, angle))
		d.Add(lineAlong(10, -angle))
		near(t, "dispersion", d.DispersionDeg(), angle, 1e-9)
	}
}

// Azimuths of paleocurrents, data set islay of R package boot; of lines without
// a sense, the doubled angles are averaged (Krumbein 1939).
func TestDirectionsOfAzimuths(t *testing.T) {
	var sense, axial Directions
	for _, a := range []float64{12, 353, 359, 332, 341, 299, 30, 24, 53, 284, 99, 72, 28, 93, 125, 318, 3, 45} {
		sense.Add(lineAlong(a, 0))
		axial.Add(lineAlong(2*a, 0))
	}
	mean, r, ok := sense.Mean()
	if !ok {
		t.Fatal("no mean")
	}
	azimuth, _ := TrendPlunge(mean)
	near(t, "mean", azimuth, 17.7703391300, 1e-8)
	near(t, "resultant", r/18, 0.6280563433, 1e-9)
	deviation, _ := sense.CircularDeviationDeg()
	near(t, "deviation", deviation, 55.2614985, 1e-6)
	mean, r, _ = axial.Mean()
	azimuth, _ = TrendPlunge(mean)
	near(t, "axial mean", azimuth/2, 1.4071264004, 1e-8)
	near(t, "axial resultant", r/18, 0.1264130028, 1e-9)
}

// The plane 130/50 has the pole 310/40: Brady & Brown, Rock Mechanics for
// Underground Mining, appendix A.
func TestTrendPlungePole(t *testing.T) {
	n := NormalOf(50, 130)
	near(t, "inclination", InclinationDeg(n), 50, 1e-12)
	dip, _ := DipDirectionDeg(n)
	near(t, "dip direction", dip, 130, 1e-12)
	trend, plunge := TrendPlunge(n)
	near(t, "pole trend", trend, 310, 1e-12)
	near(t, "pole plunge", plunge, 40, 1e-12)
}

func TestTrendPlungeInverse(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for range 1000 {
		trend, plunge := 360*rng.Float64(), 90*rng.Float64()
		v := r3.Scale(-3, lineAlong(trend, plunge)) // the upper end says the same
		gotT, gotP := TrendPlunge(v)
		near(t, "trend", gotT, trend, 1e-9)
		near(t, "plunge", gotP, plunge, 1e-12)
		inc, dip := 180*rng.Float64(), 360*rng.Float64()
		n := NormalOf(inc, dip)
		got, _ := DipDirectionDeg(n)
		near(t, "inclination", InclinationDeg(n), inc, 1e-12)
		near(t, "dip direction", got, dip, 1e-9)
	}
	if trend, plunge := TrendPlunge(r3.Vec{Z: 2}); trend != 0 || plunge != 90 {
		t.Errorf("vertical line %v/%v", trend, plunge)
	}
	if trend, plunge := TrendPlunge(r3.Vec{X: -1}); trend != 270 || plunge != 0 {
		t.Errorf("line due west %v/%v", trend, plunge)
	}
}
