package survey

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain"
)

func TestInspectLAS(t *testing.T) {
	// A grid of 0.5 m: four points in each plan cell of 1 m.
	var points [][3]float64
	var class []uint8
	for i := range 40 {
		for j := range 40 {
			points = append(points, [3]float64{500000.25 + 0.5*float64(i), 5000000.25 + 0.5*float64(j), float64(i)})
			class = append(class, uint8(2+j%2*5))
		}
	}
	path := writeLAS(t, t.TempDir(), "a.las", wktOf(t, "EPSG:32633+5773"), points, class)
	s, err := Inspect(context.Background(), path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s.Points != 1600 || s.Promised != 1600 || s.Density != 4 || math.Abs(s.Spacing-0.5) > 1e-9 {
		t.Errorf("points %d of %d, density %g, spacing %g", s.Points, s.Promised, s.Density, s.Spacing)
	}
	if s.CRS.Code != "EPSG:32633" || s.CRS.VerticalName != "EGM96 height" || s.Working.Code != "EPSG:32633" || s.Working.Local {
		t.Errorf("CRS %+v, working %+v", s.CRS, s.Working)
	}
	if len(s.Classes) != 2 || s.Classes[0] != (ClassCount{2, "2 ground", 800}) || s.Classes[1] != (ClassCount{7, "7 low noise", 800}) {
		t.Errorf("classes %v", s.Classes)
	}
	if s.Min[0] != 500000.25 || s.Max[2] != 39 || s.Intensity == nil || s.Color {
		t.Errorf("min %v max %v intensity %v color %v", s.Min, s.Max, s.Intensity, s.Color)
	}
	text, err := json.Marshal(s)
	if err != nil {
		t.Fatal(err)
	}
	for _, key := range []string{`"density_per_m2":4`, `"points_promised":1600`, `"classes":[{"class":2`, `"defects":[]`} {
		if !strings.Contains(string(text), key) {
			t.Errorf("JSON lacks %s: %s", key, text)
		}
	}
}

func TestInspectGrid(t *testing.T) {
	path := writeFile(t, t.TempDir(), "g.asc", "ncols 4\nnrows 3\nxllcorner 1000\nyllcorner 2000\ncellsize 5\nNODATA_value -9999\n1 2 3 4\n5 -9999 -9999 6\n7 8 9 -9999\n")
	s, err := Inspect(context.Background(), path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s.Points != 9 || s.Cell != 5 || s.CellM != 5 || s.Spacing != 5 || s.Density != 0.04 || math.Abs(s.NodataShare-0.25) > 1e-12 || !s.Working.Local {
		t.Errorf("summary %+v", s)
	}
}

// A file that makes no site is described all the same.
func TestInspectUnusable(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", wktOf(t, "EPSG:4326"), cloud(50), nil)
	s, err := Inspect(context.Background(), path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s.Points != 50 || !strings.Contains(s.Unusable, "is in degrees but the coordinates aren't") || s.Density != 0 {
		t.Errorf("summary %+v", s)
	}
}

func TestInspectErrors(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", "", cloud(5000), nil)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Inspect(ctx, path, Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("canceled: %v", err)
	}
	if _, err := Inspect(context.Background(), path+"x", Options{}); err == nil {
		t.Error("missing file: no error")
	}
}

// Sampled blocks give the density of all.
func TestPlanCellsAreBounded(t *testing.T) {
	c := planCells{blocks: make(map[[2]int32]block)}
	b := terrain.NewBatch(2*1100, 0)
	for i := range 1100 {
		b.Resize(2 * 1100)
		for j := range 1100 {
			x, y := float64(8*i), float64(8*j)
			b.X[2*j], b.Y[2*j], b.X[2*j+1], b.Y[2*j+1] = x, y, x+0.5, y+0.5
		}
		c.add(b)
	}
	if len(c.blocks) > maxBlocks || c.level == 0 {
		t.Errorf("%d blocks at level %d", len(c.blocks), c.level)
	}
	if d := c.density(); d != 2 {
		t.Errorf("density %g, want 2", d)
	}
}

func TestInspectRealSurvey(t *testing.T) {
	s, err := Inspect(context.Background(), filepath.Join(surveys(t), "terrain/Haystack_Rock.las"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s.Points != 21932 || s.CRS.Code != "EPSG:3645" || s.CRS.VerticalName != "NAVD88 height" || s.Unusable != "" {
		t.Errorf("summary %+v", s)
	}
	// "~1 m spacing", as its description has it.
	if s.Spacing < 0.9 || s.Spacing > 1.2 || s.Density < 0.9 || s.Density > 1.3 {
		t.Errorf("spacing %g m, density %g per m²", s.Spacing, s.Density)
	}
}
