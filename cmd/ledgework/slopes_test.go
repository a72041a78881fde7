package main

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain/gdal"
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
			s, err := slopesOf(context.Background(), c.path, 0, c.crs)
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

func TestSlopesOfTooSmallGrid(t *testing.T) {
	path := filepath.Join(t.TempDir(), "small.asc")
	if err := os.WriteFile(path, []byte("ncols 2\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 1\n1 2\n3 4\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if s, err := slopesOf(context.Background(), path, 0, ""); s != nil || err != nil {
		t.Errorf("%+v, %v; want none", s, err)
	}
}
