package export

import (
	"errors"
	"os"
	"path/filepath"
	"slices"
	"testing"

	"ledgework/terrain/gdal"
)

func TestWriteLayers(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	p := newProjector(t, "EPSG:32633")
	var sums [2][]Output
	for i := range sums {
		f, err := NewFolder(filepath.Join(t.TempDir(), "run"), false)
		if err != nil {
			t.Fatal(err)
		}
		warnings, err := WriteLayers(f, s, p, gdal.ValidWKB)
		if err != nil || len(warnings) > 0 {
			t.Errorf("warnings %v, error %v", warnings, err)
		}
		sums[i] = f.Outputs()
		if err := f.Commit(); err != nil {
			t.Fatal(err)
		}
	}
	var names []string
	for _, o := range sums[0] {
		names = append(names, o.File)
	}
	if want := []string{"layers/obstacles.geojson", "layers/patches.geojson", "layers/site.geojson", "layers/zones.geojson"}; !slices.Equal(names, want) {
		t.Errorf("files %v, want %v", names, want)
	}
	if !slices.Equal(sums[0], sums[1]) {
		t.Errorf("a second run wrote other bytes: %v and %v", sums[0], sums[1])
	}
}

func TestWriteLayersWithoutCRS(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	p := newProjector(t, "EPSG:32633")
	dir := t.TempDir()
	f, err := NewFolder(filepath.Join(dir, "run"), false)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := WriteLayers(f, s, nil, gdal.ValidWKB); !errors.Is(err, ErrNoCRS) {
		t.Errorf("without a projector: error %v, want ErrNoCRS", err)
	}
	s.CRS = CRS{}
	if _, err := WriteLayers(f, s, p, gdal.ValidWKB); !errors.Is(err, ErrNoCRS) {
		t.Errorf("local: error %v, want ErrNoCRS", err)
	}
	if got := f.Outputs(); len(got) != 0 {
		t.Errorf("wrote %v, want nothing", got)
	}
	if err := WriteLocal(f, s); err != nil {
		t.Fatal(err)
	}
	if err := f.Commit(); err != nil {
		t.Fatal(err)
	}
	want := []string{"CAUTION.txt", "obstacles.csv", "obstacles.csvt", "patches.csv", "patches.csvt", "site.csv", "site.csvt", "zones.csv", "zones.csvt"}
	if got := ls(t, filepath.Join(dir, "run", LayerDir)); !slices.Equal(got, want) {
		t.Errorf("files %v, want %v", got, want)
	}
	if b, err := os.ReadFile(filepath.Join(dir, "run", LayerDir, "CAUTION.txt")); string(b) != Caution+"\n" {
		t.Errorf("caution %q, %v", b, err)
	}
}
