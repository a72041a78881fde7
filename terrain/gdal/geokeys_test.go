package gdal

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"strings"
	"sync"
	"testing"
)

// The keys are those of OGC 19-008r4, "OGC GeoTIFF Standard", annexes on
// requirements class by key: 1024 GTModelType (1 projected, 2 geographic), 1025
// GTRasterType, 2048 GeodeticCRS, 3072 ProjectedCRS, 4096 Vertical, 3076 and
// 4099 units.
func TestFromGeoTIFFKeys(t *testing.T) {
	tests := []struct {
		name    string
		dir     []uint16
		doubles []float64
		ascii   string
		code    string
		want    string // in the name
	}{
		{"projected", []uint16{1, 1, 0, 3, 1024, 0, 1, 1, 1025, 0, 1, 1, 3072, 0, 1, 32633}, nil, "", "EPSG:32633", "UTM zone 33N"},
		{"version 1.0 with heights", []uint16{1, 1, 0, 4, 1024, 0, 1, 1, 1025, 0, 1, 1, 3072, 0, 1, 25832, 4096, 0, 1, 5941}, nil, "", "EPSG:25832+5941", "NN2000 height"},
		{"version 1.1 with heights", []uint16{1, 1, 1, 4, 1024, 0, 1, 1, 1025, 0, 1, 1, 3072, 0, 1, 25832, 4096, 0, 1, 5941}, nil, "", "EPSG:25832+5941", "NN2000 height"},
		{"geographic", []uint16{1, 1, 0, 2, 1024, 0, 1, 2, 2048, 0, 1, 4326}, nil, "", "EPSG:4326", "WGS 84"},
		{"citation", []uint16{1, 1, 0, 3, 1024, 0, 1, 1, 3072, 0, 1, 2193, 3073, 34737, 8, 0}, nil, "My grid|", "", "New Zealand"},
		// A transverse Mercator of its own, with parameters in the doubles:
		// 3075 method 1, 3080 origin's longitude, 3081 latitude, 3082 false
		// easting, 3083 northing, 3092 scale.
		{"user defined", []uint16{1, 1, 0, 11, 1024, 0, 1, 1, 1025, 0, 1, 1, 2048, 0, 1, 4326, 3072, 0, 1, 32767, 3074, 0, 1, 32767, 3075, 0, 1, 1,
			3076, 0, 1, 9001, 3080, 34736, 1, 0, 3081, 34736, 1, 1, 3082, 34736, 1, 2, 3092, 34736, 1, 3}, []float64{8.1, 0, 1000, 0.9996}, "", "", ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			wkt, _, err := FromGeoTIFFKeys(tt.dir, tt.doubles, tt.ascii)
			if err != nil {
				t.Fatal(err)
			}
			c := parse(t, wkt)
			if tt.code != "" && c.AuthorityCode() != tt.code {
				t.Errorf("code %q, want %q", c.AuthorityCode(), tt.code)
			}
			if !strings.Contains(wkt, tt.want) {
				t.Errorf("%s lacks %q", wkt, tt.want)
			}
			if tt.name == "user defined" {
				x, y := []float64{8.1}, []float64{0}
				tr, err := NewTransform(parse(t, "EPSG:4326"), c)
				if err != nil {
					t.Fatal(err)
				}
				defer tr.Close()
				if err := tr.Apply(x, y, nil); err != nil || x[0] != 1000 {
					t.Errorf("its origin is at %g %g (%v), want 1000 0", x[0], y[0], err)
				}
			}
		})
	}
}

func TestFromGeoTIFFKeysRefuses(t *testing.T) {
	tests := []struct {
		name string
		dir  []uint16
		want string
	}{
		{"none", nil, "shorter than its header"},
		{"no keys", []uint16{1, 1, 0, 0}, "no coordinate system"},
		{"more keys than entries", []uint16{1, 1, 0, 500, 3072, 0, 1, 32633}, ""},
		{"doubles that are not there", []uint16{1, 1, 0, 2, 1024, 0, 1, 1, 3080, 34736, 1, 900}, ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			wkt, _, err := FromGeoTIFFKeys(tt.dir, nil, "")
			if err == nil {
				t.Logf("GDAL makes this of it: %s", wkt)
				if tt.want != "" {
					t.Error("no error")
				}
				return
			}
			if !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error %q, want it to say %q", err, tt.want)
			}
		})
	}
}

// A unit that no table has: PROJ's contexts of libgeotiff's making used to write
// to standard error about it. Whatever is said comes back, without the running
// number of the file in memory.
func TestFromGeoTIFFKeysSaysWhatIsOdd(t *testing.T) {
	dir := []uint16{1, 1, 0, 4, 1024, 0, 1, 1, 1025, 0, 1, 1, 3072, 0, 1, 32767, 3076, 0, 1, 12345}
	if os.Getenv("LEDGEWORK_TEST_STDERR") != "" {
		_, _, _ = FromGeoTIFFKeys(dir, nil, "")
		return
	}
	program, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	var stderr bytes.Buffer
	cmd := exec.Command(program, "-test.run=^"+t.Name()+"$")
	cmd.Env = append(os.Environ(), "LEDGEWORK_TEST_STDERR=1", "GOCOVERDIR="+t.TempDir())
	cmd.Stderr = &stderr
	if err := cmd.Run(); err != nil || stderr.Len() > 0 {
		t.Errorf("%v, and on standard error: %q", err, stderr.String())
	}

	say := func() string {
		wkt, warnings, err := FromGeoTIFFKeys(dir, nil, "")
		return fmt.Sprintf("%s / %s / %v", wkt, warnings, err)
	}
	first := say()
	if second := say(); second != first {
		t.Errorf("not the same twice:\n%s\n%s", first, second)
	}
	if !strings.Contains(first, "unit of measure not found") || strings.Contains(first, "vsimem") || strings.Contains(first, "ledgework-keys") {
		t.Errorf("said: %s", first)
	}
}

func TestWithoutTIFFName(t *testing.T) {
	tests := []struct{ in, want string }{
		{"/vsimem/ledgework-keys-12.tif: broken", "broken"},
		{"a; ledgework-keys-3.tif:TIFFReadDirectory: odd; b", "a; TIFFReadDirectory: odd; b"},
		{"`/vsimem/ledgework-keys-7.tif' not recognized", "not recognized"},
		{"unit of measure not found", "unit of measure not found"},
	}
	for _, tt := range tests {
		if got := withoutTIFFName(tt.in); got != tt.want {
			t.Errorf("%q gives %q, want %q", tt.in, got, tt.want)
		}
	}
}

func TestFromGeoTIFFKeysInParallel(t *testing.T) {
	var wg sync.WaitGroup
	for g := range uint16(8) {
		wg.Go(func() {
			for range 10 {
				wkt, _, err := FromGeoTIFFKeys([]uint16{1, 1, 0, 2, 1024, 0, 1, 1, 3072, 0, 1, 32631 + g}, nil, "")
				if err != nil {
					t.Error(err)
					return
				}
				if want := string(rune('0'+(31+g)/10)) + string(rune('0'+(31+g)%10)) + "N"; !strings.Contains(wkt, "UTM zone "+want) {
					t.Errorf("zone %s is %s", want, wkt)
				}
			}
		})
	}
	wg.Wait()
}

func FuzzFromGeoTIFFKeys(f *testing.F) {
	f.Add([]byte{1, 0, 1, 0, 0, 0, 1, 0, 0, 12, 0, 0, 1, 0, 0x79, 0x7f}, 1.0, "x|")
	f.Add([]byte{}, 0.0, "")
	f.Fuzz(func(t *testing.T, b []byte, v float64, ascii string) {
		if len(b) > 2000 || len(ascii) > 2000 {
			t.Skip()
		}
		dir := make([]uint16, len(b)/2)
		for i := range dir {
			dir[i] = uint16(b[2*i]) | uint16(b[2*i+1])<<8
		}
		wkt, _, err := FromGeoTIFFKeys(dir, []float64{v, v, v}, ascii)
		if (wkt == "") != (err != nil) {
			t.Errorf("WKT %q with error %v", wkt, err)
		}
	})
}
