package gdal

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"testing"

	"ledgework/terrain"
)

// write puts a new file of that name into its own folder and returns its path.
func write(t testing.TB, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func openRaster(t testing.TB, path string) *Dataset {
	t.Helper()
	d, err := Open(path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { d.Close() })
	return d
}

const ascii = `ncols 3
nrows 2
xllcorner 100
yllcorner 200
cellsize 2
NODATA_value -9999
1.5 2.5 -9999
4.5 nan 6.5
`

// keysUTM33 is a GeoTIFF of one pixel in UTM zone 33.
func keysUTM33() []byte {
	return keyTIFF([]uint16{1, 1, 0, 2, 1024, 0, 1, 1, 3072, 0, 1, 32633}, nil, "")
}

func TestDataset(t *testing.T) {
	d := openRaster(t, write(t, "a.asc", ascii))
	if w, h := d.Size(); w != 3 || h != 2 || d.Bands() != 1 || d.Driver() != "AAIGrid" || d.CRS() != "" {
		t.Errorf("%d × %d, %d bands, driver %q, CRS %q", w, h, d.Bands(), d.Driver(), d.CRS())
	}
	if g, ok := d.GeoTransform(); !ok || g != [6]float64{100, 2, 0, 204, 0, -2} {
		t.Errorf("geotransform %v %t", g, ok)
	}
	if _, ok := d.Metadata("TIFFTAG_DATETIME"); ok {
		t.Error("metadata that is not there")
	}
	tiff := openRaster(t, write(t, "a.tif", string(keysUTM33())))
	if c := parse(t, tiff.CRS()); c.AuthorityCode() != "EPSG:32633" {
		t.Errorf("CRS %q", tiff.CRS())
	}
	if _, ok := tiff.GeoTransform(); ok || tiff.GroundControlPoints() != 0 {
		t.Error("a geotransform that is not there")
	}
}

func TestOpenErrors(t *testing.T) {
	if _, err := Open(filepath.Join(t.TempDir(), "none.tif")); !errors.Is(err, fs.ErrNotExist) || !strings.Contains(err.Error(), "none.tif") {
		t.Errorf("missing file: %v", err)
	}
	tests := []struct{ name, path, want string }{
		{"garbage", write(t, "garbage.tif", "no raster"), "not recognized as a supported file format"},
		{"garbage with a TIFF's magic", write(t, "magic.tif", "II*\x00\xff\xff\xff\x7f"), "magic.tif"},
		{"truncated header", write(t, "cut.tif", string(keysUTM33()[:60])), "cut.tif"},
		{"broken VRT", write(t, "broken.vrt", "<VRTDataset rasterXSize='1'"), "broken.vrt"},
		{"folder", t.TempDir(), "not recognized"},
		{"vsi", "/vsimem/a.tif", "not a local file"},
		{"URL", "https://localhost/a.tif", "not a local file"},
		{"NUL", "a\x00b", "not a file name"},
	}
	for _, tt := range tests {
		d, err := Open(tt.path)
		if err == nil {
			d.Close()
			t.Errorf("%s: no error", tt.name)
			continue
		}
		var fe *terrain.FormatError
		if !errors.As(err, &fe) || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %q, want it to say %q", tt.name, err, tt.want)
		}
	}
	// Connection strings are no files.
	for _, s := range []string{"<VRTDataset/>", "PG:dbname=x", "GTIFF_DIR:1:a.tif", ""} {
		if d, err := Open(s); err == nil {
			d.Close()
			t.Errorf("%q: no error", s)
		}
	}
}

func TestClosedDataset(t *testing.T) {
	d := openRaster(t, write(t, "a.asc", ascii))
	b, err := d.Band(1)
	if err != nil {
		t.Fatal(err)
	}
	for range 2 {
		if err := d.Close(); err != nil {
			t.Fatal(err)
		}
	}
	if err := b.ReadFloat64(0, 0, 1, 1, make([]float64, 1)); !errors.Is(err, ErrClosed) {
		t.Errorf("read: %v, want ErrClosed", err)
	}
	if _, err := d.Band(1); !errors.Is(err, ErrClosed) {
		t.Errorf("band: %v, want ErrClosed", err)
	}
	if _, err := d.Layers(); !errors.Is(err, ErrClosed) {
		t.Errorf("layers: %v, want ErrClosed", err)
	}
	if _, ok := d.Metadata("AREA_OR_POINT"); ok {
		t.Error("metadata after Close")
	}
}

// Reading, with everything that GDAL likes to remember in files of its own,
// leaves the folder as it was, and what such a file says is read.
func TestNothingIsWrittenBeside(t *testing.T) {
	path := write(t, "a.asc", ascii)
	aux := `<PAMDataset><Metadata><MDI key="SITE">Gull Head</MDI></Metadata></PAMDataset>`
	if err := os.WriteFile(path+".aux.xml", []byte(aux), 0o600); err != nil {
		t.Fatal(err)
	}
	tiff := write(t, "a.tif", string(keysUTM33()))
	for _, p := range []string{path, tiff} {
		d := openRaster(t, p)
		b, err := d.Band(1)
		if err != nil {
			t.Fatal(err)
		}
		w, h := d.Size()
		if err := b.ReadMasked(0, 0, w, h, make([]float64, w*h), make([]uint8, w*h)); err != nil {
			t.Fatal(err)
		}
		b.Metadata("STATISTICS_MEAN")
		if site, _ := d.Metadata("SITE"); p == path && site != "Gull Head" {
			t.Errorf("the file beside it is not read: %q", site)
		}
		if err := d.Close(); err != nil {
			t.Fatal(err)
		}
	}
	for p, want := range map[string]int{path: 2, tiff: 1} {
		entries, err := os.ReadDir(filepath.Dir(p))
		if err != nil {
			t.Fatal(err)
		}
		if len(entries) != want {
			t.Errorf("files %v, want %d", entries, want)
		}
	}
	if got, err := os.ReadFile(path + ".aux.xml"); err != nil || string(got) != aux {
		t.Errorf("the file beside it is changed to %q (%v)", got, err)
	}
}

func TestDatasetsInParallel(t *testing.T) {
	defer runtime.GC()
	good := write(t, "good.asc", ascii)
	shared := openRaster(t, good)
	var wg sync.WaitGroup
	for g := range 8 {
		bad := write(t, fmt.Sprintf("bad%d.tif", g), "no raster")
		wg.Go(func() {
			for i := range 20 {
				d := shared
				if i%2 == 0 {
					var err error
					if d, err = Open(good); err != nil {
						t.Error(err)
						return
					}
				}
				b, err := d.Band(1)
				if err != nil {
					t.Error(err)
					return
				}
				v, ok := make([]float64, 6), make([]uint8, 6)
				if err := b.ReadMasked(0, 0, 3, 2, v, ok); err != nil || v[5] != 6.5 || !bytes.Equal(ok, []byte{1, 1, 0, 1, 0, 1}) {
					t.Errorf("%v %v %v", v, ok, err)
				}
				// Every goroutine gets the messages of its own call.
				if _, err := Open(bad); err == nil || strings.Count(err.Error(), "not recognized") != 1 || !strings.Contains(err.Error(), filepath.Base(bad)) {
					t.Errorf("error %v", err)
				}
				if i%4 == 0 { // the others are left to the garbage collector
					d.Close()
				}
			}
		})
	}
	wg.Wait()
}
