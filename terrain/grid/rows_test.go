package grid

import (
	"math"
	"os"
	"path/filepath"
	"testing"
)

func TestRows(t *testing.T) {
	path := filepath.Join(t.TempDir(), "rows.asc")
	if err := os.WriteFile(path, []byte("ncols 3\nnrows 2\nxllcorner 10\nyllcorner 20\ncellsize 2\nNODATA_value -1\n1 -1 3\n4 5 6\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	r, err := OpenRows(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if c, n := r.Size(); c != 3 || n != 2 {
		t.Fatalf("%d columns, %d rows; want 3, 2", c, n)
	}
	if x, y := r.Cell(2, 0); x != 15 || y != 23 {
		t.Errorf("cell (2, 0) at %g, %g; want 15, 23", x, y)
	}
	if a, b := r.CellSize(); a != 2 || b != 2 {
		t.Errorf("cells of %g by %g, want 2 by 2", a, b)
	}
	row := make([]float64, 3)
	if err := r.Read(0, row); err != nil || row[0] != 1 || !math.IsNaN(row[1]) || row[2] != 3 {
		t.Errorf("row 0 is %v, %v", row, err)
	}
	if err := r.Read(1, row); err != nil || row[1] != 5 {
		t.Errorf("row 1 is %v, %v", row, err)
	}
	if _, err := OpenRows(path+"x", Options{}); err == nil {
		t.Error("a missing file was opened")
	}
}
