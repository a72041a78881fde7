package export

import (
	"bytes"
	"encoding/json"
	"math"
	"reflect"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/wkb"

	"ledgework/terrain/gdal"
)

// document is what RFC 7946 says a feature collection is.
type document struct {
	Type, Name, Caution string
	CRS                 any `json:"crs"`
	BBox                []float64
	Features            []struct {
		Type, ID string
		BBox     []float64
		Geometry struct {
			Type        string
			Coordinates [][][][3]float64
		}
		Properties map[string]any
	}
}

func write(t testing.TB, table *Table, p Projector) (text []byte, doc document) {
	t.Helper()
	var b bytes.Buffer
	warnings, err := WriteGeoJSON(&b, table, p, gdal.ValidWKB)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range warnings {
		t.Errorf("warning: %s", w)
	}
	if err := json.Unmarshal(b.Bytes(), &doc); err != nil {
		t.Fatalf("%v in %s", err, b.Bytes())
	}
	return b.Bytes(), doc
}

// checkDocument tests the rules of RFC 7946 that a parser would not.
func checkDocument(t *testing.T, table *Table, doc document) {
	t.Helper()
	if doc.Type != "FeatureCollection" || doc.Name != table.Name || doc.Caution != Caution || doc.CRS != nil {
		t.Errorf("type %q, name %q, caution %q, crs %v", doc.Type, doc.Name, doc.Caution, doc.CRS)
	}
	if len(doc.Features) != len(table.Features) {
		t.Fatalf("%d features, want %d", len(doc.Features), len(table.Features))
	}
	crossing := false
	all := emptyBox()
	for _, f := range doc.Features {
		if f.Type != "Feature" || f.Geometry.Type != "MultiPolygon" || len(f.Geometry.Coordinates) == 0 {
			t.Errorf("%s: type %q, geometry %q of %d polygons", f.ID, f.Type, f.Geometry.Type, len(f.Geometry.Coordinates))
		}
		if len(f.Properties) != len(table.Fields) {
			t.Errorf("%s: %d properties, want %d", f.ID, len(f.Properties), len(table.Fields))
		}
		box := emptyBox()
		var mp orb.MultiPolygon
		for _, polygon := range f.Geometry.Coordinates {
			var p orb.Polygon
			for i, ring := range polygon {
				var r orb.Ring
				for _, at := range ring {
					box.add(at[0], at[1], at[2])
					r = append(r, orb.Point{at[0], at[1]})
					if math.Abs(at[0]) > 180 || math.Abs(at[1]) > 90 {
						t.Errorf("%s: position %v is not on Earth", f.ID, at)
					}
				}
				if want := []orb.Orientation{orb.CCW, orb.CW}[min(i, 1)]; r.Orientation() != want {
					t.Errorf("%s: ring %d has orientation %v, want %v", f.ID, i, r.Orientation(), want)
				}
				if ring[0] != ring[len(ring)-1] || len(ring) < 4 {
					t.Errorf("%s: ring %d of %d positions is not closed", f.ID, i, len(ring))
				}
				p = append(p, r)
			}
			mp = append(mp, p)
		}
		b, err := wkb.Marshal(mp)
		if err != nil {
			t.Fatal(err)
		}
		if ok, reason, err := gdal.ValidWKB(b); !ok || err != nil {
			t.Errorf("%s: %s, %v", f.ID, reason, err)
		}
		if len(f.BBox) != 6 {
			t.Fatalf("%s: bbox %v", f.ID, f.BBox)
		}
		if f.BBox[0] > f.BBox[3] {
			crossing = true
			continue
		}
		if want := []float64{box.min[0], box.min[1], box.min[2], box.max[0], box.max[1], box.max[2]}; !reflect.DeepEqual(f.BBox, want) {
			t.Errorf("%s: bbox %v, want %v", f.ID, f.BBox, want)
		}
		all.union(box)
	}
	if w := all.wrapped(); len(doc.Features) > 0 && !crossing && !reflect.DeepEqual(doc.BBox, w[:]) {
		t.Errorf("bbox %v, want %v", doc.BBox, w)
	}
}
