package survey

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"ledgework/terrain"
)

func TestPlanChoosesFrame(t *testing.T) {
	const ftUS = 1200.0 / 3937
	tests := []struct {
		name   string
		want   string // crs of the worksite
		crs    string // of the file
		cell   float64
		lo, hi [3]float64

		code, frame, vertical string
		local                 bool
		min, max              [3]float64 // expected extent; nil checks for zero values are skipped
		tol                   float64
		gridCell              float64
		note                  string
	}{
		{
			name: "projected in metres stays", crs: "EPSG:32633", lo: [3]float64{500000, 5000000, 100}, hi: [3]float64{500100, 5000100, 150},
			code: "EPSG:32633", frame: "WGS 84 / UTM zone 33N", min: [3]float64{500000, 5000000, 100}, max: [3]float64{500100, 5000100, 150},
		},
		{
			name: "compound keeps its vertical datum", crs: "EPSG:25832+5941", lo: [3]float64{300000, 6700000, 0}, hi: [3]float64{300100, 6700100, 30},
			code: "EPSG:25832", frame: "ETRS89 / UTM zone 32N", vertical: "NN2000 height", min: [3]float64{300000, 6700000, 0}, max: [3]float64{300100, 6700100, 30},
		},
		{
			name: "metres and US survey feet up", crs: "EPSG:2991+6360", lo: [3]float64{194472, 259222, 420}, hi: [3]float64{194507, 259264, 440},
			code: "EPSG:2991", frame: "NAD83 / Oregon LCC (m)", vertical: "NAVD88 height (ftUS)",
			min: [3]float64{194472, 259222, 420 * ftUS}, max: [3]float64{194507, 259264, 440 * ftUS}, tol: 1e-9, note: "heights were converted to metres",
		},
		{
			name: "US survey feet all ways", crs: "EPSG:2926+6360", lo: [3]float64{1200000, 300000, 1000}, hi: [3]float64{1201000, 301000, 1100},
			frame: "NAD83(HARN) / Washington North (ftUS) in metres", vertical: "NAVD88 height (ftUS)",
			min: [3]float64{1200000 * ftUS, 300000 * ftUS, 1000 * ftUS}, max: [3]float64{1201000 * ftUS, 301000 * ftUS, 1100 * ftUS}, tol: 1e-6, note: "US survey foot to metres",
		},
		{
			name: "international feet, heights unsaid", crs: "EPSG:2222", lo: [3]float64{700000, 900000, 1000}, hi: [3]float64{701000, 901000, 1100},
			code: "EPSG:26948", frame: "NAD83 / Arizona East (ft) in metres", // PROJ knows its metric twin
			min: [3]float64{700000 * 0.3048, 900000 * 0.3048, 304.8}, max: [3]float64{701000 * 0.3048, 901000 * 0.3048, 335.28}, tol: 1e-6, note: "nothing says the unit of its heights",
		},
		{
			name: "degrees north", crs: "EPSG:4326", cell: 1.0 / 1200, lo: [3]float64{10.6, 46.7, 1000}, hi: [3]float64{10.9, 46.9, 3700},
			code: "EPSG:32632", frame: "WGS 84 / UTM zone 32N", gridCell: 92.6, note: "the zone of the middle",
		},
		{
			name: "degrees south", crs: "EPSG:4326", lo: [3]float64{175, -37, 0}, hi: [3]float64{175.1, -36.9, 300},
			code: "EPSG:32760", frame: "WGS 84 / UTM zone 60S",
		},
		{
			name: "degrees on ETRS89", crs: "EPSG:4258", lo: [3]float64{6.6, 60.9, 0}, hi: [3]float64{6.7, 61, 300},
			code: "EPSG:25832", frame: "ETRS89 / UTM zone 32N",
		},
		{
			name: "degrees on NAD83", crs: "EPSG:4269", lo: [3]float64{-122.2, 46.1, 0}, hi: [3]float64{-122.1, 46.2, 300},
			code: "EPSG:26910", frame: "NAD83 / UTM zone 10N",
		},
		{
			name: "degrees near the pole", crs: "EPSG:4326", lo: [3]float64{20, 86, 0}, hi: [3]float64{20.1, 86.01, 100},
			code: "EPSG:5041", frame: "WGS 84 / UPS North (E,N)",
		},
		{
			name: "degrees without a CRS", cell: 1.0 / 3600, lo: [3]float64{-104.34, 39.506, 1690}, hi: [3]float64{-104.306, 39.524, 1807},
			code: "EPSG:32613", frame: "WGS 84 / UTM zone 13N", note: "longitude and latitude on WGS 84 (EPSG:4326) are assumed", gridCell: 30.83,
		},
		{
			name: "Web Mercator", crs: "EPSG:3857", lo: [3]float64{1180000, 5900000, 0}, hi: [3]float64{1181000, 5901000, 100},
			code: "EPSG:32632", frame: "WGS 84 / UTM zone 32N", note: "not true to scale",
		},
		{
			name: "equidistant cylindrical", crs: "EPSG:4087", lo: [3]float64{1180000, 5200000, 0}, hi: [3]float64{1181000, 5201000, 100},
			code: "EPSG:32632", frame: "WGS 84 / UTM zone 32N", note: "not true to scale",
		},
		{
			// 47° N 11° E, by the textbook formula: X = (N+h) cos φ cos λ and so on.
			name: "geocentric", crs: "EPSG:4978", lo: [3]float64{4277200, 831400, 4641900}, hi: [3]float64{4277300, 831500, 4642000},
			code: "EPSG:32632", frame: "WGS 84 / UTM zone 32N", vertical: "ellipsoidal height",
		},
		{
			name: "no CRS", lo: [3]float64{0, 0, 0}, hi: [3]float64{20, 30, 10},
			frame: "local coordinates", local: true, min: [3]float64{0, 0, 0}, max: [3]float64{20, 30, 10},
		},
		{
			name: "no CRS but a wanted one", want: "EPSG:32633", lo: [3]float64{500000, 5000000, 100}, hi: [3]float64{500100, 5000100, 150},
			code: "EPSG:32633", frame: "WGS 84 / UTM zone 33N", note: "taken to be in the working CRS", min: [3]float64{500000, 5000000, 100}, max: [3]float64{500100, 5000100, 150},
		},
		{
			name: "wanted", want: "EPSG:32632", crs: "EPSG:4326", lo: [3]float64{12.1, 46.7, 1000}, hi: [3]float64{12.2, 46.9, 1700},
			code: "EPSG:32632", frame: "WGS 84 / UTM zone 32N",
		},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			f, err := planFakes(tt.want, map[string]*fakeReader{"a.las": boxReader(tt.crs, tt.cell, tt.lo, tt.hi)}, "a.las")
			if err != nil {
				t.Fatal(err)
			}
			if f.Name != tt.frame || f.AuthorityCode != tt.code || f.Local != tt.local || f.VerticalName != tt.vertical {
				t.Errorf("got %q %q local %v vertical %q\nwant %q %q local %v vertical %q",
					f.Name, f.AuthorityCode, f.Local, f.VerticalName, tt.frame, tt.code, tt.local, tt.vertical)
			}
			if (f.CRS == "") != tt.local {
				t.Errorf("CRS = %q", f.CRS)
			}
			if notes := strings.Join(f.Notes, "\n"); !strings.Contains(notes, tt.note) || tt.note == "" && notes != "" && strings.Contains(notes, "assumed") {
				t.Errorf("notes %q lack %q", notes, tt.note)
			}
			if tt.min != tt.max {
				for i := range 3 {
					if math.Abs(f.Extent.Min[i]-tt.min[i]) > tt.tol || math.Abs(f.Extent.Max[i]-tt.max[i]) > tt.tol {
						t.Errorf("extent %v, want %v to %v", f.Extent, tt.min, tt.max)
					}
				}
			}
			if math.Abs(f.GridCell-tt.gridCell) > 0.05 {
				t.Errorf("grid cell %g, want %g", f.GridCell, tt.gridCell)
			}
			if f.Points != 18 {
				t.Errorf("%d points, want 18", f.Points)
			}
		})
	}
}

// The scaled way must agree with PROJ's own conversion between units.
func TestFeetAgreeWithPROJ(t *testing.T) {
	f, err := planFakes("", map[string]*fakeReader{"a": boxReader("EPSG:2926", 0, [3]float64{1200000, 300000, 0}, [3]float64{1300000, 400000, 1})}, "a")
	if err != nil {
		t.Fatal(err)
	}
	s, err := parseSystem("EPSG:2926")
	if err != nil {
		t.Fatal(err)
	}
	through, err := s.transformTo(f.work)
	if err != nil {
		t.Fatal(err)
	}
	defer through.Close()
	x, y := []float64{1200000, 1234567.891}, []float64{300000, 345678.912}
	if err := through.Apply(x, y, nil); err != nil {
		t.Fatal(err)
	}
	const ftUS = 1200.0 / 3937
	for i, want := range [][2]float64{{1200000 * ftUS, 300000 * ftUS}, {1234567.891 * ftUS, 345678.912 * ftUS}} {
		if d := math.Hypot(x[i]-want[0], y[i]-want[1]); d > 2e-6 { // PROJ's foot has 12 digits
			t.Errorf("point %d: PROJ %.7f %.7f, scaled %.7f %.7f", i, x[i], y[i], want[0], want[1])
		}
	}
}

func TestPlanRefuses(t *testing.T) {
	inf := math.Inf(1)
	box := func(crs string, lo, hi [3]float64) *fakeReader { return boxReader(crs, 0, lo, hi) }
	here := box("EPSG:32633", [3]float64{500000, 5000000, 0}, [3]float64{500100, 5000100, 50})
	tests := []struct {
		name string
		want string
		a, b *fakeReader
		msg  []string
	}{
		{name: "different places", a: here, b: box("EPSG:32633", [3]float64{530000, 5000000, 0}, [3]float64{530100, 5000100, 50}),
			msg: []string{"b.las: survey: ", "29.9 km away from a.las"}},
		{name: "different places in different CRS", a: here, b: box("EPSG:4326", [3]float64{16, 45, 0}, [3]float64{16.001, 45.001, 50}),
			msg: []string{"b.las: survey: ", "km away from a.las", "check the crs"}},
		{name: "no points", a: &fakeReader{header: terrain.Header{Points: -1}}, msg: []string{"a.las: survey: the survey holds no usable point"}},
		{name: "nothing finite", a: &fakeReader{points: [][3]float64{{math.NaN(), 0, 0}, {0, inf, 0}}, header: terrain.Header{Points: -1}},
			msg: []string{"a.las: survey: the survey holds no usable point"}},
		{name: "absurd extent", a: &fakeReader{points: [][3]float64{{0, 0, 0}, {1e12, 5, 5}}, header: terrain.Header{Points: -1}},
			msg: []string{"a.las: survey: its points spread over 1e+09 km east"}},
		{name: "absurd heights", a: box("EPSG:32633", [3]float64{500000, 5000000, 0}, [3]float64{500100, 5000100, 1e38}),
			msg: []string{"a.las: survey: its points spread over 1e+35 km up"}},
		{name: "metres called degrees", a: box("EPSG:4326", [3]float64{500000, 5000000, 0}, [3]float64{500100, 5000100, 50}),
			msg: []string{`a.las: survey: the CRS "WGS 84" is in degrees but the coordinates aren't`, "give crs: EPSG:n"}},
		{name: "degrees called metres", a: box("EPSG:32633", [3]float64{15, 45, 100}, [3]float64{15.01, 45.01, 250}),
			msg: []string{`a.las: survey: the coordinates look like degrees`, `"WGS 84 / UTM zone 33N" is in metre`}},
		{name: "wanted degrees", want: "EPSG:4326", a: here, msg: []string{`survey: the working CRS "WGS 84" is not a projected one`, "leave crs: auto"}},
		{name: "wanted nonsense", want: "EPSG:999999", a: here, msg: []string{`survey: the working CRS "EPSG:999999" can't be understood`}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			for _, r := range []*fakeReader{tt.a, tt.b} {
				if r != nil {
					r.at = 0
				}
			}
			order := []string{"a.las", "b.las"}
			if tt.b == nil {
				order = order[:1]
			}
			_, err := planFakes(tt.want, map[string]*fakeReader{"a.las": tt.a, "b.las": tt.b}, order...)
			if err == nil {
				t.Fatal("no error")
			}
			var bad *terrain.FormatError
			if survey := errors.As(err, &bad) || errors.Is(err, terrain.ErrNoPoints); survey != (tt.want == "") {
				t.Errorf("error %T blames the survey: %v", err, survey)
			}
			for _, m := range tt.msg {
				if !strings.Contains(err.Error(), m) {
					t.Errorf("error %q lacks %q", err, m)
				}
			}
		})
	}
	if _, err := Plan(context.Background(), nil, "auto"); err == nil || !strings.Contains(err.Error(), "no survey file") {
		t.Errorf("no sources: %v", err)
	}
}

func TestPlanOfSeveral(t *testing.T) {
	readers := map[string]*fakeReader{
		"bare.xyz": boxReader("", 0, [3]float64{500000, 5000000, 0}, [3]float64{500100, 5000100, 50}),
		"utm.las":  boxReader("EPSG:32633", 0, [3]float64{500100, 5000000, 0}, [3]float64{500200, 5000100, 50}),
		"deg.las":  boxReader("EPSG:4326", 0, [3]float64{15, 45.15, 0}, [3]float64{15.01, 45.16, 50}),
		"nonsense": boxReader("LOCAL_NONSENSE[", 0, [3]float64{500000, 5000000, 0}, [3]float64{500100, 5000100, 50}),
	}
	f, err := planFakes("auto", readers, "bare.xyz", "utm.las", "deg.las", "nonsense")
	if err != nil {
		t.Fatal(err)
	}
	if f.AuthorityCode != "EPSG:32633" {
		t.Errorf("frame %s %s", f.AuthorityCode, f.Name)
	}
	notes := strings.Join(f.Notes, "\n")
	for _, want := range []string{"bare.xyz and another file: there is no CRS", "nonsense: the file's CRS can't be understood"} {
		if !strings.Contains(notes, want) {
			t.Errorf("notes lack %q:\n%s", want, notes)
		}
	}
	// Only longitude and latitude go through PROJ.
	for path, identity := range map[string]bool{"bare.xyz": true, "utm.las": true, "deg.las": false} {
		tr, err := f.Transformer(Source{Path: path})
		if err != nil {
			t.Fatal(err)
		}
		if tr.Identity() != identity {
			t.Errorf("%s: identity = %v, want %v", path, tr.Identity(), identity)
		}
		if err := tr.Close(); err != nil {
			t.Error(err)
		}
	}
	if _, err := f.Transformer(Source{Path: "other"}); err == nil {
		t.Error("a transformer for a file the frame doesn't know")
	}
}

// Tiles of 100 m along 40 km are one site: each is near another.
func TestPlanOfLongCorridor(t *testing.T) {
	readers := make(map[string]*fakeReader)
	var order []string
	for i := range 10 {
		name := string(rune('a' + i))
		e := 500000 + 4500*float64(i*7%10) // not in order
		readers[name] = boxReader("EPSG:32633", 0, [3]float64{e, 5000000, 0}, [3]float64{e + 100, 5000100, 50})
		readers[name].header.Notes = []string{"an oddity"}
		order = append(order, name)
	}
	f, err := planFakes("", readers, order...)
	if err != nil {
		t.Fatal(err)
	}
	if w := f.Extent.Max[0] - f.Extent.Min[0]; w != 40600 {
		t.Errorf("%g m wide", w)
	}
	if len(f.Notes) != 1 || f.Notes[0] != "a and 9 other files: an oddity" {
		t.Errorf("notes %q", f.Notes)
	}
}

func TestPlanNotesDatumChange(t *testing.T) {
	f, err := planFakes("EPSG:32610", map[string]*fakeReader{"a": boxReader("EPSG:26710", 0, [3]float64{560000, 5110000, 700}, [3]float64{561000, 5111000, 2500})}, "a")
	if err != nil {
		t.Fatal(err)
	}
	if notes := strings.Join(f.Notes, "\n"); !strings.Contains(notes, "datum of the working CRS, which is good to") {
		t.Errorf("notes %q", f.Notes)
	}
	// NAD27 lies about 100 m west and 200 m south of WGS 84 in Washington.
	if de, dn := f.Extent.Min[0]-560000, f.Extent.Min[1]-5110000; de > -80 || de < -120 || dn < 180 || dn > 230 {
		t.Errorf("moved by %g east, %g north", de, dn)
	}
}

func TestPlanEndsWithContext(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	_, err := examine(ctx, Source{Path: "a"}, boxReader("", 0, [3]float64{}, [3]float64{1, 1, 1}), make(systems))
	if !errors.Is(err, context.Canceled) {
		t.Errorf("got %v, want context.Canceled", err)
	}
}

func TestHeaderExtentThatLies(t *testing.T) {
	r := boxReader("", 0, [3]float64{1, 2, 3}, [3]float64{11, 12, 13})
	r.header.Points = 18
	r.header.Extent = &terrain.Extent{Min: [3]float64{1000, 2000, 3000}, Max: [3]float64{11000, 12000, 13000}} // a thousandfold
	f, err := planFakes("", map[string]*fakeReader{"a": r}, "a")
	if err != nil {
		t.Fatal(err)
	}
	if want := (terrain.Extent{Min: [3]float64{1, 2, 3}, Max: [3]float64{11, 12, 13}}); f.Extent != want {
		t.Errorf("extent %v, want %v", f.Extent, want)
	}
	if len(f.Notes) == 0 || !strings.Contains(f.Notes[0], "the header's extent can't be") {
		t.Errorf("notes %q", f.Notes)
	}
}

// Westing and southing used to be worked in as if they were easting and
// northing: azimuths half a turn off in the one country, the ground mirrored in
// the other. Directions are from the axes in the EPSG data set.
func TestPlanOfTurnedAxes(t *testing.T) {
	for _, tt := range []struct {
		crs, code string
		at        [3]float64
		x, y      [2]float64 // east and north of 100 units along each axis
		tol       float64    // of which convergence takes its part
	}{
		{"EPSG:2048", "EPSG:32734", [3]float64{-50000, 3700000, 100}, [2]float64{-100, 0}, [2]float64{0, -100}, 3},  // Hartebeesthoek94 / Lo19: west, south
		{"EPSG:5513", "EPSG:32633", [3]float64{1040000, 740000, 100}, [2]float64{0, -100}, [2]float64{-100, 0}, 20}, // S-JTSK / Krovak: south, west
		{"EPSG:5514", "EPSG:5514", [3]float64{-740000, -1040000, 100}, [2]float64{100, 0}, [2]float64{0, 100}, 0},   // the same, east and north
	} {
		t.Run(tt.crs, func(t *testing.T) {
			hi := [3]float64{tt.at[0] + 100, tt.at[1] + 100, tt.at[2] + 10}
			f, err := planFakes("auto", map[string]*fakeReader{"a": boxReader(tt.crs, 0, tt.at, hi)}, "a")
			if err != nil {
				t.Fatal(err)
			}
			if f.AuthorityCode != tt.code {
				t.Fatalf("worked in %q, want %q", f.AuthorityCode, tt.code)
			}
			tr, err := f.Transformer(Source{Path: "a"})
			if err != nil {
				t.Fatal(err)
			}
			defer tr.Close()
			b := batchOf([][3]float64{tt.at, {hi[0], tt.at[1], 0}, {tt.at[0], hi[1], 0}})
			if err := tr.Apply(b); err != nil {
				t.Fatal(err)
			}
			for i, want := range [2][2]float64{tt.x, tt.y} {
				e, n := b.X[i+1]-b.X[0], b.Y[i+1]-b.Y[0]
				if math.Hypot(e-want[0], n-want[1]) > tt.tol {
					t.Errorf("100 along axis %d go (%.1f, %.1f) east and north, want %v", i, e, n, want)
				}
			}
		})
	}
	_, err := planFakes("EPSG:2048", map[string]*fakeReader{"a": boxReader("", 0, [3]float64{}, [3]float64{9, 9, 9})}, "a")
	if err == nil || !strings.Contains(err.Error(), "point west or south") {
		t.Errorf("error %v", err)
	}
}

// A header may promise any number of points: what the file has room for counts.
func TestPlanOfCountThatLies(t *testing.T) {
	readers := make(map[string]*fakeReader)
	for _, path := range []string{"a", "b"} {
		r := boxReader("EPSG:32633", 0, [3]float64{500000, 5000000, 100}, [3]float64{500100, 5000100, 150})
		r.header.Points, r.header.Bytes = math.MaxInt64, 1000
		r.header.Extent = &terrain.Extent{Min: [3]float64{500000, 5000000, 100}, Max: [3]float64{500100, 5000100, 150}}
		readers[path] = r
	}
	f, err := planFakes("auto", readers, "a", "b")
	if err != nil {
		t.Fatal(err)
	}
	if f.Points != 100 {
		t.Errorf("%d points, want the 50 records of 20 bytes that either has room for", f.Points)
	}
}
