package gdal

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"
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

func TestVersion(t *testing.T) {
	if v := Version(); !strings.HasPrefix(v, "GDAL ") || !strings.Contains(v, ", PROJ ") {
		t.Errorf("version %q", v)
	}
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

// Neither a VRT nor a service description makes the machine speak to another.
func TestNetworkIsRefused(t *testing.T) {
	var calls atomic.Int64
	server := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, _ *http.Request) {
		calls.Add(1)
		w.WriteHeader(http.StatusNotFound)
	}))
	defer server.Close()
	const head = `<VRTDataset rasterXSize="1" rasterYSize="1"><GeoTransform>0,1,0,0,0,-1</GeoTransform><VRTRasterBand dataType="Byte" band="1"><SimpleSource><SourceFilename>`
	const tail = `</SourceFilename><SourceBand>1</SourceBand></SimpleSource></VRTRasterBand></VRTDataset>`
	files := map[string]string{
		"wms.xml": `<GDAL_WMS><Service name="TMS"><ServerUrl>` + server.URL + `/${z}/${x}/${y}.png</ServerUrl></Service><DataWindow><UpperLeftX>-1</UpperLeftX><UpperLeftY>1</UpperLeftY><LowerRightX>1</LowerRightX><LowerRightY>-1</LowerRightY><TileLevel>1</TileLevel><TileCountX>1</TileCountX><TileCountY>1</TileCountY></DataWindow><BandsCount>1</BandsCount></GDAL_WMS>`,
	}
	for i, prefix := range []string{"/vsicurl/", "/vsicurl_streaming/", "/vsizip//vsicurl/", ""} {
		files[fmt.Sprintf("%d.vrt", i)] = head + prefix + server.URL + "/a.tif" + tail
	}
	for name, text := range files {
		d, err := Open(write(t, name, text))
		if err != nil {
			t.Logf("%s: %v", name, err)
			continue
		}
		b, err := d.Band(1)
		if err != nil {
			t.Fatal(err)
		}
		if err := b.ReadFloat64(0, 0, 1, 1, make([]float64, 1)); err == nil {
			t.Errorf("%s: read", name)
		} else {
			t.Logf("%s: %v", name, err)
		}
		d.Close()
	}
	if n := calls.Load(); n != 0 {
		t.Errorf("%d requests", n)
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

// resident is the process's resident memory in bytes.
func resident(t *testing.T) int {
	text, err := os.ReadFile("/proc/self/statm")
	if err != nil {
		t.Skip("no /proc to read the resident memory from")
	}
	var size, pages int
	if _, err := fmt.Sscan(string(text), &size, &pages); err != nil {
		t.Fatal(err)
	}
	return pages * os.Getpagesize()
}

func TestNothingLeaks(t *testing.T) {
	path, bad := write(t, "a.asc", ascii), write(t, "bad.tif", "no raster")
	polygons := write(t, "a.geojson", squareJSON)
	round := func(n int) {
		for range n {
			d, err := Open(path)
			if err != nil {
				t.Fatal(err)
			}
			if _, err := d.Band(1); err != nil {
				t.Fatal(err)
			}
			d.Close()
			if _, err := Open(bad); err == nil {
				t.Fatal("opened")
			}
			if _, _, err := ReadPolygons(polygons); err != nil {
				t.Fatal(err)
			}
			c, err := ParseCRS("EPSG:32633")
			if err != nil {
				t.Fatal(err)
			}
			tr, err := NewTransform(c, c)
			if err != nil {
				t.Fatal(err)
			}
			tr.Close()
			c.Close()
			if _, _, err := ValidWKB(bowtie()); err != nil {
				t.Fatal(err)
			}
			if _, err := UnionPolygons(square(0, 0, 1)); err != nil {
				t.Fatal(err)
			}
			if _, err := FromGeoTIFFKeys([]uint16{1, 1, 0, 1, 3072, 0, 1, 32633}, nil, ""); err != nil {
				t.Fatal(err)
			}
		}
		runtime.GC()
	}
	files := func() int {
		entries, err := os.ReadDir("/proc/self/fd")
		if err != nil {
			t.Skip("no /proc to count open files in")
		}
		return len(entries)
	}
	// Locked, so that PROJ's per-thread caches are those of one thread.
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	round(60) // fills the caches
	fds, before := files(), resident(t)
	round(60)
	grown := resident(t) - before
	if n := files(); n > fds {
		t.Errorf("%d more files are open", n-fds)
	}
	// A leaked dataset, CRS or transform takes from 10 KB up; 60 rounds of one
	// would be a megabyte. Fragments of the allocator stay below four.
	if limit := 4 << 20; grown > limit {
		t.Errorf("%d KB more after 60 rounds", grown>>10)
	}
	t.Logf("%d KB more after 60 rounds", grown>>10)
}

func TestBand(t *testing.T) {
	d := openRaster(t, write(t, "a.asc", ascii))
	b, err := d.Band(1)
	if err != nil {
		t.Fatal(err)
	}
	if w, h := b.BlockSize(); w != 3 || h != 1 || b.BlockBytes() != 12 || b.DataType() != "Float32" || b.Number() != 1 {
		t.Errorf("blocks %d × %d, %d bytes, %s, number %d", w, h, b.BlockBytes(), b.DataType(), b.Number())
	}
	if v, ok := b.NoData(); !ok || v != -9999 || b.AllValid() || b.Alpha() || b.Integer() || b.Complex() {
		t.Errorf("nodata %g %t", v, ok)
	}
	if s, o := b.ScaleOffset(); s != 1 || o != 0 {
		t.Errorf("scale %g, offset %g", s, o)
	}
	got := make([]float64, 6)
	if err := b.ReadFloat64(0, 0, 3, 2, got); err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{1.5, 2.5, -9999, 4.5, math.NaN(), 6.5} {
		if got[i] != want && !(math.IsNaN(got[i]) && math.IsNaN(want)) {
			t.Errorf("value %d is %g, want %g", i, got[i], want)
		}
	}
	valid := make([]uint8, 2)
	if err := b.ReadMasked(1, 0, 1, 2, got, valid); err != nil || got[0] != 2.5 || valid[0] != 1 || valid[1] != 0 {
		t.Errorf("column 1: %v %v %v", got[:2], valid, err)
	}
}

func TestMaskBand(t *testing.T) {
	const band = `<SimpleSource><SourceFilename relativeToVRT="1">a.asc</SourceFilename><SourceBand>1</SourceBand></SimpleSource></VRTRasterBand>`
	const constant = `<VRTRasterBand dataType="Byte" band="%d">%s<ComplexSource><SourceFilename relativeToVRT="1">m.asc</SourceFilename><SourceBand>1</SourceBand></ComplexSource></VRTRasterBand>`
	for name, text := range map[string]string{
		"mask":  `<VRTRasterBand dataType="Float32" band="1">` + band + `<MaskBand>` + fmt.Sprintf(strings.Replace(constant, ` band="%d"`, "%.0d", 1), 0, "") + `</MaskBand>`,
		"alpha": `<VRTRasterBand dataType="Float32" band="1">` + band + fmt.Sprintf(constant, 2, "<ColorInterp>Alpha</ColorInterp>"),
	} {
		path := write(t, "a.vrt", `<VRTDataset rasterXSize="3" rasterYSize="2">`+text+`</VRTDataset>`)
		for file, body := range map[string]string{"a.asc": ascii, "m.asc": "ncols 3\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 1\n0 255 255\n255 255 0\n"} {
			if err := os.WriteFile(filepath.Join(filepath.Dir(path), file), []byte(body), 0o600); err != nil {
				t.Fatal(err)
			}
		}
		b, err := openRaster(t, path).Band(1)
		if err != nil {
			t.Fatal(err)
		}
		v, valid := make([]float64, 6), make([]uint8, 6)
		if err := b.ReadMasked(0, 0, 3, 2, v, valid); err != nil {
			t.Fatal(err)
		}
		// The number -9999 means nothing here: this band declares no nodata.
		if want := []byte{0, 1, 1, 1, 0, 0}; !bytes.Equal(valid, want) {
			t.Errorf("%s: valid %v, want %v", name, valid, want)
		}
	}
}

func TestReadErrors(t *testing.T) {
	tiff := keysUTM33()
	// Tag 273, the place of the pixel, points behind the end of the file.
	at := bytes.Index(tiff, []byte{0x11, 0x01, 4, 0, 1, 0, 0, 0})
	if at < 0 {
		t.Fatal("the TIFF has no strip offset")
	}
	binary.LittleEndian.PutUint32(tiff[at+8:], 1<<20)
	path := write(t, "cut.tif", string(tiff))
	b, err := openRaster(t, path).Band(1)
	if err != nil {
		t.Fatal(err)
	}
	err = b.ReadFloat64(0, 0, 1, 1, make([]float64, 1))
	var fe *terrain.FormatError
	if !errors.As(err, &fe) || !strings.Contains(err.Error(), path) || !strings.Contains(err.Error(), "column 0, row 0") || fe.Err == nil {
		t.Errorf("error %v, want the file, the place and GDAL's reason", err)
	}
	t.Log(err)
}

func TestReadPanics(t *testing.T) {
	b, err := openRaster(t, write(t, "a.asc", ascii)).Band(1)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range [][4]int{{-1, 0, 1, 1}, {0, 0, 4, 1}, {0, 0, 0, 1}, {2, 1, 1, math.MaxInt}, {math.MaxInt, 0, 1, 1}, {0, 0, 3, 2}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("window %v of a buffer of 5: no panic", w)
				}
			}()
			_ = b.ReadFloat64(w[0], w[1], w[2], w[3], make([]float64, 5))
		}()
	}
}
