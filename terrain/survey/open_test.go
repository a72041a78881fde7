package survey

import (
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain"
)

func TestOpenByContent(t *testing.T) {
	dir := t.TempDir()
	las := writeLAS(t, dir, "points.xyz", "", cloud(10), nil) // the name lies
	tests := []struct {
		path, format string
		points       int
	}{
		{las, "LAS 1.4", 10},
		{writeFile(t, dir, "a.bin", "ply\nformat ascii 1.0\nelement vertex 2\nproperty float x\nproperty float y\nproperty float z\nend_header\n1 2 3\n4 5 6\n"), "PLY", 2},
		{writeFile(t, dir, "b.dat", "1.5 2.5 3.5\n4.5 5.5 6.5\n7.5 8.5 9.5\n"), "", 3},
		{writeFile(t, dir, "c.txt", "ncols 2\nnrows 2\nxllcorner 1000\nyllcorner 2000\ncellsize 5\nNODATA_value -9999\n1 2\n3 -9999\n"), "elevation grid", 3},
	}
	for _, tt := range tests {
		r, err := Open(tt.path, Options{CRS: "EPSG:32633"})
		if err != nil {
			t.Error(err)
			continue
		}
		if got := r.Header().Format; !strings.HasPrefix(strings.ToLower(got), strings.ToLower(tt.format)) {
			t.Errorf("%s: format %q, want %q", tt.path, got, tt.format)
		}
		if got := r.Header().CRS; got != "EPSG:32633" {
			t.Errorf("%s: CRS %q", tt.path, got)
		}
		b := terrain.NewBatch(100, 0)
		if err := r.Read(b); err != nil || b.Len() != tt.points {
			t.Errorf("%s: %d points, %v", tt.path, b.Len(), err)
		}
		if err := r.Read(b); !errors.Is(err, io.EOF) {
			t.Errorf("%s: at the end: %v", tt.path, err)
		}
		if err := r.Close(); err != nil {
			t.Errorf("%s: %v", tt.path, err)
		}
	}
}

func TestOpenReplacesCRS(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", wktOf(t, "EPSG:32633"), cloud(2), nil)
	r, err := Open(path, Options{CRS: "EPSG:25833"})
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if h := r.Header(); h.CRS != "EPSG:25833" || !strings.Contains(strings.Join(h.Notes, "\n"), "takes the place of the file's own") {
		t.Errorf("header %+v", h)
	}
}

func TestOpenRefuses(t *testing.T) {
	dir := t.TempDir()
	whole, err := os.ReadFile(writeLAS(t, dir, "whole.las", "", cloud(100), nil))
	if err != nil {
		t.Fatal(err)
	}
	laz := []byte(string(whole))
	laz[104] |= 0x80
	zero := []byte(string(whole))
	copy(zero[131:], make([]byte, 8))
	tests := []struct {
		name, content string
		unsupported   bool
		msg           []string
	}{
		{name: "empty.las", msg: []string{"survey: the file is empty"}},
		{name: "magic.las", content: "PK\x03\x04 not a survey at all", msg: []string{`survey: byte 0: begins with "PK\x03\x04 not a s"`, "LAS, PLY, text points"}},
		{name: "notes.txt", content: "Scanned on Monday, windy.\n", msg: []string{"begins with \"Scanned on M\""}},
		{name: "scan.e57", content: "ASTM-E57\x01\x00\x00\x00", unsupported: true, msg: []string{"E57 (not yet) is not supported; convert it"}},
		{name: "cloud.pcd", content: "# .PCD v.7 - Point Cloud Data\n", unsupported: true, msg: []string{"PCD (not yet) is not supported"}},
		{name: "a.laz", content: string(laz), unsupported: true, msg: []string{"las: compressed LAS (LAZ) is not supported"}},
		{name: "header.las", content: string(whole[:100]), msg: []string{"las: byte 100: the file ends within the header"}},
		{name: "scale.las", content: string(zero), msg: []string{"las: byte 131: the x scale is 0"}},
	}
	for _, tt := range tests {
		path := writeFile(t, dir, tt.name, tt.content)
		_, err := Open(path, Options{})
		if err == nil {
			t.Errorf("%s: no error", tt.name)
			continue
		}
		var bad *terrain.FormatError
		var not *terrain.UnsupportedError
		if errors.As(err, &not) != tt.unsupported || errors.As(err, &bad) == tt.unsupported {
			t.Errorf("%s: %T", tt.name, err)
		}
		for _, m := range append(tt.msg, path+": ") {
			if !strings.Contains(err.Error(), m) {
				t.Errorf("%s: error %q lacks %q", tt.name, err, m)
			}
		}
	}
	if _, err := Open(dir, Options{}); err == nil || !strings.Contains(err.Error(), "this is a folder") {
		t.Errorf("folder: %v", err)
	}
	none := filepath.Join(dir, "none.las")
	if _, err := Open(none, Options{}); !errors.Is(err, os.ErrNotExist) || err.Error() != none+": survey: no such file or directory; check the name" {
		t.Errorf("missing: %v", err)
	}
	if os.Getuid() != 0 {
		secret := writeFile(t, dir, "secret.las", "LASF")
		if err := os.Chmod(secret, 0); err != nil {
			t.Fatal(err)
		}
		if _, err := Open(secret, Options{}); !errors.Is(err, os.ErrPermission) || !strings.Contains(err.Error(), "allow the reading") {
			t.Errorf("permission: %v", err)
		}
	}
}

// Whatever the bytes, a file is refused by name or read.
func FuzzOpen(f *testing.F) {
	f.Add([]byte("ply\nformat ascii 1.0\nelement vertex 1\nproperty float x\nproperty float y\nproperty float z\nend_header\n1 2 3\n"))
	f.Add([]byte("1 2 3\n4 5 6\n"))
	f.Add([]byte("ncols 2\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 5\n1 2\n3 4\n"))
	f.Add([]byte("ASTM-E57"))
	f.Add([]byte("LASF"))
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, content []byte) {
		const maxBytes = 1 << 16
		if len(content) > maxBytes {
			return
		}
		path := filepath.Join(t.TempDir(), "survey")
		if err := os.WriteFile(path, content, 0o644); err != nil {
			t.Fatal(err)
		}
		r, err := Open(path, Options{Tolerant: true})
		if err != nil {
			if !strings.HasPrefix(err.Error(), path+": ") {
				t.Errorf("error %q doesn't name the file", err)
			}
			return
		}
		defer r.Close()
		b := terrain.NewBatch(512, terrain.Class)
		// A few bytes can describe a grid of any size: a while is enough.
		for range 1000 {
			err := r.Read(b)
			if err != nil {
				if b.Len() != 0 && errors.Is(err, io.EOF) {
					t.Error("points with the end of the file")
				}
				return
			}
			if r.Header().Cell == 0 && b.Len() == 0 {
				t.Fatal("no points and no error")
			}
		}
	})
}

// A grid in feet with a CRS given in feet came out a third as high.
func TestGridInFeetWithGivenCRS(t *testing.T) {
	const usFoot = 1200.0 / 3937
	dir := t.TempDir()
	writeFile(t, dir, "dem.asc", "ncols 2\nnrows 2\nxllcorner 6000000\nyllcorner 2100000\ncellsize 3\n100 100\n100 100\n")
	path := writeFile(t, dir, "dem.vrt", `<VRTDataset rasterXSize="2" rasterYSize="2"><GeoTransform>6000000,3,0,2100006,0,-3</GeoTransform>`+
		`<VRTRasterBand dataType="Float32" band="1"><UnitType>US survey foot</UnitType>`+
		`<SimpleSource><SourceFilename relativeToVRT="1">dem.asc</SourceFilename><SourceBand>1</SourceBand></SimpleSource></VRTRasterBand></VRTDataset>`)
	f, err := Plan(t.Context(), []Source{{Path: path, CRS: "EPSG:2227"}}, "auto")
	if err != nil {
		t.Fatal(err)
	}
	if got, want := f.Extent.Max[2], 100*usFoot; math.Abs(got-want) > 1e-9 {
		t.Errorf("height %g m, want %g", got, want)
	}
}
