package xyz

import (
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"testing"

	"ledgework/terrain"
	"ledgework/terrain/las"
	"ledgework/terrain/ply"
)

// data returns the folder of real surveys, or skips the test.
func data(t *testing.T) string {
	t.Helper()
	root := os.Getenv("LEDGEWORK_DATA")
	if root == "" {
		t.Skip("LEDGEWORK_DATA is not set: no real surveys to read")
	}
	return root
}

func TestReadSurveys(t *testing.T) {
	root := data(t)
	for _, c := range []struct {
		file    string
		points  int
		promise int64
		columns terrain.Columns
		first   [3]float64
	}{
		{"other/text/autzen.pts", 10, 10, terrain.Intensity | terrain.Color, [3]float64{636110.300003, 849345.050003, 512.139999}},
		// It has one point more than it promises.
		{"other/text/bunny_8.pts", 9, 8, 0, [3]float64{-0.037829, 0.12794, 0.004474}},
		{"other/text/data.xyz", 400, -1, 0, [3]float64{440750, 3751290, 107}},
		{"other/text/test.pts", 19, 19, terrain.Intensity | terrain.Color, [3]float64{3.980972, -2.006119, -0.010086}},
		{"other/ripple/ripple.txt", 10201, -1, 0, [3]float64{-5, -5, -0.3533}},
		{"other/ripple/ripple.pts", 10201, -1, terrain.Intensity | terrain.Color, [3]float64{-5, -5, -0.3533}},
	} {
		text, err := os.ReadFile(filepath.Join(root, c.file))
		if err != nil {
			t.Fatal(err)
		}
		if !Looks(text[:60]) {
			t.Errorf("%s: does not look like text with points", c.file)
		}
		r, err := newReader(string(text), Options{})
		if err != nil {
			t.Errorf("%s: %v", c.file, err)
			continue
		}
		h := r.Header()
		got, err := drain(r, 1000)
		if err != nil || len(got.x) != c.points || h.Points != c.promise || h.Columns != c.columns || (r.Defects() != nil) != (h.Points == 8) {
			t.Errorf("%s: got %d points and %v, header %+v, defects %v", c.file, len(got.x), err, h, r.Defects())
			continue
		}
		if p := [3]float64{got.x[0], got.y[0], got.z[0]}; p != c.first {
			t.Errorf("%s: got %v first", c.file, p)
		}
	}
	text, err := os.ReadFile(filepath.Join(root, "other/ripple/ripple.ptx"))
	if err != nil {
		t.Fatal(err)
	}
	_, err = newReader(string(text), Options{})
	if ue := (*terrain.UnsupportedError)(nil); !errors.As(err, &ue) {
		t.Errorf("ripple.ptx: got %v", err)
	}
}

// TestTwins compares one cloud in five encodings. The texts have 4 decimals.
func TestTwins(t *testing.T) {
	root := data(t)
	const halfDigit = 0.5e-4 + 1e-6 // of the texts, and the rounding of floats
	read := func(name string, open func(f *os.File, size int64) (terrain.Reader, error)) cloud {
		f, err := os.Open(filepath.Join(root, "other/ripple", name))
		if err != nil {
			t.Fatal(err)
		}
		defer f.Close()
		info, err := f.Stat()
		if err != nil {
			t.Fatal(err)
		}
		r, err := open(f, info.Size())
		if err != nil {
			t.Fatal(err)
		}
		c, err := drain(r, 500)
		if err != nil {
			t.Fatal(err)
		}
		return c
	}
	text := func(f *os.File, size int64) (terrain.Reader, error) { return NewReader(io.Reader(f), size, Options{}) }
	polygon := func(f *os.File, size int64) (terrain.Reader, error) { return ply.NewReader(f, size, ply.Options{}) }
	want := read("ripple.las", func(f *os.File, size int64) (terrain.Reader, error) { return las.NewReader(f, size, las.Options{}) })
	if len(want.x) != 10201 {
		t.Fatalf("got %d points", len(want.x))
	}
	for name, got := range map[string]cloud{"ripple.txt": read("ripple.txt", text), "ripple.pts": read("ripple.pts", text),
		"ripple_ascii.ply": read("ripple_ascii.ply", polygon), "ripple_bin.ply": read("ripple_bin.ply", polygon)} {
		if len(got.x) != len(want.x) {
			t.Errorf("%s: got %d points", name, len(got.x))
			continue
		}
		for i := range got.x {
			d := max(math.Abs(got.x[i]-want.x[i]), math.Abs(got.y[i]-want.y[i]), math.Abs(got.z[i]-want.z[i]))
			if !(d <= halfDigit) {
				t.Errorf("%s: point %d is off by %g", name, i, d)
				break
			}
		}
	}
}
