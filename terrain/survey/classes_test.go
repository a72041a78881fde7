package survey

import "testing"

func TestClassName(t *testing.T) {
	// LAS specification 1.4 R16, tables 9 and 17.
	for _, tt := range []struct {
		class  uint8
		legacy bool
		want   string
	}{
		{0, false, "0 never classified"}, {2, true, "2 ground"}, {7, true, "7 low noise"}, {8, true, "8 model key-point"},
		{8, false, "8 reserved"}, {10, false, "10 rail"}, {12, true, "12 overlap"}, {12, false, "12 reserved"}, {13, false, "13 wire guard"},
		{13, true, "13 reserved"}, {18, false, "18 high noise"}, {22, false, "22 temporal exclusion"}, {23, false, "23 reserved"},
		{63, false, "63 reserved"}, {64, false, "64 user defined"}, {255, false, "255 user defined"},
	} {
		if got := className(tt.class, tt.legacy); got != tt.want {
			t.Errorf("className(%d, %v) = %q, want %q", tt.class, tt.legacy, got, tt.want)
		}
	}
}

func TestLegacyClasses(t *testing.T) {
	for format, want := range map[string]bool{
		"LAS 1.2, point format 3": true, "LAS 1.4, point format 6": false, "LAS 1.4, point format 10": false, "PLY": false, "": false,
	} {
		if got := legacyClasses(format); got != want {
			t.Errorf("%q: %v", format, got)
		}
	}
}
