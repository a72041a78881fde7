package main

import (
	"os"
	"path/filepath"
	"testing"

	"ledgework/terrain/demo"
	"ledgework/terrain/gdal"
)

// TestDemoWKT compares the CRS that the demo's files carry with the EPSG
// registry's definition of it.
func TestDemoWKT(t *testing.T) {
	c, err := gdal.ParseCRS(demoWKT)
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	if got, want := c.AuthorityCode(), demo.NewSite(demoSeed).CRS(); got != want {
		t.Errorf("got %s, want %s", got, want)
	}
	registered, err := gdal.ParseCRS(demo.NewSite(demoSeed).CRS())
	if err != nil {
		t.Fatal(err)
	}
	defer registered.Close()
	between, err := gdal.NewTransform(c, registered)
	if err != nil {
		t.Fatal(err)
	}
	defer between.Close()
	x, y := []float64{412000}, []float64{6543000}
	if err := between.Apply(x, y, nil); err != nil {
		t.Fatal(err)
	}
	if x[0] != 412000 || y[0] != 6543000 {
		t.Errorf("the two differ: (412000, 6543000) becomes (%v, %v)", x[0], y[0])
	}
}

func TestCheckDemoTarget(t *testing.T) {
	dir := t.TempDir()
	mine, old, empty := filepath.Join(dir, "mine"), filepath.Join(dir, "old"), filepath.Join(dir, "empty")
	for _, d := range []string{mine, filepath.Join(old, "survey"), filepath.Join(old, "run"), empty} {
		if err := os.MkdirAll(d, 0o755); err != nil {
			t.Fatal(err)
		}
	}
	for _, f := range []string{filepath.Join(mine, "notes"), filepath.Join(old, "worksite.yaml"), filepath.Join(old, "truth.json")} {
		if err := os.WriteFile(f, nil, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	for _, c := range []struct {
		dir             string
		overwrite, want bool
	}{
		{filepath.Join(dir, "new"), false, true},
		{empty, false, true},
		{old, false, false},
		{old, true, true},
		{mine, true, false},
		{filepath.Join(mine, "notes"), true, false},
	} {
		if err := checkDemoTarget(c.dir, c.overwrite); (err == nil) != c.want {
			t.Errorf("%s, overwrite %v: got %v, want allowed %v", filepath.Base(c.dir), c.overwrite, err, c.want)
		}
	}
}

func TestReplace(t *testing.T) {
	dir := t.TempDir()
	target := filepath.Join(dir, "d")
	for i, name := range []string{"first", "second"} {
		temp := filepath.Join(dir, "temp")
		if err := os.Mkdir(temp, 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(temp, name), nil, 0o600); err != nil {
			t.Fatal(err)
		}
		if err := replace(temp, target); err != nil {
			t.Fatal(err)
		}
		entries, err := os.ReadDir(target)
		if err != nil || len(entries) != 1 || entries[0].Name() != name {
			t.Errorf("round %d: got %v, %v, want %s alone", i, entries, err, name)
		}
	}
	if left, _ := os.ReadDir(dir); len(left) != 1 {
		t.Errorf("%d entries are left, want the target alone", len(left))
	}
}
