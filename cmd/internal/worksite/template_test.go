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
	full.Crop = BoxAround(500000.12, 6200000.9, 500100.5, 6200050)
	full.Surveys = []Survey{
		{Date: "2026-05-14", Files: []string{"scan one/*.las", `b\c.las`, "é: #.las"}, CRS: "EPSG:4326", AccuracyM: 0.01,
			Band: 3, TolerateDefects: true, Sensors: []Point{{1, 2, 3}, {4.125, 5, -6}}, Checkpoints: []Point{{7, 8, 9}}, CheckpointSigmaM: 0.02},
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
	for _, c := range []struct {
		e0, n0, e1, n1 float64
		want           [4]float64
	}{
		{-1.5, 2, 33.01, 4, [4]float64{-2, 2, 34, 5}},
		{0.001, 0.5, 0.5, 0.5, [4]float64{0, 0.5, 0.51, 0.51}},
		{400000, 5e6, 400000, 5e6, [4]float64{400000, 5e6, 400000.01, 5000000.01}},
	} {
		if got := BoxAround(c.e0, c.n0, c.e1, c.n1).Box; got != c.want {
			t.Errorf("got %v, want %v", got, c.want)
		}
	}
}
