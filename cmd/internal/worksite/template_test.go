package worksite

import (
	"reflect"
	"strings"
	"testing"
)

// TestText reads back what Text writes.
func TestText(t *testing.T) {
	plain := Default()
	plain.Surveys = []Survey{{Files: []string{"a.las"}}}
	full := Default()
	full.Site = `Gull "Head": #1`
	full.CRS = `PROJCS["x",PARAMETER["y",1]]`
	full.SpacingM = 0.05
	full.Crop = BoxAround(500000.12, 6200000.9, 500100.5, 6200050, 1)
	full.Surveys = []Survey{
		{Date: "2026-05-14", Files: []string{"scan one/*.las", `b\c.las`, "é: #.las"}, CRS: "EPSG:4326", AccuracyM: 0.01,
			Band: 3, TolerateDefects: true, Sensors: []Point{{1, 2, 3}, {4.125, 5, -6}}, Checkpoints: []Point{{7, 8, 9}}},
		{Files: []string{"late"}},
	}
	cropped := Default()
	cropped.Crop = &Crop{File: "area.gpkg"}
	cropped.Surveys = plain.Surveys
	for _, w := range []*Worksite{plain, full, cropped} {
		text, err := w.Text()
		if err != nil {
			t.Fatal(err)
		}
		got, err := Parse("w.yaml", text)
		if err != nil {
			t.Fatalf("%v\n%s", err, text)
		}
		got.path, got.tree = "", nil
		if !reflect.DeepEqual(got, w) {
			t.Errorf("got  %+v\nwant %+v\n%s", got, w, text)
		}
		// Every key is there, if only in a comment.
		for _, key := range keys(reflect.TypeFor[Worksite](), nil) {
			if !strings.Contains(string(text), key+":") {
				t.Errorf("key %s is not in the file:\n%s", key, text)
			}
		}
	}
}

func TestBoxAround(t *testing.T) {
	got := BoxAround(-1.5, 2, 3.01, 4, 1).Box
	if want := [4]float64{-2, 2, 4, 4}; got != want {
		t.Errorf("got %v, want %v", got, want)
	}
}
