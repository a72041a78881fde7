package ply

import (
	"errors"
	"strings"
	"testing"

	"ledgework/terrain"
)

const plainHeader = "ply\nformat ascii 1.0\nelement vertex 1\nproperty float x\nproperty float y\nproperty float z\nend_header\n1 2 3\n"

func newReader(s string, opts Options) (*Reader, error) {
	return NewReader(strings.NewReader(s), int64(len(s)), opts)
}

func TestLooks(t *testing.T) {
	for head, want := range map[string]bool{"ply\nformat": true, "ply\r\nformat": true, "ply \nformat": true, "ply\r": true, "ply": false,
		"plyx\n": false, "PLY\n": false, "": false, "LASF": false, "ply 1\n": false} {
		if got := Looks([]byte(head)); got != want {
			t.Errorf("Looks(%q) = %v", head, got)
		}
	}
}

func TestHeaderForms(t *testing.T) {
	for name, s := range map[string]string{
		"plain":         plainHeader,
		"crlf":          strings.ReplaceAll(plainHeader, "\n", "\r\n"),
		"blanks":        strings.ReplaceAll(plainHeader, "\n", " \n"),
		"comments":      strings.Replace(plainHeader, "element", "comment property of nobody\nobj_info x y z\n\ncomment\nelement", 1),
		"no end of it":  strings.TrimSuffix(plainHeader, "\n"),
		"sized names":   strings.ReplaceAll(plainHeader, "float", "float32"),
		"whole numbers": strings.ReplaceAll(plainHeader, "float", "short"),
		"blank lines":   strings.Replace(plainHeader, "1 2 3", "\n  \n\t1  2\t3", 1),
		"tail":          plainHeader + "4 5 6\n",
	} {
		r, err := newReader(s, Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if h := r.Header(); h.Points != 1 || h.Bytes != int64(len(s)) || h.Format != "PLY 1.0, ascii" || h.Columns != 0 || len(h.Notes) > 0 {
			t.Errorf("%s: got header %+v", name, h)
		}
		got, err := drain(r, 5)
		if err != nil || len(got.x) != 1 || got.x[0] != 1 || got.y[0] != 2 || got.z[0] != 3 {
			t.Errorf("%s: got %v and %v", name, got, err)
		}
	}
}

func TestHeaderRefused(t *testing.T) {
	with := func(old, new string) string { return strings.Replace(plainHeader, old, new, 1) }
	for _, c := range []struct{ text, want string }{
		{"", "ply: byte 0: the file is empty"},
		{"LASF", `ply: line 1: the file does not start with "ply"`},
		{"ply\nformat ascii 1.0\n", "ply: line 2: the file ends within the header"},
		{"ply\nend_header\n", "ply: line 2: the header has no format line"},
		{"ply\nformat ascii 1.0\nend_header\n", "ply: line 3: the header has no element named vertex"},
		{with("ascii", "text"), `ply: line 2: "text" is no PLY encoding`},
		{with("format ascii 1.0", "format ascii"), "ply: line 2: a format line"},
		{with("vertex 1", "vertex -1"), `ply: line 3: "-1" is no possible count`},
		{with("vertex 1", "vertex 99999999999999999999"), "is no possible count"},
		{with("vertex 1", "vertex"), "ply: line 3: an element line"},
		{with("float x", "quad x"), `ply: line 4: "quad" is no PLY type`},
		{with("float x", "list float int x"), `"float" is no type of a list's length`},
		{with("float x", "float"), "ply: line 4: a property line"},
		{with("float x", "list uchar float x"), "vertices have no number named x"},
		{with("float z", "float depth"), "vertices have no number named z"},
		{with("float z", "float y"), `ply: line 6: property "y" is there twice`},
		{with("end_header", "element vertex 2\nend_header"), `ply: line 7: element "vertex" is there twice`},
		{with("element", "property int x\nelement"), "ply: line 3: a property stands before any element"},
		{with("element", "elephant"), `ply: line 3: "elephant" is no word`},
		{with("element", "comment "+strings.Repeat("x", maxLine)+"\nelement"), "ply: line 3: the line has more than 65536 bytes"},
		{with("element", strings.Repeat("comment x\n", maxHeader/10)+"element"), "the header has more than 65536 bytes"},
		{"ply\n" + strings.Repeat("x", 1<<20), "ply: line 2: the line has more than"},
	} {
		_, err := newReader(c.text, Options{Tolerant: true})
		var fe *terrain.FormatError
		if !errors.As(err, &fe) || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%.60q: got %v, want %q", c.text, err, c.want)
		}
	}
	_, err := newReader(with("1.0", "2.0"), Options{})
	if ue := (*terrain.UnsupportedError)(nil); !errors.As(err, &ue) || ue.Feature != "PLY version 2.0" {
		t.Errorf("got %v", err)
	}
}
