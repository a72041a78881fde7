package gdal

import (
	"errors"
	"math"
	"strings"
	"testing"

	"ledgework/terrain"
)

func TestCRSProperties(t *testing.T) {
	const surveyFoot = 1200.0 / 3937
	tests := []struct {
		text, name, code, kind string
		linear, vertical       float64
		heights                string
		zone                   int
		north                  bool
	}{
		{"EPSG:32633", "WGS 84 / UTM zone 33N", "EPSG:32633", "projected", 1, 0, "", 33, true},
		{" EPSG:32718\n", "WGS 84 / UTM zone 18S", "EPSG:32718", "projected", 1, 0, "", 18, false},
		{"EPSG:4326", "WGS 84", "EPSG:4326", "geographic", 0, 0, "", 0, false},
		{"EPSG:4979", "WGS 84", "EPSG:4979", "geographic", 0, 1, "ellipsoidal height", 0, false},
		{"EPSG:4978", "WGS 84", "EPSG:4978", "geocentric", 1, 0, "", 0, false},
		{"EPSG:25832+5941", "ETRS89 / UTM zone 32N + NN2000 height", "EPSG:25832+5941", "projected compound", 1, 1, "NN2000 height", 32, true},
		{"EPSG:2225+6360", "NAD83 / California zone 1 (ftUS) + NAVD88 height (ftUS)", "EPSG:2225+6360", "projected compound", surveyFoot, surveyFoot, "NAVD88 height (ftUS)", 0, false},
		{"EPSG:2225+5703", "NAD83 / California zone 1 (ftUS) + NAVD88 height", "EPSG:2225+5703", "projected compound", surveyFoot, 1, "NAVD88 height", 0, false},
		{"urn:ogc:def:crs:EPSG::27700", "OSGB36 / British National Grid", "EPSG:27700", "projected", 1, 0, "", 0, false},
		{"+proj=utm +zone=32 +datum=WGS84 +units=m", "unknown", "EPSG:32632", "projected", 1, 0, "", 32, true},
		{`LOCAL_CS["mine",UNIT["foot",0.3048]]`, "mine", "", "local", 0.3048, 0, "", 0, false},
		// Without codes, as old shapefiles have it.
		{`PROJCS["WGS_1984_UTM_Zone_33N",GEOGCS["GCS_WGS_1984",DATUM["WGS_1984",SPHEROID["WGS_84",6378137,298.257223563]],PRIMEM["Greenwich",0],UNIT["Degree",0.017453292519943295]],PROJECTION["Transverse_Mercator"],PARAMETER["latitude_of_origin",0],PARAMETER["central_meridian",15],PARAMETER["scale_factor",0.9996],PARAMETER["false_easting",500000],PARAMETER["false_northing",0],UNIT["Meter",1]]`,
			"WGS 84 / UTM zone 33N", "EPSG:32633", "projected", 1, 0, "", 33, true},
	}
	for _, tt := range tests {
		t.Run(tt.text[:min(len(tt.text), 30)], func(t *testing.T) {
			c := parse(t, tt.text)
			var kinds []string
			for _, k := range []struct {
				is   bool
				name string
			}{{c.IsProjected(), "projected"}, {c.IsGeographic(), "geographic"}, {c.IsGeocentric(), "geocentric"}, {c.IsLocal(), "local"}, {c.IsCompound(), "compound"}} {
				if k.is {
					kinds = append(kinds, k.name)
				}
			}
			if got := strings.Join(kinds, " "); got != tt.kind {
				t.Errorf("kind %q, want %q", got, tt.kind)
			}
			if c.Name() != tt.name || c.AuthorityCode() != tt.code || c.VerticalName() != tt.heights {
				t.Errorf("name %q, code %q, heights %q; want %q, %q, %q", c.Name(), c.AuthorityCode(), c.VerticalName(), tt.name, tt.code, tt.heights)
			}
			// Definitions round 1200/3937 to fifteen digits or so.
			if _, m := c.LinearUnit(); math.Abs(m-tt.linear) > 1e-12 {
				t.Errorf("linear unit %.15g m, want %.15g", m, tt.linear)
			}
			if _, m := c.VerticalUnit(); math.Abs(m-tt.vertical) > 1e-12 {
				t.Errorf("vertical unit %.15g m, want %.15g", m, tt.vertical)
			}
			if zone, north := c.UTMZone(); zone != tt.zone || zone != 0 && north != tt.north {
				t.Errorf("UTM zone %d, north %t", zone, north)
			}
			for _, text := range []string{c.WKT2(), c.PROJJSON()} {
				again := parse(t, text)
				if again.Name() != c.Name() || again.AuthorityCode() != c.AuthorityCode() || again.VerticalName() != c.VerticalName() {
					t.Errorf("comes back as %q, %q, %q", again.Name(), again.AuthorityCode(), again.VerticalName())
				}
			}
		})
	}
}

func TestHorizontalOnly(t *testing.T) {
	for text, want := range map[string]string{
		"EPSG:25832+5941": "EPSG:25832", "EPSG:4979": "EPSG:4326", "EPSG:32633": "EPSG:32633", "EPSG:4326": "EPSG:4326", "EPSG:4978": "EPSG:4978",
	} {
		c := parse(t, text)
		h, err := c.HorizontalOnly()
		if err != nil {
			t.Fatal(err)
		}
		if h.AuthorityCode() != want || h.IsCompound() || h.VerticalName() != "" {
			t.Errorf("%s: %s with heights %q, want %s", text, h.AuthorityCode(), h.VerticalName(), want)
		}
		h.Close()
	}
}

func TestParseCRSRefuses(t *testing.T) {
	for text, want := range map[string]string{
		"":                     "not a definition",
		"EPSG:999999":          "crs not found",
		"EPSG:":                "not a definition",
		"/etc/hostname":        "not a definition",
		"crs_test.go":          "not a definition",
		"http://localhost/crs": "not a definition",
		"+init=epsg:4326":      "not a definition",
		"UTM 33":               "not a definition",
		"PROJCS[\"x\"":         "not understood",
		"PROJCS[]":             "not understood",
		"{\"type\": 3}":        "not understood",
		"EPSG:4326\x00":        "not a definition",
		"+proj=nosuchthing":    "not understood",
		"@/etc/hostname":       "not a definition",
		"ESRI::crs_test.go":    "not a definition",
	} {
		c, err := ParseCRS(text)
		if err == nil {
			t.Errorf("%q is %q", text, c.Name())
			c.Close()
			continue
		}
		var fe *terrain.FormatError
		if !errors.As(err, &fe) || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error %q, want it to say %q", text, err, want)
		}
	}
}

func TestCRSAfterClose(t *testing.T) {
	c := parse(t, "EPSG:4326")
	for range 2 {
		if err := c.Close(); err != nil {
			t.Fatal(err)
		}
	}
	if _, err := c.HorizontalOnly(); !errors.Is(err, ErrClosed) {
		t.Errorf("error %v, want ErrClosed", err)
	}
	if c.Name() != "WGS 84" {
		t.Errorf("name %q", c.Name())
	}
}

func FuzzParseCRS(f *testing.F) {
	for _, s := range []string{"EPSG:4326", "+proj=utm +zone=33", `LOCAL_CS["x",UNIT["metre",1]]`, `{"type":"GeographicCRS"}`, "urn:ogc:def:crs:EPSG::4326"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		if len(s) > 2000 {
			t.Skip()
		}
		c, err := ParseCRS(s)
		if err != nil {
			if err.Error() == "" {
				t.Fatal("an error without text")
			}
			return
		}
		defer c.Close()
		// What was understood has a definition that is understood, too.
		again, err := ParseCRS(c.WKT2())
		if err != nil {
			t.Fatalf("%q gives %q: %v", s, c.WKT2(), err)
		}
		defer again.Close()
		if c.IsProjected() != again.IsProjected() || c.IsGeographic() != again.IsGeographic() {
			t.Errorf("%q changes its kind by way of %q", s, c.WKT2())
		}
	})
}

// A definition comes out of a survey file: it must not exhaust the C stack.
func TestParseCRSDeep(t *testing.T) {
	const n = 1 << 20
	for _, s := range []string{
		strings.Repeat("A[", n),
		strings.Repeat(`{"a":`, n),
		"{" + strings.Repeat(`"a":[`, 1) + strings.Repeat("[", n),
		"+proj=pipeline" + strings.Repeat(" +step +proj=pipeline", n/64),
		"PROJCS[" + strings.Repeat(`"x",`, n) + "]",
	} {
		if c, err := ParseCRS(s); err == nil {
			c.Close()
			t.Errorf("%q is %q", abridge(s), c.Name())
		}
	}
}
