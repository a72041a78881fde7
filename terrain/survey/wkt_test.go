package survey

import (
	"strings"
	"testing"
)

func TestMetricWKT(t *testing.T) {
	for crs, want := range map[string]string{
		"EPSG:2926": "NAD83(HARN) / Washington North (ftUS) in metres",
		"EPSG:2222": "NAD83 / Arizona East (ft) in metres",
		"EPSG:2193": "NZGD2000 / New Zealand Transverse Mercator 2000 in metres", // northing first
	} {
		got, ok := metricWKT(wktOf(t, crs))
		if !ok {
			t.Errorf("%s: not done", crs)
			continue
		}
		s, err := parseSystem(got)
		if err != nil {
			t.Errorf("%s: %v in %s", crs, err, got)
			continue
		}
		if s.name != want || s.unit != 1 || s.code == crs && crs != "EPSG:2193" || s.kind != projected {
			t.Errorf("%s: %q, unit %g, code %q", crs, s.name, s.unit, s.code)
		}
	}
	for _, bad := range []string{"", "PROJCRS", `GEOGCRS["x"]`, `PROJCRS["x`, `PROJCRS["x",AXIS["e",LENGTHUNIT["m",1]`, strings.Repeat("A[", 1000)} {
		if got, ok := metricWKT(bad); ok {
			t.Errorf("%q: got %q", bad, got)
		}
	}
}

func FuzzParseWKT(f *testing.F) {
	f.Add(`PROJCRS["a",CS[Cartesian,2],AXIS["e",east,LENGTHUNIT["foot",0.3048]],ID["EPSG",1]]`)
	f.Add(`A[B["]"],C[1]]`)
	f.Add(`A[B[1]C[2]]`) // without the comma it once read B for ever
	f.Fuzz(func(t *testing.T, s string) {
		root, ok := parseWKT(s)
		if !ok {
			return
		}
		// Nodes lie within their parents, in order, and end with a bracket.
		var check func(n node, from, to int)
		check = func(n node, from, to int) {
			if n.from < from || n.to > to || n.from >= n.to || s[n.to-1] != ']' {
				t.Fatalf("node %+v in %d..%d of %q", n, from, to, s)
			}
			at := n.from
			for _, k := range n.kids {
				check(k, at, n.to-1)
				at = k.to
			}
		}
		check(root, 0, len(s))
	})
}

func TestAxesTurned(t *testing.T) {
	for crs, want := range map[string]bool{
		"EPSG:2048": true, "EPSG:5513": true, "EPSG:2218": true, // west and south; south and west; north and west
		"EPSG:32633": false, "EPSG:2193": false, "EPSG:5514": false, "EPSG:2227": false,
		"EPSG:5041": false, "EPSG:5042": false, "EPSG:3031": false, "EPSG:3995": false, // polar
		"EPSG:4326": false,
	} {
		if got := axesTurned(wktOf(t, crs)); got != want {
			t.Errorf("%s: got %v", crs, got)
		}
	}
	if axesTurned("") || axesTurned("PROJCRS[") {
		t.Error("no WKT has turned axes")
	}
}
