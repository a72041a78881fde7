package ply

import (
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain"
	"ledgework/terrain/las"
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

func readFile(t *testing.T, path string, opts Options) (*Reader, cloud, error) {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	r, err := newReader(string(b), opts)
	if err != nil {
		return nil, cloud{}, err
	}
	c, err := drain(r, 1000)
	return r, c, err
}

func TestReadSurveys(t *testing.T) {
	root := data(t)
	for _, c := range []struct {
		file   string
		points int    // -1 for a FormatError
		want   string // of the error
	}{
		{"other/ply/platonic_shelf.ply", 50, ""},
		{"other/ply/platonic_shelf_ascii.ply", 50, ""},
		{"other/ply/platonic_shelf_big_endian.ply", 50, ""},
		{"other/ply/simple_binary.ply", 3, ""},
		{"other/ply/simple_text.ply", 3, ""},
		{"other/ply/text_extradim.ply", 1, ""},
		{"other/ply/sized_dims.ply", -1, "no number named z"},
		{"other/ply/unsized_dims.ply", -1, "no number named z"},
		{"other/ripple/ripple_ascii.ply", 10201, ""},
		{"other/ripple/ripple_bin.ply", 10201, ""},
		{"broken/trimesh/empty.ply", 0, ""},
		{"broken/trimesh/ply_empty_ascii.ply", 0, ""},
		{"broken/trimesh/ply_empty_bin.ply", 0, ""},
		{"broken/trimesh/ply_empty_header.ply", -1, "no element named vertex"},
		{"broken/trimesh/ply_points_ascii.ply", 8, ""},
		{"broken/trimesh/ply_points_bin.ply", 8, ""},
		{"broken/trimesh/points_emptyascii.ply", 12, ""},
		{"broken/trimesh/points_emptyface.ply", 1024, ""},
		{"broken/pdal/issue_2421.ply", 1, ""},
		{"broken/pdal/mesh.ply", 4, ""},
		{"broken/pdal/no_vertex.ply", -1, "no element named vertex"},
	} {
		r, got, err := readFile(t, filepath.Join(root, c.file), Options{})
		if c.points < 0 {
			if fe := (*terrain.FormatError)(nil); !errors.As(err, &fe) || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%s: got %v", c.file, err)
			}
			continue
		}
		if err != nil || len(got.x) != c.points || r.Header().Points != int64(c.points) {
			t.Errorf("%s: got %d points and %v, want %d", c.file, len(got.x), err, c.points)
		}
	}
}

// TestTwins reads the same points from files that other programs wrote.
func TestTwins(t *testing.T) {
	root := data(t)
	open := func(name string) cloud {
		_, c, err := readFile(t, filepath.Join(root, name), Options{})
		if err != nil {
			t.Fatal(err)
		}
		return c
	}
	text, little, big := open("other/ply/platonic_shelf_ascii.ply"), open("other/ply/platonic_shelf.ply"), open("other/ply/platonic_shelf_big_endian.ply")
	compare(t, "little-endian", little, text, 1e-5) // text of 6 digits
	if !little.equal(big) {
		t.Error("byte orders differ")
	}
	bin, asc := open("other/ripple/ripple_bin.ply"), open("other/ripple/ripple_ascii.ply")
	compare(t, "ripple", asc, bin, 5.1e-6) // text of 5 decimals, rounded once more by float
	if asc.rgb[0][1] != 9*257 || bin.rgb[2][10200] != asc.rgb[2][10200] {
		t.Error("ripple: colours differ")
	}
	f, err := os.Open(filepath.Join(root, "other/ripple/ripple.las"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		t.Fatal(err)
	}
	r, err := las.NewReader(f, info.Size(), las.Options{})
	if err != nil {
		t.Fatal(err)
	}
	c, err := drain(r, 777)
	if err != nil {
		t.Fatal(err)
	}
	compare(t, "ripple.las", c, bin, 1e-6) // float against steps of 1e-8
}

// compare checks that coordinates agree within tol.
func compare(t *testing.T, name string, a, b cloud, tol float64) {
	t.Helper()
	if len(a.x) != len(b.x) {
		t.Fatalf("%s: %d and %d points", name, len(a.x), len(b.x))
	}
	for i := range a.x {
		d := max(math.Abs(a.x[i]-b.x[i]), math.Abs(a.y[i]-b.y[i]), math.Abs(a.z[i]-b.z[i]))
		if !(d <= tol) {
			t.Fatalf("%s: point %d is off by %g", name, i, d)
		}
	}
}
