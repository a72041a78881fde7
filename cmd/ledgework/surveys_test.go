package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain/gdal"
)

// TestRealSurveys builds every real survey that is no LAZ as init describes it.
// Each must end with code 0, or 4 and a reason, and with layers that GDAL opens
// and whose geometries GEOS finds valid.
func TestRealSurveys(t *testing.T) {
	root := os.Getenv("LEDGEWORK_DATA")
	if root == "" {
		t.Skip("LEDGEWORK_DATA is not set: it names a folder of real surveys")
	}
	for _, pattern := range []string{"terrain/*", "seasons/*/*"} {
		paths, err := filepath.Glob(filepath.Join(root, pattern))
		if err != nil {
			t.Fatal(err)
		}
		for _, p := range paths {
			switch strings.ToLower(filepath.Ext(p)) {
			case ".las", ".tif", ".asc", ".dem":
			default:
				continue // LAZ, and tables of reference values
			}
			name, err := filepath.Rel(root, p)
			if err != nil {
				t.Fatal(err)
			}
			t.Run(name, func(t *testing.T) { buildReal(t, p) })
		}
	}
}

func buildReal(t *testing.T, path string) {
	dir := t.TempDir()
	if code, _, stderr := finish(t, command(t, dir, "init", path, "-q")); code != exitDone {
		t.Fatalf("init: exit code %d: %s", code, stderr)
	}
	code, stdout, stderr := finish(t, command(t, dir, "build", "worksite.yaml"))
	if code != exitDone && !(code == exitNothing && strings.Contains(stderr, "nothing qualifies: ")) {
		t.Fatalf("build: exit code %d: %s", code, stderr)
	}
	t.Logf("%s%s", stderr, stdout)
	run := filepath.Join(dir, "run")
	if strings.Contains(stderr, "tables in local coordinates") {
		checkTables(t, run)
		return
	}
	if err := checkLayers(run); err != nil {
		t.Error(err)
	}
}

// checkTables opens the tables of a run in local coordinates.
func checkTables(t *testing.T, run string) {
	for _, name := range []string{"obstacles", "patches", "zones", "site"} {
		ds, err := gdal.OpenVector(filepath.Join(run, "layers", name+".csv"))
		if err != nil {
			t.Error(err)
			continue
		}
		if err := ds.Close(); err != nil {
			t.Error(err)
		}
	}
}
