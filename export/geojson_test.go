package export

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain/gdal"
)

func TestWriteGeoJSON(t *testing.T) {
	tests := []struct {
		name, crs   string
		g, e, north float64
		n           int32
		crossing    bool
	}{
		{"central meridian", "EPSG:32633", 0.05, 500000 - 0.5, 5200000, 20, false},
		{"edge of zone", "EPSG:32633", 0.1, 720000, 8500000, 30, false},
		{"smallest cells", "EPSG:32633", 0.005, 600000, 9200000, 30, false},
		{"south", "EPSG:32733", 0.5, 400000, 6200000, 24, false},
		{"coarse grid", "EPSG:32617", 30, 700000, 9990000, 60, false},
		{"antimeridian", "EPSG:32601", 10, 343640, 6900000, 60, true},
		{"antimeridian, Lambert", "EPSG:3832", 25, 3339584.7 - 300, -2000000, 40, true},
		{"near the south pole", "EPSG:32761", 1, 2001000, 2000500, 30, false},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s := testSite(t, tt.g, tt.e, tt.north, tt.n)
			tables, err := Tables(s)
			if err != nil {
				t.Fatal(err)
			}
			p := newProjector(t, tt.crs)
			crossing := false
			for _, table := range tables {
				text, doc := write(t, table, p)
				checkDocument(t, table, doc)
				again, _ := write(t, table, p)
				if !bytes.Equal(text, again) {
					t.Errorf("%s: a second run wrote other bytes", table.Name)
				}
				crossing = crossing || doc.BBox[0] > doc.BBox[3]
			}
			if crossing != tt.crossing {
				t.Errorf("crosses the antimeridian: %v, want %v", crossing, tt.crossing)
			}
		})
	}
}

func TestWriteGeoJSONRoundPole(t *testing.T) {
	// UPS north has its pole at 2 000 000, 2 000 000: the site lies round it.
	s := testSite(t, 10, 2000000-150, 2000000-150, 30)
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	p := newProjector(t, "EPSG:32661")
	_, doc := write(t, tables[3], p)
	checkDocument(t, tables[3], doc)
	if b := doc.Features[0].BBox; b[0] != -180 || b[3] != 180 || b[4] != 90 {
		t.Errorf("bbox %v, want the full circle up to the pole", b)
	}
}

func TestGeoJSONValues(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	p := newProjector(t, "EPSG:32633")
	_, doc := write(t, tables[0], p)
	o := doc.Features[0].Properties
	if got, want := o["centre_e_m"], s.Findings.Obstacles[0].Ellipsoid.Centre.X; got != want {
		t.Errorf("centre_e_m %v, want exactly %v", got, want)
	}
	if text, _ := write(t, tables[0], p); !bytes.Contains(text, []byte(`"semi_axis_1_m":3.0,`)) {
		t.Error("a whole number of a Real field is written without a point, so that OGR takes it for an integer")
	}
	if o["surface_variation"] != nil {
		t.Errorf("surface_variation %v, want null for NaN", o["surface_variation"])
	}
	if got, want := o["ellipsoid_volume_m3"].(float64), 4*math.Pi/3*6; math.Abs(got-want) > 1e-6 {
		t.Errorf("ellipsoid_volume_m3 %v, want %v", got, want)
	}
	_, doc = write(t, tables[1], p)
	first, second := doc.Features[0].Properties, doc.Features[1].Properties
	if first["clearance_m"] != nil || second["clearance_m"] != 2.0 {
		t.Errorf("clearance_m %v and %v, want null and 2", first["clearance_m"], second["clearance_m"])
	}
	if first["rank"] != 2.0 || second["rank"] != 1.0 {
		t.Errorf("rank %v and %v, want 2 and 1", first["rank"], second["rank"])
	}
	if first["zone"] != "zone-1" || second["zone"] != nil {
		t.Errorf("zone %v and %v, want zone-1 and null", first["zone"], second["zone"])
	}
	// The patch on the pillar is one cell in plan and still a polygon.
	if got := len(doc.Features[0].Geometry.Coordinates[0][0]); got != 5 {
		t.Errorf("vertical patch has %d positions, want a square", got)
	}
	// The mean heights of the ground are voxels in cells 0 to 13.
	for _, at := range doc.Features[1].Geometry.Coordinates[0][0] {
		if at[2] < 0 || at[2] > 0.2 {
			t.Errorf("height %v, want that of the ground, 0 to 0.2 m", at[2])
		}
	}
	_, doc = write(t, tables[2], p)
	if z := doc.Features[0].Properties; math.Abs(z["normal_e"].(float64)-0.5) > 1e-6 || math.Abs(z["normal_h"].(float64)-math.Sqrt(0.75)) > 1e-6 {
		t.Errorf("zone normal %v %v, want sin 30 and cos 30", z["normal_e"], z["normal_h"])
	}
	if got := len(doc.Features[0].Geometry.Coordinates[0]); got != 2 {
		t.Errorf("zone has %d rings, want an outer one and a hole", got)
	}
	_, doc = write(t, tables[3], p)
	if site := doc.Features[0].Properties; site["crs"] != "EPSG:32633" || site["points"] != float64(s.Voxels.Points()) || site["vertical_datum"] != "unknown" {
		t.Errorf("crs %v, points %v, vertical datum %v", site["crs"], site["points"], site["vertical_datum"])
	}
}

// OGR reads what was written: names, counts and third coordinates.
func TestGeoJSONInOGR(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	p := newProjector(t, "EPSG:32633")
	for _, table := range tables {
		text, _ := write(t, table, p)
		path := filepath.Join(t.TempDir(), table.Name+".geojson")
		if err := os.WriteFile(path, text, 0o666); err != nil {
			t.Fatal(err)
		}
		checkOGR(t, path, table)
	}
}

func checkOGR(t *testing.T, path string, table *Table) {
	t.Helper()
	d, err := gdal.OpenVector(path)
	if err != nil {
		t.Fatal(err)
	}
	defer d.Close()
	layers, err := d.Layers()
	if err != nil {
		t.Fatal(err)
	}
	if len(layers) != 1 || layers[0].Name() != table.Name || layers[0].Count() != int64(len(table.Features)) {
		t.Fatalf("%s: layers %v", path, layers)
	}
	has := make(map[string]bool)
	for _, f := range layers[0].Fields() {
		has[f] = true
	}
	for _, f := range table.Fields {
		if !has[f.Name] {
			t.Errorf("%s: OGR sees no field %s in %v", path, f.Name, layers[0].Fields())
		}
	}
	i := 0
	for f, err := range layers[0].Features() {
		if err != nil {
			t.Fatal(err)
		}
		if len(f.WKB) < 5 || f.WKB[1] != 1006&0xff || f.WKB[2] != 1006>>8 { // ISO WKB: MultiPolygon Z
			t.Errorf("%s: feature %d is no MultiPolygon Z: % x", path, i, f.WKB[:min(5, len(f.WKB))])
		}
		if ok, reason, err := gdal.ValidWKB(f.WKB); !ok || err != nil {
			t.Errorf("%s: feature %d: %s, %v", path, i, reason, err)
		}
		for j, field := range table.Fields {
			if got, want := f.Fields[field.Name], table.Features[i].Values[j]; field.Type == Text && field.Name != "dates" && want != nil && got != want { // OGR makes a date of a date
				t.Errorf("%s: %s is %v, want %v", path, field.Name, got, want)
			}
		}
		i++
	}
}

func TestWriteGeoJSONEmpty(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	s.Findings.Obstacles = nil
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	text, doc := write(t, tables[0], newProjector(t, "EPSG:32633"))
	if len(doc.Features) != 0 || doc.BBox != nil || !strings.Contains(string(text), `"features":[`) {
		t.Errorf("wrote %s", text)
	}
	path := filepath.Join(t.TempDir(), "obstacles.geojson")
	if err := os.WriteFile(path, text, 0o666); err != nil {
		t.Fatal(err)
	}
	d, err := gdal.OpenVector(path)
	if err != nil {
		t.Fatal(err)
	}
	d.Close()
}

type brokenProjector struct{ value float64 }

func (p brokenProjector) ToWGS84(x, y, z []float64) error {
	if p.value == 0 {
		return errors.New("no such place")
	}
	for i := range x {
		x[i], y[i] = p.value, 10
	}
	return nil
}

func TestWriteGeoJSONErrors(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	good := newProjector(t, "EPSG:32633")
	tests := []struct {
		name  string
		p     Projector
		valid ValidityCheck
		want  string
	}{
		{"no projector", nil, gdal.ValidWKB, "crs:"},
		{"projection fails", brokenProjector{}, gdal.ValidWKB, "no such place"},
		{"infinite", brokenProjector{math.Inf(1)}, gdal.ValidWKB, "no place on Earth"},
		{"one point", brokenProjector{12}, gdal.ValidWKB, "no valid outline"},
		{"check fails", good, func([]byte) (bool, string, error) { return false, "", errors.New("GEOS is missing") }, "GEOS is missing"},
		{"never valid", good, func([]byte) (bool, string, error) { return false, "crossed", nil }, "crossed"},
	}
	for _, tt := range tests {
		_, err := WriteGeoJSON(&bytes.Buffer{}, tables[0], tt.p, tt.valid)
		if err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want %q in it", tt.name, err, tt.want)
		}
	}
	if _, err := WriteGeoJSON(failingWriter{}, tables[0], good, gdal.ValidWKB); !errors.Is(err, errFull) {
		t.Errorf("error %v, want the writer's", err)
	}
}

var errFull = errors.New("full")

type failingWriter struct{}

func (failingWriter) Write([]byte) (int, error) { return 0, errFull }

// What is not valid at first is written with all its vertices, then as hull.
func TestWriteGeoJSONRepairs(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	p := newProjector(t, "EPSG:32633")
	sizes := make([]int, 0, 4)
	for refuse := range 4 {
		calls := 0
		valid := func(b []byte) (bool, string, error) {
			if calls++; calls <= refuse {
				return false, "self-intersection", nil
			}
			return gdal.ValidWKB(b)
		}
		var b bytes.Buffer
		warnings, err := WriteGeoJSON(&b, tables[2], p, valid)
		if err != nil {
			t.Fatal(err)
		}
		if got, want := len(warnings), refuse/3; got != want {
			t.Errorf("%d refused: warnings %v", refuse, warnings)
		}
		var doc document
		if err := json.Unmarshal(b.Bytes(), &doc); err != nil {
			t.Fatal(err)
		}
		checkDocument(t, tables[2], doc)
		sizes = append(sizes, len(doc.Features[0].Geometry.Coordinates[0][0]))
	}
	if fmt.Sprint(sizes) != "[5 81 81 5]" {
		t.Errorf("positions %v, want the corners, one at each of 80 cells, those again, the hull", sizes)
	}
}

func TestAppendNumber(t *testing.T) {
	tenth := 0.1 // a variable: the sum of constants would be exact
	tests := []struct {
		v        float64
		decimals int
		want     string
	}{
		{1.5, 4, "1.5"}, {2, 4, "2"}, {100, 0, "100"}, {-0.00001, 4, "0"}, {math.Copysign(0, -1), 4, "0"},
		{0.12345678949, 9, "0.123456789"}, {-179.9999999996, 9, "-180"}, {math.NaN(), 3, "null"}, {math.Inf(-1), FullPrecision, "null"},
		{tenth + 0.2, FullPrecision, "0.30000000000000004"}, {5e-7, FullPrecision, "5e-07"}, {1e21, FullPrecision, "1e+21"}, {-12.25, FullPrecision, "-12.25"},
		{1e21, 4, "1000000000000000000000"},
	}
	for _, tt := range tests {
		if got := string(appendNumber(nil, tt.v, tt.decimals, "null")); got != tt.want {
			t.Errorf("%v to %d digits: %s, want %s", tt.v, tt.decimals, got, tt.want)
		}
	}
}

func BenchmarkWriteGeoJSON(b *testing.B) {
	s := testSite(b, 0.05, 600000, 5200000, 400)
	tables, err := Tables(s)
	if err != nil {
		b.Fatal(err)
	}
	p := newProjector(b, "EPSG:32633")
	b.ReportAllocs()
	for b.Loop() {
		if _, err := WriteGeoJSON(&bytes.Buffer{}, tables[2], p, gdal.ValidWKB); err != nil {
			b.Fatal(err)
		}
	}
}
