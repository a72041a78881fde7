package xyz

import (
	"errors"
	"fmt"
	"strings"
	"testing"

	"ledgework/terrain"
)

func newReader(s string, opts Options) (*Reader, error) {
	return NewReader(strings.NewReader(s), int64(len(s)), opts)
}

const ptxScan = "2\n2\n0 0 0\n1 0 0\n0 1 0\n0 0 1\n1 0 0 0\n0 1 0 0\n0 0 1 0\n0 0 0 1\n1 2 3 0.5\n1 2 3 0.5\n"

func TestLooks(t *testing.T) {
	for head, want := range map[string]bool{
		"1 2 3\n": true, "1,2,3\r\n4,5,6": true, "1;2;3": true, "1\t2\t3": true, "12\n1 2 3\n": true, "x,y,z\n": true, "Easting;Northing;Height\n": true,
		"# points\n\n// more\n1 2 3\n": true, "\xef\xbb\xbf1 2 3\n": true, "1,5;2,5;3,5\n": true, "1,5 2,5 3,5\n": true, "-1e3 +.5 nan\n": true,
		"x,y,depth\n": true, ptxScan: true,
		"": false, "\n\n": false, "# only words\n": false, "ply\nformat ascii 1.0\n": false, "LASF\x00\x00": false, "ncols 10\nnrows 5\n": false,
		"1 2\n": false, "{\"x\": 1}": false, "one two three\n": false, "VERSION 0.7\n": false, "1 2 3\n\x00": false, "II*\x00": false, "1.5\n": false,
	} {
		if got := Looks([]byte(head)); got != want {
			t.Errorf("Looks(%q) = %v", head, got)
		}
	}
}

// TestLayouts writes the same two points in many ways.
func TestLayouts(t *testing.T) {
	type wish struct {
		format    string
		columns   terrain.Columns
		points    int64
		intensity [2]uint16
		rgb       [2]uint16 // red of both points
		class     uint8
		notes     int
	}
	for _, c := range []struct {
		text string
		want wish
	}{
		{"1 2 3\n4.5 -5 6e1\n", wish{format: "XYZ text", points: -1}},
		{"1 2 3\r\n4.5 -5 6e1", wish{format: "XYZ text", points: -1}},
		{"1 2 3\r4.5 -5 6e1\r", wish{format: "XYZ text", points: -1}},
		{"\xef\xbb\xbf1 2 3\n4.5 -5 6e1\n", wish{format: "XYZ text", points: -1}},
		{"\xef\xbb\xbfx y z\n1 2 3\n4.5 -5 6e1\n", wish{format: "XYZ text", points: -1}},
		{"# a comment\n\n  1   2\t3 \n// another\n\t4.5 -5 6e1\n\n", wish{format: "XYZ text", points: -1}},
		{"1\t2\t3\n4.5\t-5\t6e1\n", wish{format: "XYZ text", points: -1}},
		{"1,2,3\n4.5,-5,6e1\n", wish{format: "CSV text", points: -1}},
		{"1, 2, 3,\n4.5 ,-5 ,6e1,\n", wish{format: "CSV text", points: -1}},
		{"1;2;3\n4.5; -5; 6e1\n", wish{format: "CSV text", points: -1}},
		{"\"1\",\"2\",\"3\"\n\"4.5\",\"-5\",\"6e1\"\n", wish{format: "CSV text", points: -1}},
		// A separator between quotes is text.
		{"\"note\",\"x\",\"y\",\"z\"\n\"a; b, c\",\"1\",\"2\",\"3\"\n\"5\"\" pipe, \"\"x\"\"\",4.5,-5,6e1\n", wish{format: "CSV text", points: -1}},
		{"note,x,y,z\n5\" pipe,1,2,3\n\"odd,4.5,-5,6e1\n", wish{format: "CSV text", points: -1}},
		{"X,Y,Z\n1,2,3\n4.5,-5,6e1\n", wish{format: "CSV text", points: -1}},
		{"Northing;Height;name;EASTING\n2;3;a;1\n-5;6e1;b;4.5\n", wish{format: "CSV text", points: -1}},
		{"\"n [m]\",\"h [m]\",\"e [m]\"\n2,3,1\n-5,6e1,4.5\n", wish{format: "CSV text", points: -1}},
		{"y x elevation\n2 1 3\n-5 4.5 6e1\n", wish{format: "XYZ text", points: -1}},
		{"//Y X Z\n2 1 3\n-5 4.5 6e1\n", wish{format: "XYZ text", points: -1}},
		{"# y, x, z\n2,1,3\n-5,4.5,6e1\n", wish{format: "CSV text", points: -1}},
		{"# y z\n1 2 3\n4.5 -5 6e1\n", wish{format: "XYZ text", points: -1}},
		{"2\n1 2 3\n4.5 -5 6e1\n", wish{format: "PTS text", points: 2}},
		{"1 2 3 10\n4.5 -5 6e1 65535\n", wish{format: "XYZ text", points: -1, columns: terrain.Intensity, intensity: [2]uint16{10, 65535}}},
		{"1 2 3 0.5\n4.5 -5 6e1 1\n", wish{format: "XYZ text", points: -1, columns: terrain.Intensity, intensity: [2]uint16{32768, 65535}, notes: 1}},
		{"1 2 3 -2048\n4.5 -5 6e1 2047\n", wish{format: "XYZ text", points: -1, columns: terrain.Intensity, intensity: [2]uint16{0, 4095}, notes: 1}},
		{"2\n1 2 3 0\n4.5 -5 6e1 2047\n", wish{format: "PTS text", points: 2, columns: terrain.Intensity, intensity: [2]uint16{2048, 4095}, notes: 1}},
		{"2\n1 2 3 0\n4.5 -5 6e1 4000\n", wish{format: "PTS text", points: 2, columns: terrain.Intensity, intensity: [2]uint16{0, 4000}}},
		{"1 2 3 1 9 9\n4.5 -5 6e1 255 9 9\n", wish{format: "XYZ text", points: -1, columns: terrain.Color, rgb: [2]uint16{257, 65535}}},
		{"1 2 3 1 9 9\n4.5 -5 6e1 256 9 9\n", wish{format: "XYZ text", points: -1, notes: 1}},
		{"1 2 3 1 9 9\n4.5 -5 6e1 0.5 9 9\n", wish{format: "XYZ text", points: -1, notes: 1}},
		{"1 2 3 1 9\n4.5 -5 6e1 0.5 9\n", wish{format: "XYZ text", points: -1, notes: 1}},
		{"1 2 3 7 1 9 9\n4.5 -5 6e1 8 255 9 9\n", wish{format: "XYZ text", points: -1, columns: terrain.Color | terrain.Intensity,
			intensity: [2]uint16{7, 8}, rgb: [2]uint16{257, 65535}}},
		{"2\n1 2 3 -1613 1 9 9\n4.5 -5 6e1 8 255 9 9\n", wish{format: "PTS text", points: 2, columns: terrain.Color | terrain.Intensity,
			intensity: [2]uint16{435, 2056}, rgb: [2]uint16{257, 65535}, notes: 1}},
		{"1 2 3 1 9 9 0 0 1\n4.5 -5 6e1 255 9 9 0 0 1\n", wish{format: "XYZ text", points: -1, notes: 1}},
		{"x,y,z,i,r,g,b,class\n1,2,3,7,1000,9,9,5\n4.5,-5,6e1,8,2000,9,9,5\n", wish{format: "CSV text", points: -1,
			columns: terrain.Color | terrain.Intensity | terrain.Class, intensity: [2]uint16{7, 8}, rgb: [2]uint16{1000, 2000}, class: 5, notes: 1}},
		{"x,y,z,red,green,blue\n1,2,3,0.5,0,0\n4.5,-5,6e1,1,0,0\n", wish{format: "CSV text", points: -1, columns: terrain.Color,
			rgb: [2]uint16{32768, 65535}, notes: 1}},
		{"x,y,z,intensity\n1,2,3,\n4.5,-5,6e1,9\n", wish{format: "CSV text", points: -1, columns: terrain.Intensity, intensity: [2]uint16{0, 9}}},
	} {
		r, err := newReader(c.text, Options{})
		if err != nil {
			t.Errorf("%q: %v", c.text, err)
			continue
		}
		h := r.Header()
		if h.Format != c.want.format || h.Points != c.want.points || h.Columns != c.want.columns || len(h.Notes) != c.want.notes || h.Bytes != int64(len(c.text)) {
			t.Errorf("%q: got header %+v", c.text, h)
		}
		got, err := drain(r, 5)
		if err != nil || fmt.Sprint(got.x, got.y, got.z) != "[1 4.5] [2 -5] [3 60]" {
			t.Errorf("%q: got %v and %v", c.text, got, err)
			continue
		}
		if g := [2]uint16(got.intensity); g != c.want.intensity {
			t.Errorf("%q: got intensities %v", c.text, g)
		}
		if g := [2]uint16(got.rgb[0]); g != c.want.rgb {
			t.Errorf("%q: got red %v", c.text, g)
		}
		if got.class[0] != c.want.class {
			t.Errorf("%q: got class %d", c.text, got.class[0])
		}
		if r.Consumed() != int64(len(c.text)) || r.Defects() != nil {
			t.Errorf("%q: consumed %d bytes, defects %v", c.text, r.Consumed(), r.Defects())
		}
	}
}

func TestLayoutRefused(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"", "xyz: byte 0: the file is empty"},
		{"1 2 3\n\x00", "xyz: line 2: the file is not text"},
		{"1 2\n", "xyz: line 1: the line has 2 columns, a point needs 3"},
		{"# note\n1 2 x\n", `xyz: line 2: "x" is no number`},
		{"1,5;2,5;3,5\n", `xyz: line 1: "1,5" is no number; write the numbers with decimal points`},
		{"1;2,5;3,5\n", `xyz: line 1: "2,5" is no number; write the numbers with decimal points`},
		{"1,5 2,5 3,5\n", `xyz: line 1: "1,5" is no number; write the numbers with decimal points`},
		{"1,5\t2,5\t3,5\n", `xyz: line 1: "1,5" is no number; write the numbers with decimal points`},
		{"x;y;z\n1,5;2,5;3,5\n", `xyz: line 2: "1,5" is no number; write the numbers with decimal points`},
		{"x,y,z\n1,5,2,5,3,5\n", "xyz: line 2: the line has 6 columns, there are 3 names"},
		{"X (m) Y (m) Z (m)\n1 2 3\n", "xyz: line 2: the line has 3 columns, there are 6 names"},
		{"x,y,depth\n1,2,3\n", `xyz: line 1: "x,y,depth" names no columns x, y and z`},
		{"P1 1 2 3\n", "names no columns x, y and z"},
		{strings.Repeat("1", 1<<17), "xyz: line 1: the line has more than 65536 bytes"},
	} {
		_, err := newReader(c.text, Options{Tolerant: true})
		var fe *terrain.FormatError
		if !errors.As(err, &fe) || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%.60q: got %v, want %q", c.text, err, c.want)
		}
	}
	for text, want := range map[string]string{ptxScan: "a PTX file of gridded scans", "\xff\xfe1\x00": "text in UTF-16"} {
		_, err := newReader(text, Options{})
		if ue := (*terrain.UnsupportedError)(nil); !errors.As(err, &ue) || ue.Feature != want || ue.Remedy == "" {
			t.Errorf("%.20q: got %v", text, err)
		}
	}
}
