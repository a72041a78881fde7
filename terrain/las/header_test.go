package las

import (
	"bytes"
	"encoding/binary"
	"errors"
	"math"
	"strings"
	"testing"

	"ledgework/terrain"
)

func TestLooks(t *testing.T) {
	for head, want := range map[string]bool{"LASF\x00\x00": true, "LASF": true, "LAS": false, "": false, "ply\n": false} {
		if got := Looks([]byte(head)); got != want {
			t.Errorf("Looks(%q) = %v", head, got)
		}
	}
}

func TestHeaderRefused(t *testing.T) {
	good, _ := build(spec{minor: 4, format: 7, points: 2})
	for _, c := range []struct {
		name  string
		spoil func(b []byte) []byte
		want  string
	}{
		{"empty", func([]byte) []byte { return nil }, "the file is empty"},
		{"magic", func(b []byte) []byte { b[0] = 'X'; return b }, `byte 0: the file does not start with "LASF"`},
		{"short", func(b []byte) []byte { return b[:200] }, "byte 200: the file ends within the header"},
		{"short 1.4", func(b []byte) []byte { return b[:300] }, "byte 300: the file ends within the header"},
		{"header size", func(b []byte) []byte { b[94], b[95] = 100, 0; return b }, "byte 94: the header is said to have 100 bytes"},
		{"offset", func(b []byte) []byte { b[96], b[97] = 1, 0; return b }, "byte 96: points are said to start at byte 1"},
		{"record length", func(b []byte) []byte { b[105] = 35; return b }, "byte 105: point records of 35 bytes are too short for point format 7"},
		{"record length 0", func(b []byte) []byte { b[105] = 0; return b }, "byte 105: point records of 0 bytes"},
		{"scale", func(b []byte) []byte { clear(b[139:147]); return b }, "byte 139: the y scale is 0"},
		{"scale NaN", func(b []byte) []byte { putFloat(b[147:], math.NaN()); return b }, "byte 147: the z scale is NaN"},
		{"offset Inf", func(b []byte) []byte { putFloat(b[155:], math.Inf(1)); return b }, "byte 155: the x offset is +Inf"},
	} {
		b := c.spoil(bytes.Clone(good))
		_, err := NewReader(bytes.NewReader(b), int64(len(b)), Options{Tolerant: true})
		var fe *terrain.FormatError
		if !errors.As(err, &fe) || !strings.HasPrefix(err.Error(), "las: ") || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: got %v, want %q", c.name, err, c.want)
		}
	}
}

func putFloat(b []byte, v float64) { binary.LittleEndian.PutUint64(b, math.Float64bits(v)) }

func TestHeaderUnsupported(t *testing.T) {
	for _, c := range []struct {
		s    spec
		want string
	}{
		{spec{minor: 2, format: 0x80 | 3}, "compressed LAS (LAZ)"},
		{spec{minor: 4, format: 6, vlrs: []vlr{{lazUser, recordLaz, make([]byte, 34)}}}, "compressed LAS (LAZ)"},
		{spec{minor: 4, format: 0x80 | 7, vlrs: []vlr{{"copc", 1, make([]byte, 160)}}}, "compressed LAS (LAZ)"},
		{spec{minor: 4, format: 11}, "point format 11"},
		{spec{minor: 6, format: 6}, "LAS version 1.6"},
		{spec{major: 2, minor: 0, format: 0}, "LAS version 2.0"},
	} {
		b, _ := build(c.s)
		_, err := NewReader(bytes.NewReader(b), int64(len(b)), Options{})
		var ue *terrain.UnsupportedError
		if !errors.As(err, &ue) || ue.Feature != c.want || ue.Remedy == "" {
			t.Errorf("got %v, want %q", err, c.want)
		}
	}
}

func TestHeaderDate(t *testing.T) {
	for _, c := range []struct {
		day, year uint16
		want      string
	}{
		{1, 2026, "2026-01-01"}, {365, 2026, "2026-12-31"}, {366, 2024, "2024-12-31"}, {60, 2024, "2024-02-29"},
		{366, 2026, ""}, {0, 2022, ""}, {1, 1, ""}, {0, 0, ""}, {367, 2024, ""}, {1, 60000, ""},
	} {
		b, _ := build(spec{minor: 2, day: c.day, year: c.year})
		if got := open(t, b, Options{}).Header().Date; got != c.want {
			t.Errorf("day %d of %d: got %q, want %q", c.day, c.year, got, c.want)
		}
	}
}

func TestHeaderProducer(t *testing.T) {
	for _, c := range []struct{ system, software, want string }{
		{"", "", ""}, {"OTHER", "scanworks 3", "scanworks 3"}, {"", "scanworks 3", "scanworks 3"}, {"tripod", "", "tripod"},
		{"tripod", "scanworks 3", "scanworks 3 (tripod)"}, {"OTHER", "a\x01b\xff\x00rest", "a b"}, {"OTHER", "exactly thirty-two characters ok", "exactly thirty-two characters ok"},
	} {
		b, _ := build(spec{minor: 2, system: c.system, software: c.software})
		if got := open(t, b, Options{}).Header().Producer; got != c.want {
			t.Errorf("%q, %q: got %q, want %q", c.system, c.software, got, c.want)
		}
	}
}

func TestHeaderCounts(t *testing.T) {
	b, _ := build(spec{minor: 4, format: 3, points: 4, legacyOnly: true})
	r := open(t, b, Options{})
	if got, err := drain(r, 3); err != nil || len(got.x) != 4 || len(r.Header().Notes) != 1 {
		t.Errorf("legacy count only: got %d points, %v, notes %q", len(got.x), err, r.Header().Notes)
	}
	b, _ = build(spec{minor: 4, format: 3, points: 4})
	binary.LittleEndian.PutUint32(b[107:], 9)
	r = open(t, b, Options{})
	if r.Header().Points != 4 || len(r.Header().Notes) != 1 {
		t.Errorf("two counts: got %d points, notes %q", r.Header().Points, r.Header().Notes)
	}
	b, _ = build(spec{minor: 2, format: 3, points: 4})
	if r := open(t, b, Options{}); r.Header().Points != 4 || len(r.Header().Notes) != 0 {
		t.Errorf("1.2: got %d points, notes %q", r.Header().Points, r.Header().Notes)
	}
}

func TestHeaderExtentThatIsNone(t *testing.T) {
	b, _ := build(spec{minor: 2, format: 0, points: 1})
	for _, v := range []float64{math.NaN(), math.Inf(1), -11} { // the x maximum; the minimum is -10
		putFloat(b[179:], v)
		if h := open(t, b, Options{}).Header(); h.Extent != nil || len(h.Notes) != 1 {
			t.Errorf("x maximum %g: got extent %v, notes %q", v, h.Extent, h.Notes)
		}
	}
}

func TestNegativeScale(t *testing.T) {
	s := spec{minor: 2, format: 0, points: 9, scale: [3]float64{-0.01, 0.01, 0.01}}
	b, want := build(s)
	r := open(t, b, Options{})
	got, err := drain(r, 9)
	if err != nil {
		t.Fatal(err)
	}
	compare(t, got, want, s.scale, s.offset)
	if r.Header().Step[0] != 0.01 {
		t.Errorf("got step %v", r.Header().Step)
	}
}
