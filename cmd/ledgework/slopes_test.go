package main

import (
	"context"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"ledgework/terrain/gdal"
	"ledgework/terrain/grid"
	"ledgework/terrain/survey"
)

// writeGrid writes an ASCII grid of the plane that rises by east and north, in
// metres to a unit of position, with one hole in a corner.
func writeGrid(t *testing.T, x, y, cell, east, north float64) string {
	t.Helper()
	const n = 20
	var b strings.Builder
	fmt.Fprintf(&b, "ncols %d\nnrows %d\nxllcorner %.10g\nyllcorner %.10g\ncellsize %.10g\nNODATA_value -9999\n", n, n, x, y, cell)
	for r := range n {
		for c := range n {
			if r == 0 && c == 0 {
				fmt.Fprint(&b, "-9999 ")
				continue
			}
			fmt.Fprintf(&b, "%.6f ", 100+cell*(east*float64(c)-north*float64(r)))
		}
		fmt.Fprintln(&b)
	}
	path := filepath.Join(t.TempDir(), "plane.asc")
	if err := os.WriteFile(path, []byte(b.String()), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func wktOf(t *testing.T, code string) string {
	t.Helper()
	c, err := gdal.ParseCRS(code)
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	return c.WKT2()
}

// A plane has one slope, whatever its grid is measured in.
func TestSlopesOf(t *testing.T) {
	// A degree at 60° N on WGS 84: 55.800 km of parallel, 111.412 km of
	// meridian (NGA.STND.0036, tables of the ellipsoid).
	const lon, lat = 55800.0, 111412.0
	for _, c := range []struct {
		name string
		path string
		crs  string
	}{
		{"metres", writeGrid(t, 500000, 6000000, 10, 0.75, 1), wktOf(t, "EPSG:32633")},
		{"no CRS", writeGrid(t, 0, 0, 10, 0.75, 1), ""},
		{"degrees", writeGrid(t, 15, 60, 0.0001, 0.75*lon, lat), wktOf(t, "EPSG:4326")},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := slopesOf(context.Background(), c.path, grid.Options{}, c.crs)
			if err != nil {
				t.Fatal(err)
			}
			want := math.Atan(1.25) * 180 / math.Pi
			// Of 18 × 18 cells with eight neighbours one lies beside the hole.
			if s.Cells != 323 || math.Abs(s.MedianDeg-want) > 0.02 || math.Abs(s.MaxDeg-s.P10Deg) > 0.02 || s.Above45 != 1 || s.Above60 != 0 {
				t.Errorf("%+v, want 323 cells of %.2f°", *s, want)
			}
		})
	}
}

// Real grids in metres, against GDAL's gdaldem, which goes by Horn's formula too
// and leaves out cells without all eight neighbours.
func TestSlopesAgainstGDAL(t *testing.T) {
	root := os.Getenv("LEDGEWORK_DATA")
	if root == "" {
		t.Skip("LEDGEWORK_DATA is not set: it names a folder of real surveys")
	}
	program, err := exec.LookPath("gdaldem")
	if err != nil {
		t.Skip("gdaldem is not installed")
	}
	for _, file := range []struct {
		name string
		band int // gdaldem takes the first where it is not told
	}{{"alps_rgi11_01270_46m.tif", 1}, {"ecuador_ta_10m_5band.tif", 4}, {"south_glacier_20m.tif", 1}} {
		t.Run(file.name, func(t *testing.T) {
			path := filepath.Join(root, "terrain", file.name)
			s, err := survey.Inspect(t.Context(), path, survey.Options{Band: file.band})
			if err != nil {
				t.Fatal(err)
			}
			got, err := slopesOf(t.Context(), path, grid.Options{Band: file.band}, s.CRS.WKT)
			if err != nil {
				t.Fatal(err)
			}
			want := slopesByGDAL(t, program, path, file.band)
			share := func(deg float64) float64 {
				at, _ := slices.BinarySearch(want, deg)
				return float64(len(want)-at) / float64(len(want))
			}
			quantile := func(q float64) float64 { return want[max(0, int(math.Ceil(q*float64(len(want))))-1)] }
			if int(got.Cells) != len(want) {
				t.Errorf("%d cells, GDAL has %d", got.Cells, len(want))
			}
			const tol = 0.011 // the bins' width, and the rounding of float32
			for _, c := range []struct {
				what           string
				got, want, tol float64
			}{
				{"p10", got.P10Deg, quantile(0.1), tol},
				{"median", got.MedianDeg, quantile(0.5), tol},
				{"p90", got.P90Deg, quantile(0.9), tol},
				{"max", got.MaxDeg, want[len(want)-1], tol},
				{"above 45°", got.Above45, share(45), 1e-4},
				{"above 60°", got.Above60, share(60), 1e-4},
			} {
				if !(math.Abs(c.got-c.want) <= c.tol) {
					t.Errorf("%s: got %g, want %g", c.what, c.got, c.want)
				}
			}
		})
	}
}

// slopesByGDAL are the slopes of a grid's cells in degrees, ascending.
func slopesByGDAL(t *testing.T, program, path string, band int) []float64 {
	t.Helper()
	out := filepath.Join(t.TempDir(), "slope.tif")
	if text, err := exec.CommandContext(t.Context(), program, "slope", "-q", "-b", strconv.Itoa(band), path, out).CombinedOutput(); err != nil {
		t.Fatalf("gdaldem: %v\n%s", err, text)
	}
	ds, err := gdal.Open(out)
	if err != nil {
		t.Fatal(err)
	}
	defer ds.Close()
	slope, err := ds.Band(1)
	if err != nil {
		t.Fatal(err)
	}
	w, h := ds.Size()
	values, valid := make([]float64, w*h), make([]uint8, w*h)
	if err := slope.ReadMasked(0, 0, w, h, values, valid); err != nil {
		t.Fatal(err)
	}
	var slopes []float64
	for i, v := range values {
		if valid[i] != 0 {
			slopes = append(slopes, v)
		}
	}
	slices.Sort(slopes)
	return slopes
}

func TestSlopesOfTooSmallGrid(t *testing.T) {
	path := filepath.Join(t.TempDir(), "small.asc")
	if err := os.WriteFile(path, []byte("ncols 2\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 1\n1 2\n3 4\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if s, err := slopesOf(context.Background(), path, grid.Options{}, ""); s != nil || err != nil {
		t.Errorf("%+v, %v; want none", s, err)
	}
}

// The CRS that a user gives is the unit of heights too where nothing else says
// it. They were taken as metres once, and 51° came out as 76°.
func TestSlopesOfGivenCRSInFeet(t *testing.T) {
	const feet = "EPSG:2227" // US survey feet
	path := writeGrid(t, 6000000, 2000000, 10, 0.75, 1)
	s, err := slopesOf(context.Background(), path, grid.Options{CRS: feet}, wktOf(t, feet))
	if err != nil {
		t.Fatal(err)
	}
	if want := math.Atan(1.25) * 180 / math.Pi; math.Abs(s.MedianDeg-want) > 0.02 {
		t.Errorf("median slope %g°, want %.2f°", s.MedianDeg, want)
	}
}
