package grid

import (
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// realGrids lists the elevation grids of the test data.
func realGrids(t testing.TB) []string {
	root := os.Getenv("LEDGEWORK_DATA")
	if root == "" {
		t.Skip("LEDGEWORK_DATA is not set: no real grids")
	}
	var files []string
	for _, pattern := range []string{"terrain/*.tif", "terrain/*.asc", "terrain/*.dem", "seasons/*/*.tif", "seasons/*/*.asc"} {
		found, err := filepath.Glob(filepath.Join(root, pattern))
		if err != nil {
			t.Fatal(err)
		}
		files = append(files, found...)
	}
	if len(files) == 0 {
		t.Skip("LEDGEWORK_DATA holds no grids")
	}
	return files
}

// The oracle is GDAL's own statistics by its program gdalinfo, which scans the
// raster through other code: share of valid cells, least, greatest, mean.
func TestRealGridsAgreeWithGDALStatistics(t *testing.T) {
	program, err := exec.LookPath("gdalinfo")
	if err != nil {
		t.Skip("gdalinfo is not installed")
	}
	for _, path := range realGrids(t) {
		t.Run(filepath.Base(path), func(t *testing.T) {
			r := open(t, path, Options{})
			points := readAll(t, r, 4096)
			for _, d := range r.Defects() {
				t.Logf("%d × %s, first %s", d.Count, d.Reason, d.First)
			}
			for _, n := range r.Header().Notes {
				t.Log(n)
			}
			least, most, sum := math.Inf(1), math.Inf(-1), 0.0
			for _, p := range points {
				least, most = min(least, p.z), max(most, p.z)
				sum += p.z
			}
			// Statistics are written beside the file: work on a copy.
			data, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			out, err := exec.Command(program, "-json", "-stats", "--config", "GTIFF_REPORT_COMPD_CS", "YES", write(t, filepath.Base(path), string(data))).Output()
			if err != nil {
				t.Fatal(err)
			}
			var info struct {
				Size  [2]int
				Bands []struct {
					Band                   int
					Minimum, Maximum, Mean float64
					Metadata               map[string]map[string]string
				}
			}
			if err := json.Unmarshal([]byte(strings.ReplaceAll(string(out), "NaN", "null")), &info); err != nil {
				t.Fatal(err)
			}
			want := info.Bands[r.(*reader).band.Number()-1]
			if v, ok := want.Metadata[""]["STATISTICS_VALID_PERCENT"]; ok {
				var percent float64
				if err := json.Unmarshal([]byte(v), &percent); err != nil {
					t.Fatal(err)
				}
				got := 100 * float64(len(points)) / float64(info.Size[0]*info.Size[1])
				// GDAL prints four digits.
				if math.Abs(got-percent) > 5.1e-4*percent {
					t.Errorf("%g %% of the cells are valid, want %g %%", got, percent)
				}
			}
			// GDAL prints three decimals.
			for _, c := range []struct {
				name      string
				got, want float64
			}{{"least", least, want.Minimum}, {"greatest", most, want.Maximum}} {
				if math.Abs(c.got-c.want) > 5.1e-4 {
					t.Errorf("%s height %.6f, want %.3f", c.name, c.got, c.want)
				}
			}
			// A mean of -9999 is a placeholder left in the file by its writer.
			if mean := sum / float64(len(points)); want.Mean != -9999 && math.Abs(mean-want.Mean) > 5.1e-4 {
				t.Errorf("mean height %.6f, want %.3f", mean, want.Mean)
			}
			t.Logf("%s: %d points, cell %g", r.Header().Format, len(points), r.Header().Cell)
		})
	}
}

func TestElevationBandOfFive(t *testing.T) {
	for _, path := range realGrids(t) {
		if filepath.Base(path) != "ecuador_ta_10m_5band.tif" {
			continue
		}
		r := open(t, path, Options{})
		if n := r.(*reader).band.Number(); n != 4 {
			t.Errorf("band %d, want 4, whose name is elev", n)
		}
		if notes := r.Header().Notes; len(notes) != 1 || !strings.Contains(notes[0], `band 4 of 5, "elev"`) {
			t.Errorf("notes %q", notes)
		}
		slope := open(t, path, Options{Band: 1})
		if n := slope.(*reader).band.Number(); n != 1 {
			t.Errorf("band %d, want the 1 that was asked for", n)
		}
	}
}
