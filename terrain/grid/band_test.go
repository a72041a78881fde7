package grid

import (
	"strings"
	"testing"
)

func TestNamesElevation(t *testing.T) {
	for name, want := range map[string]bool{
		"elev": true, "Elevation (m)": true, "DEM": true, "lidar_dtm": true, "z": true, " Height": true, "surface altitude": true,
		"": false, "slope": false, "academy": false, "red": false, "random": false, "zone": false,
	} {
		if got := namesElevation(name); got != want {
			t.Errorf("%q: %t, want %t", name, got, want)
		}
	}
}

func TestChoosesBand(t *testing.T) {
	tests := []struct {
		name, band1, band2 string
		band               int
		note               string
	}{
		{"one", "", "", 1, ""},
		{"by name", "<Description>slope</Description>", "<Description>dtm</Description>", 2, `band 2 of 2, "dtm"`},
		{"by unit", "<UnitType>degree</UnitType>", "<UnitType>m</UnitType>", 2, `band 2 of 2, in "m"`},
		{"beside transparency", "<ColorInterp>Alpha</ColorInterp>", "<ColorInterp>Gray</ColorInterp>", 2, ""},
		{"by default", "<ColorInterp>Red</ColorInterp>", "<ColorInterp>Green</ColorInterp>", 1, "none of the 2 bands"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			r := open(t, vrtFile(t, northUp, "", tt.band1, tt.band2), Options{})
			if got := r.(*reader).band.Number(); got != tt.band {
				t.Errorf("band %d, want %d", got, tt.band)
			}
			notes := strings.Join(r.Header().Notes, "; ")
			if (tt.note == "") != (notes == "") || !strings.Contains(notes, tt.note) {
				t.Errorf("notes %q, want %q", notes, tt.note)
			}
		})
	}
}

// The foot and the US survey foot: National Bureau of Standards, Federal
// Register 24 FR 5348 (1959), 0.3048 m and 1200/3937 m (from memory).
func TestUnitMetres(t *testing.T) {
	for unit, want := range map[string]float64{
		"m": 1, "Metre": 1, " meters ": 1, "ft": 0.3048, "feet": 0.3048, "US survey foot": 1200.0 / 3937, "us-ft": 1200.0 / 3937, "cm": 0.01,
		"": 0, "degree": 0, "furlong": 0,
	} {
		got, ok := unitMetres(unit)
		if got != want || ok != (want != 0) {
			t.Errorf("%q: %g %t, want %g", unit, got, ok, want)
		}
	}
}
