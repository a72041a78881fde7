package export

import (
	"bytes"
	"encoding/csv"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// OGR reads the tables, their types and their geometry.
func TestWriteCSV(t *testing.T) {
	s := testSite(t, 0.1, 120, -40, 20)
	s.CRS, s.Name = CRS{}, "Gull \"Head\", north\nside"
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	for _, table := range tables {
		dir := t.TempDir()
		path := filepath.Join(dir, table.Name+".csv")
		var b, types bytes.Buffer
		if err := WriteCSV(&b, table); err != nil {
			t.Fatal(err)
		}
		if err := WriteCSVTypes(&types, table.Layer); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, b.Bytes(), 0o666); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path+"t", types.Bytes(), 0o666); err != nil {
			t.Fatal(err)
		}
		checkOGR(t, path, table)

		rows, err := csv.NewReader(bytes.NewReader(b.Bytes())).ReadAll()
		if err != nil {
			t.Fatal(err)
		}
		if len(rows) != 1+len(table.Features) || rows[0][0] != "WKT" || len(rows[0]) != 1+len(table.Fields) {
			t.Errorf("%s: %d rows, head %v", table.Name, len(rows), rows[0])
		}
		if n := strings.Count(types.String(), ","); n != len(table.Fields) {
			t.Errorf("%s: %d types, want %d", table.Name, n+1, 1+len(table.Fields))
		}
	}
	if err := WriteCSV(failingWriter{}, tables[0]); err == nil {
		t.Error("a failing writer gave no error")
	}
}

func TestAppendWKT(t *testing.T) {
	s := shape{{{{0, 0, 1}, {1, 0, 2.5}, {1, 1, 3}, {0, 0, 1}}, {{0.5, 0.25, 0}, {0.6, 0.5, 0}, {0.7, 0.5, 0}, {0.5, 0.25, 0}}}, {{{5, 5, 5}, {6, 5, 5}, {6, 6, 5}, {5, 5, 5}}}}
	want := "MULTIPOLYGON Z (((0 0 1,1 0 2.5,1 1 3,0 0 1),(0.5 0.25 0,0.6 0.5 0,0.7 0.5 0,0.5 0.25 0)),((5 5 5,6 5 5,6 6 5,5 5 5)))"
	if got := string(appendWKT(nil, s)); got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}
