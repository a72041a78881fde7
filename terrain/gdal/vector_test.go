package gdal

import (
	"fmt"
	"strings"
	"testing"
)

const squareJSON = `{"type":"FeatureCollection","features":[
{"type":"Feature","id":7,"properties":{"name":"crest Ä","n":42,"x":1.5,"none":null},"geometry":{"type":"Polygon","coordinates":[[[0,0],[2,0],[2,2],[0,2],[0,0]]]}},
{"type":"Feature","properties":{"name":"none","n":9007199254740993},"geometry":null},
{"type":"Feature","properties":{"name":"two"},"geometry":{"type":"MultiPolygon","coordinates":[[[[10,0],[11,0],[11,1],[10,0]]],[[[20,0],[21,0],[21,1],[20,0]]]]}}]}`

func TestFeatures(t *testing.T) {
	d, err := OpenVector(write(t, "a.geojson", squareJSON))
	if err != nil {
		t.Fatal(err)
	}
	defer d.Close()
	layers, err := d.Layers()
	if err != nil || len(layers) != 1 {
		t.Fatalf("%d layers, %v", len(layers), err)
	}
	l := layers[0]
	if l.Name() != "a" || l.Count() != 3 || fmt.Sprint(l.Fields()) != "[name n x none]" || parse(t, l.CRS()).AuthorityCode() != "EPSG:4326" {
		t.Errorf("layer %q, %d features, fields %v, CRS %q", l.Name(), l.Count(), l.Fields(), l.CRS())
	}
	for range 2 { // the second loop starts over
		var got []string
		for f, err := range l.Features() {
			if err != nil {
				t.Fatal(err)
			}
			got = append(got, fmt.Sprint(f.Fields, len(f.WKB)))
		}
		want := "[map[n:42 name:crest Ä x:1.5] 93 map[n:9007199254740993 name:none] 0 map[name:two] 163]"
		if fmt.Sprint(got) != want {
			t.Errorf("features %v, want %s", got, want)
		}
	}
	for f, err := range l.Features() {
		if err != nil || f.ID != 7 {
			t.Errorf("feature %d, %v", f.ID, err)
		}
		break
	}
}

func TestManyFeatures(t *testing.T) {
	const n = 3*featuresPerCall + 5
	var s strings.Builder
	s.WriteString(`{"type":"FeatureCollection","features":[`)
	for i := range n {
		if i > 0 {
			s.WriteByte(',')
		}
		fmt.Fprintf(&s, `{"type":"Feature","properties":{"i":%d},"geometry":{"type":"Point","coordinates":[%d,0]}}`, i, i%90)
	}
	s.WriteString("]}")
	d, err := OpenVector(write(t, "a.geojson", s.String()))
	if err != nil {
		t.Fatal(err)
	}
	defer d.Close()
	layers, err := d.Layers()
	if err != nil {
		t.Fatal(err)
	}
	next := int64(0)
	for f, err := range layers[0].Features() {
		if err != nil {
			t.Fatal(err)
		}
		if f.Fields["i"] != next {
			t.Fatalf("feature %v, want %d", f.Fields["i"], next)
		}
		next++
	}
	if next != n {
		t.Errorf("%d features, want %d", next, n)
	}
}

func TestReadPolygons(t *testing.T) {
	wkb, crs, err := ReadPolygons(write(t, "a.geojson", squareJSON))
	if err != nil {
		t.Fatal(err)
	}
	if len(wkb) != 2 || parse(t, crs).AuthorityCode() != "EPSG:4326" {
		t.Fatalf("%d geometries, CRS %q", len(wkb), crs)
	}
	// Areas of the coordinates as written.
	for i, want := range []float64{4, 1} {
		if a, err := Area(wkb[i]); err != nil || a != want {
			t.Errorf("area %g %v, want %g", a, err, want)
		}
	}
}

func TestReadPolygonsRefuses(t *testing.T) {
	collection := func(g string) string {
		return `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{},"geometry":` + g + `}]}`
	}
	tests := []struct{ name, path, want string }{
		{"missing", "/nowhere/a.gpkg", "no such file"},
		{"garbage", write(t, "a.gpkg", "no vector"), "not recognized"},
		{"lines", write(t, "a.geojson", collection(`{"type":"LineString","coordinates":[[0,0],[1,1]]}`)), `layer "a", feature 0: not a polygon`},
		{"no geometry", write(t, "a.geojson", collection("null")), "no polygon in the file"},
		{"raster", write(t, "a.asc", ascii), "cannot be opened"},
	}
	for _, tt := range tests {
		if _, _, err := ReadPolygons(tt.path); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want it to say %q", tt.name, err, tt.want)
		}
	}
}
