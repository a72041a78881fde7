package las

import (
	"errors"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain"
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

func openFile(t *testing.T, path string, opts Options) (*Reader, error) {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { f.Close() })
	info, err := f.Stat()
	if err != nil {
		t.Fatal(err)
	}
	return NewReader(f, info.Size(), opts)
}

// TestReadSurveys reads every LAS file to its end. Points must be as many as
// promised and within the header's extent, which other programs wrote.
func TestReadSurveys(t *testing.T) {
	root := data(t)
	// Files that need forgiveness, with the points they hold.
	damaged := map[string]int{"garbage_nVariableLength.las": 718, "1.2-no-points.las": 0}
	// Files whose extent does not fit their points.
	loose := map[string]bool{
		"simple1_3.las": true, // in raw units, not in scaled ones
		"spurious.las":  true, // one stray
	}
	files := 0
	err := filepath.WalkDir(root, func(path string, e fs.DirEntry, err error) error {
		if err != nil || filepath.Ext(path) != ".las" {
			return err
		}
		files++
		name := filepath.Base(path)
		rel, _ := filepath.Rel(root, path)
		held, bad := damaged[name]
		r, err := openFile(t, path, Options{})
		if err != nil {
			t.Errorf("%s: %v", rel, err)
			return nil
		}
		h := r.Header()
		t.Logf("%s: %s, %d points, %s, %q, CRS %.40q, notes %q", rel, h.Format, h.Points, h.Date, h.Producer, h.CRS, h.Notes)
		got, err := drain(r, 1000)
		if bad {
			if fe := (*terrain.FormatError)(nil); !errors.As(err, &fe) {
				t.Errorf("%s: got %v", rel, err)
			}
			if r, err = openFile(t, path, Options{Tolerant: true}); err != nil {
				t.Fatal(err)
			}
			if got, err = drain(r, 1000); err != nil || len(got.x) != held {
				t.Errorf("%s: tolerant: got %d points and %v", rel, len(got.x), err)
			}
		} else if err != nil || int64(len(got.x)) != h.Points {
			t.Errorf("%s: got %d of %d points and %v", rel, len(got.x), h.Points, err)
		}
		if h.Extent == nil || loose[name] {
			return nil
		}
		outside := 0
		for i := range got.x {
			for k, v := range [3]float64{got.x[i], got.y[i], got.z[i]} {
				if v < h.Extent.Min[k]-h.Step[k] || v > h.Extent.Max[k]+h.Step[k] {
					outside++
					break
				}
			}
		}
		if outside > 0 {
			t.Errorf("%s: %d of %d points outside the header's extent", rel, outside, len(got.x))
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if files == 0 {
		t.Error("no LAS files found")
	}
}

func TestRefuseCompressedSurveys(t *testing.T) {
	root := data(t)
	err := filepath.WalkDir(root, func(path string, _ fs.DirEntry, err error) error {
		if err != nil || !strings.HasSuffix(path, ".laz") || strings.Contains(path, "invalid-tile") { // that one is no LAS at all
			return err
		}
		_, err = openFile(t, path, Options{})
		if ue := (*terrain.UnsupportedError)(nil); !errors.As(err, &ue) || ue.Feature != lazFeature {
			t.Errorf("%s: got %v", path, err)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
}

// TestKnownSurveys compares sums over stored coordinates and intensities, and
// one class's count, with those that Python's struct module makes of the bytes.
func TestKnownSurveys(t *testing.T) {
	root := data(t)
	for _, c := range []struct {
		file      string
		offset    [3]float64
		sum       [3]int64
		intensity int64
		class     uint8
		inClass   int
		points    int
		date, crs string
	}{
		{"terrain/Haystack_Rock.las", [3]float64{2e6, 2e5, 0}, [3]int64{506545875571, 114569712423, 68585619}, 0, 0, 21932, 21932, "2011-11-29", "NAD83(NSRS2007) / Oregon North"},
		{"seasons/bmx/2010.las", [3]float64{194000, 259000, 0}, [3]int64{40503771, 20108640, 35440702}, 15946240, 2, 829, 829, "2025-12-05", "NAD83 / Oregon LCC (m)"},
		{"broken/pdal/spurious.las", [3]float64{}, [3]int64{-1310691991447, 469200222105, 14091334}, 81361, 2, 276, 1065, "2014-01-27", "WGS 84"},
		{"formats/permutations/1.0_1.las", [3]float64{}, [3]int64{47069244, 460288890, 1600}, 0, 2, 1, 1, "2008-03-18", ""},
		{"other/ripple/ripple.las", [3]float64{-5, -5, -0.6664100289344788}, [3]int64{5100500000000, 5100500000000, 2713111521870}, 0, 0, 10201, 10201, "2015-03-15", ""},
	} {
		r, err := openFile(t, filepath.Join(root, c.file), Options{})
		if err != nil {
			t.Fatal(err)
		}
		got, err := drain(r, 4096)
		if err != nil {
			t.Fatal(err)
		}
		var sum [3]int64
		var intensity int64
		inClass := 0
		for i := range got.x {
			for k, v := range [3]float64{got.x[i], got.y[i], got.z[i]} {
				sum[k] += int64(math.Round((v - c.offset[k]) / r.Header().Step[k]))
			}
			intensity += int64(got.intensity[i])
			if got.class[i] == c.class {
				inClass++
			}
		}
		if sum != c.sum || intensity != c.intensity || inClass != c.inClass || len(got.x) != c.points {
			t.Errorf("%s: got sums %v, intensity %d, %d in class %d, %d points", c.file, sum, intensity, inClass, c.class, len(got.x))
		}
		if d := r.Header().Date; d != c.date {
			t.Errorf("%s: got date %s, want %s", c.file, d, c.date)
		}
		if crs := r.Header().CRS; !strings.Contains(crs, c.crs) {
			t.Errorf("%s: got CRS %s, want %s", c.file, crs, c.crs)
		}
	}
}
