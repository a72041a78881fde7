package gdal

import (
	"encoding/binary"
	"math"
	"strings"
	"testing"
)

// polygonWKB is a polygon of one ring, which is closed here.
func polygonWKB(points ...[2]float64) []byte {
	le := binary.LittleEndian
	b := le.AppendUint32([]byte{1}, 3)
	b = le.AppendUint32(b, 1)
	b = le.AppendUint32(b, uint32(len(points)+1))
	for _, p := range append(points, points[0]) {
		b = le.AppendUint64(b, math.Float64bits(p[0]))
		b = le.AppendUint64(b, math.Float64bits(p[1]))
	}
	return b
}

func multiWKB(polygons ...[]byte) []byte {
	b := binary.LittleEndian.AppendUint32([]byte{1}, 6)
	b = binary.LittleEndian.AppendUint32(b, uint32(len(polygons)))
	for _, p := range polygons {
		b = append(b, p...)
	}
	return b
}

func square(x, y, side float64) []byte {
	return polygonWKB([2]float64{x, y}, [2]float64{x + side, y}, [2]float64{x + side, y + side}, [2]float64{x, y + side})
}

// bowtie crosses itself at 1, 1.
func bowtie() []byte {
	return polygonWKB([2]float64{0, 0}, [2]float64{2, 2}, [2]float64{2, 0}, [2]float64{0, 2})
}

func TestValidWKB(t *testing.T) {
	tests := []struct {
		name   string
		wkb    []byte
		ok     bool
		reason string
	}{
		{"square", square(0, 0, 1), true, ""},
		{"two apart", multiWKB(square(0, 0, 1), square(5, 5, 1)), true, ""},
		{"bowtie", bowtie(), false, "Self-intersection at or near point 1 1"},
		{"two that overlap", multiWKB(square(0, 0, 2), square(1, 1, 2)), false, "Self-intersection"},
		{"no area", polygonWKB([2]float64{0, 0}, [2]float64{1, 1}, [2]float64{0, 0}), false, "few points"},
		{"not finite", square(math.NaN(), 0, 1), false, "IllegalArgument"},
	}
	for _, tt := range tests {
		ok, reason, err := ValidWKB(tt.wkb)
		if err != nil || ok != tt.ok || !strings.Contains(reason, tt.reason) || (ok && reason != "") {
			t.Errorf("%s: %t %q %v, want %t %q", tt.name, ok, reason, err, tt.ok, tt.reason)
		}
	}
}

func TestGeometryRefuses(t *testing.T) {
	for name, wkb := range map[string][]byte{
		"empty":               {},
		"text":                []byte("POLYGON((0 0,1 0,1 1,0 0))"),
		"cut":                 square(0, 0, 1)[:40],
		"more than there are": append([]byte{1, 3, 0, 0, 0, 255, 255, 255, 127}, make([]byte, 20)...),
	} {
		if _, _, err := ValidWKB(wkb); err == nil {
			t.Errorf("%s: valid", name)
		}
		if _, err := Area(wkb); err == nil {
			t.Errorf("%s: has an area", name)
		}
		if _, err := UnionPolygons(wkb); err == nil {
			t.Errorf("%s: has a union", name)
		}
	}
}

func TestAreas(t *testing.T) {
	area := func(wkb []byte, err error) float64 {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		a, err := Area(wkb)
		if err != nil {
			t.Fatal(err)
		}
		ok, reason, err := ValidWKB(wkb)
		if err != nil || !ok {
			t.Errorf("not valid: %s %v", reason, err)
		}
		return a
	}
	// Coordinates are small integers: areas are exact.
	if got := area(square(3, 4, 2), nil); got != 4 {
		t.Errorf("square: %g, want 4", got)
	}
	overlap := multiWKB(square(0, 0, 2), square(1, 1, 2), square(10, 0, 1))
	if got := area(UnionPolygons(overlap)); got != 8 {
		t.Errorf("union: %g, want 4 + 4 - 1 + 1", got)
	}
	if got := area(UnionPolygons(square(0, 0, 3))); got != 9 {
		t.Errorf("union of one polygon: %g, want 9", got)
	}
	if got := area(MakeValid(bowtie())); got != 2 {
		t.Errorf("made valid: %g, want the two triangles' 2", got)
	}
}

func FuzzGeometry(f *testing.F) {
	f.Add(square(0, 0, 1))
	f.Add(bowtie())
	f.Add(multiWKB(square(0, 0, 2), square(1, 1, 2)))
	f.Fuzz(func(t *testing.T, wkb []byte) {
		if len(wkb) > 2000 {
			t.Skip()
		}
		ok, reason, err := ValidWKB(wkb)
		if ok && (reason != "" || err != nil) || err != nil && err.Error() == "" {
			t.Fatalf("%t, %q, %v", ok, reason, err)
		}
		area, err := Area(wkb)
		if ok && (err != nil || area < 0) {
			t.Errorf("a valid geometry of area %g (%v)", area, err)
		}
	})
}
