package las

import (
	"errors"
	"strings"
	"testing"

	"ledgework/terrain"
)

const testWKT = `LOCAL_CS["quarry"]`

// utm33 are the GeoTIFF keys of EPSG:32633.
func utm33() []vlr {
	return []vlr{{projectionUser, recordKeys, put(nil, []uint16{1, 1, 0, 3, 1024, 0, 1, 1, 1025, 0, 1, 1, 3072, 0, 1, 32633})},
		{projectionUser, recordDoubles, put(nil, 0.5, 2.0)}, {projectionUser, recordASCII, []byte("site|\x00")}}
}

func TestVariableLengthRecords(t *testing.T) {
	wkt := vlr{projectionUser, recordWKT, []byte(testWKT + "\x00\x00")}
	other := vlr{"somebody", 2112, []byte("not this")}
	for _, c := range []struct {
		name  string
		s     spec
		want  string
		notes int
	}{
		{"none", spec{minor: 2}, "", 0},
		{"vlr", spec{minor: 4, format: 6, encoding: wktBit, vlrs: []vlr{other, wkt}}, testWKT, 0},
		{"1.0", spec{minor: 0, vlrs: []vlr{wkt}}, testWKT, 0},
		{"evlr", spec{minor: 4, format: 6, encoding: wktBit, evlrs: []vlr{other, wkt}}, testWKT, 0},
		{"first counts", spec{minor: 4, format: 6, vlrs: []vlr{wkt}, evlrs: []vlr{{projectionUser, recordWKT, []byte("other")}}}, testWKT, 0},
		{"empty", spec{minor: 4, format: 6, encoding: wktBit, vlrs: []vlr{{projectionUser, recordWKT, nil}, {projectionUser, recordKeys, nil}}}, "", 0},
		{"too many promised", spec{minor: 2, vlrs: []vlr{wkt}, vlrCount: ptr(uint32(1069128089))}, testWKT, 1},
		{"fewer promised", spec{minor: 2, vlrs: []vlr{wkt, wkt}, vlrCount: ptr(uint32(0))}, "", 0},
		{"large", spec{minor: 4, format: 6, evlrs: []vlr{{projectionUser, recordWKT, make([]byte, maxPayload+1)}}}, "", 1},
		{"bad keys", spec{minor: 2, vlrs: []vlr{{projectionUser, recordKeys, put(nil, []uint16{1, 1, 0, 9, 1})}}}, "", 1},
		{"keys", spec{minor: 2, vlrs: utm33()}, "WGS 84 / UTM zone 33N", 0},
		{"no keys", spec{minor: 2, vlrs: []vlr{{projectionUser, recordKeys, put(nil, []uint16{1, 1, 0, 0})}}}, "", 0},
	} {
		c.s.points = 3
		b, want := build(c.s)
		r := open(t, b, Options{})
		h := r.Header()
		if !strings.Contains(h.CRS, c.want) || (c.want == "") != (h.CRS == "") || len(h.Notes) != c.notes {
			t.Errorf("%s: got CRS %q and notes %q", c.name, h.CRS, h.Notes)
		}
		got, err := drain(r, 2)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
		}
		compare(t, got, want, [3]float64{0.01, 0.02, 0.005}, [3]float64{})
	}
}

func TestRecordThatRunsIntoThePoints(t *testing.T) {
	b, want := build(spec{minor: 2, points: 5, vlrs: []vlr{{"a", 1, make([]byte, 10)}, {"b", 2, make([]byte, 10)}}})
	b[227+54+10+20] = 200 // the second record's length
	r := open(t, b, Options{})
	if n := r.Header().Notes; len(n) != 1 || !strings.Contains(n[0], "record 1 at byte 291 runs into the points") {
		t.Errorf("got notes %q", n)
	}
	got, err := drain(r, 2)
	if err != nil {
		t.Fatal(err)
	}
	compare(t, got, want, [3]float64{0.01, 0.02, 0.005}, [3]float64{})
}

func TestExtendedRecordsThatAreNone(t *testing.T) {
	for name, spoil := range map[string]func(b []byte){
		"start in the header": func(b []byte) { clear(b[235:243]); b[235] = 9 },
		"start past the end":  func(b []byte) { b[240] = 1 },
		"too long":            func(b []byte) { b[375+5*30+20+6] = 1 },
		"no room":             func(b []byte) { b[235] += 20 },
	} {
		b, want := build(spec{minor: 4, format: 6, points: 5, evlrs: []vlr{{"u", 1, make([]byte, 10)}}})
		spoil(b)
		r := open(t, b, Options{})
		if n := r.Header().Notes; len(n) == 0 {
			t.Errorf("%s: no note", name)
		}
		got, err := drain(r, 2)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		compare(t, got, want, [3]float64{0.01, 0.02, 0.005}, [3]float64{})
	}
	// Points end where extended records start, whatever the count says.
	b, _ := build(spec{minor: 4, format: 6, points: 5, promised: ptr(int64(6)), evlrs: []vlr{{"u", 1, make([]byte, 10)}}})
	if got, err := drain(open(t, b, Options{Tolerant: true}), 9); err != nil || len(got.x) != 5 {
		t.Errorf("got %d points and %v", len(got.x), err)
	}
}

func TestWhichCRS(t *testing.T) {
	const keysWKT = `LOCAL_CS["from keys"]`
	fromKeys := func(dir []uint16, doubles []float64, ascii string) (string, string, error) {
		if len(dir) != 16 || len(doubles) != 2 || doubles[1] != 2 || ascii != "site|" {
			t.Errorf("got keys %v %v %q", dir, doubles, ascii)
		}
		return keysWKT, "", nil
	}
	odd := func([]uint16, []float64, string) (string, string, error) { return keysWKT, "no such unit", nil }
	failing := func([]uint16, []float64, string) (string, string, error) {
		return "", "", errors.New("no such ellipsoid")
	}
	nothing := func([]uint16, []float64, string) (string, string, error) { return "", "", nil }
	wkt := vlr{projectionUser, recordWKT, []byte(testWKT)}
	for _, c := range []struct {
		name     string
		encoding uint16
		vlrs     []vlr
		fromKeys func([]uint16, []float64, string) (string, string, error)
		want     string
		notes    int
	}{
		{"both, WKT bit", wktBit, append(utm33(), wkt), fromKeys, testWKT, 0},
		{"both, no WKT bit", 0, append(utm33(), wkt), fromKeys, keysWKT, 0},
		{"keys only, WKT bit", wktBit, utm33(), fromKeys, keysWKT, 0},
		{"WKT only, no bit", 0, []vlr{wkt}, fromKeys, testWKT, 0},
		{"odd keys", 0, utm33(), odd, keysWKT, 1},
		{"bad keys, WKT", 0, append(utm33(), wkt), failing, testWKT, 1},
		{"bad keys", 0, utm33(), failing, "", 1},
		{"keys of nothing", 0, utm33(), nothing, "", 1},
	} {
		b, _ := build(spec{minor: 4, format: 6, encoding: c.encoding, vlrs: c.vlrs})
		r := open(t, b, Options{})
		var recs records
		if err := recs.readVLRs(r.r, int64(len(b)), r.raw); err != nil {
			t.Fatal(err)
		}
		var h terrain.Header
		recs.crs(r.raw, &h, c.fromKeys)
		if h.CRS != c.want || len(recs.notes) != c.notes {
			t.Errorf("%s: got CRS %q, notes %q", c.name, h.CRS, recs.notes)
		}
	}
}
