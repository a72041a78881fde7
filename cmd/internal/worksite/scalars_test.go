package worksite

import (
	"encoding/json"
	"testing"
)

func TestJSON(t *testing.T) {
	for _, c := range []struct {
		value any
		want  string
	}{
		{AutoLength(0), `"auto"`},
		{AutoLength(0.05), `0.05`},
		{&Crop{File: "area.gpkg"}, `"area.gpkg"`},
		{&Crop{Box: [4]float64{1, 2, 3, 4.5}}, `[1,2,3,4.5]`},
		{Classes{7, 18}, `[7,18]`},
		{Classes(nil), `[]`},
		{Point{1, 2, 3}, `[1,2,3]`},
	} {
		got, err := json.Marshal(c.value)
		if err != nil || string(got) != c.want {
			t.Errorf("%#v: got %s, %v, want %s", c.value, got, err, c.want)
		}
	}
}

func TestStrings(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{AutoLength(0).String(), "auto"},
		{AutoLength(0.25).String(), "0.25"},
		{Classes{7}.String(), "[7]"},
		{Classes{7, 18, 255}.String(), "[7, 18, 255]"},
		{number(0.3), "0.30"},
		{number(5), "5"},
		{number(0.125), "0.125"},
	} {
		if c.got != c.want {
			t.Errorf("got %s, want %s", c.got, c.want)
		}
	}
}
