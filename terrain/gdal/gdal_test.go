package gdal

import (
	"fmt"
	"net/http"
	"net/http/httptest"
	"os"
	"runtime"
	"strings"
	"sync/atomic"
	"testing"
)

func TestVersion(t *testing.T) {
	if v := Version(); !strings.HasPrefix(v, "GDAL ") || !strings.Contains(v, ", PROJ ") {
		t.Errorf("version %q", v)
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
			if _, _, err := FromGeoTIFFKeys([]uint16{1, 1, 0, 1, 3072, 0, 1, 32633}, nil, ""); err != nil {
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
