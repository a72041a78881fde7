package survey

import "testing"

func TestUTMFor(t *testing.T) {
	tests := []struct {
		lon, lat   float64
		from, want string
	}{
		{15, 45, "EPSG:4326", "EPSG:32633"},
		{11.999, 45, "", "EPSG:32632"},
		{12, 45, "", "EPSG:32633"},
		{-180, 10, "", "EPSG:32601"},
		{180, 10, "", "EPSG:32601"},
		{179.999, 10, "", "EPSG:32660"},
		{-179.9, -10, "", "EPSG:32701"},
		{359, 51, "", "EPSG:32630"},   // longitude counted from 0 to 360
		{5.3, 60.4, "", "EPSG:32632"}, // Bergen: 32V reaches west to 3°
		{2.9, 60.4, "", "EPSG:32631"},
		{5.3, 55.9, "", "EPSG:32631"},
		{8.9, 78, "", "EPSG:32631"}, // Svalbard: 31, 33, 35 and 37 only
		{9.1, 78, "", "EPSG:32633"},
		{21.1, 78, "", "EPSG:32635"},
		{33.1, 78, "", "EPSG:32637"},
		{10, 84, "", "EPSG:5041"},
		{10, -80.1, "", "EPSG:5042"},
		{10, -80, "", "EPSG:32732"},
		{10, 50, "EPSG:4258", "EPSG:25832"},
		{-30, 38, "EPSG:4258", "EPSG:32626"}, // no ETRS89 zone 26
		{-122, 46, "EPSG:4269", "EPSG:26910"},
		{145, -37, "EPSG:7844", "EPSG:7855"},
		{145, -37, "EPSG:4283", "EPSG:28355"},
	}
	for _, tt := range tests {
		if got := utmFor(tt.lon, tt.lat, tt.from); got != tt.want {
			t.Errorf("utmFor(%g, %g, %q) = %s, want %s", tt.lon, tt.lat, tt.from, got, tt.want)
		}
	}
}

// Every code must be the zone it is taken for: PROJ knows the names.
func TestUTMCodesByName(t *testing.T) {
	for code, want := range map[string]string{
		utmFor(15, 45, ""):            "WGS 84 / UTM zone 33N",
		utmFor(15, -45, ""):           "WGS 84 / UTM zone 33S",
		utmFor(15, 45, "EPSG:4258"):   "ETRS89 / UTM zone 33N",
		utmFor(-70, 45, "EPSG:4269"):  "NAD83 / UTM zone 19N",
		utmFor(145, -37, "EPSG:4283"): "GDA94 / MGA zone 55",
		utmFor(145, -37, "EPSG:7844"): "GDA2020 / MGA zone 55",
		utmFor(0, 89, ""):             "WGS 84 / UPS North (E,N)",
		utmFor(0, -89, ""):            "WGS 84 / UPS South (E,N)",
	} {
		s, err := parseSystem(code)
		if err != nil {
			t.Fatal(err)
		}
		if s.name != want {
			t.Errorf("%s is %q, want %q", code, s.name, want)
		}
	}
}
