package export

import (
	"bytes"
	"encoding/json"
	"reflect"
	"strings"
	"testing"
)

func TestRecordRoundTrip(t *testing.T) {
	rec := Record{
		Version: "0.1.0", Command: "build", Started: "2026-05-14T10:00:00Z", Finished: "2026-05-14T10:00:07Z", Outcome: "2 patches",
		Site: "Gull Head", CRS: CRS{Authority: "EPSG", Code: "32633"}, SpacingM: 0.05,
		Inputs:     []Input{{File: "a.las", SHA256: "ff", Bytes: 1, Format: "LAS 1.4", Points: 9, Defects: []string{"one"}}},
		Parameters: map[string]any{"spacing_m": "auto"}, Counts: map[string]int64{"points": 9},
		Outputs: []Output{{File: "layers/site.geojson", SHA256: "00", Bytes: 5}}, Warnings: []string{"a < b"},
		Timings: []Timing{{"read", 1.5}}, System: System{OS: "linux", Threads: 2},
	}
	var b bytes.Buffer
	if err := WriteRecord(&b, rec); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(b.String(), "a < b") {
		t.Error("text is escaped as if for HTML")
	}
	got, err := ReadRecord(&b)
	if err != nil {
		t.Fatal(err)
	}
	rec.Program, rec.Format, rec.Caution = Program, RecordFormat, Caution
	if !reflect.DeepEqual(*got, rec) {
		t.Errorf("got %+v, want %+v", *got, rec)
	}
}

func TestRecordHasNoNulls(t *testing.T) {
	var b bytes.Buffer
	if err := WriteRecord(&b, Record{Parameters: struct{}{}}); err != nil {
		t.Fatal(err)
	}
	if strings.Contains(b.String(), "null") {
		t.Errorf("wrote %s", b.String())
	}
}

func TestReadRecordErrors(t *testing.T) {
	for _, tt := range []struct{ text, want string }{
		{"", "EOF"},
		{"[]", "cannot unmarshal"},
		{`{"program":"another"}`, `program is "another"`},
		{`{"program":"ledgework","format":99}`, "format 99"},
		{`{"program":"ledgework"`, "EOF"},
	} {
		if _, err := ReadRecord(strings.NewReader(tt.text)); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want %q in it", tt.text, err, tt.want)
		}
	}
}

// FuzzReadRecord asserts that what is read is written and read again unchanged.
func FuzzReadRecord(f *testing.F) {
	f.Add([]byte(`{"program":"ledgework","format":1,"inputs":[{"file":"a"}],"parameters":{"a":[1,null]},"counts":{"b":2}}`))
	f.Add([]byte(`{"program":"ledgework","format":1,"timings":[{"stage":"x","seconds":1e-9}]}`))
	f.Fuzz(func(t *testing.T, b []byte) {
		rec, err := ReadRecord(bytes.NewReader(b))
		if err != nil {
			return
		}
		var first, second bytes.Buffer
		if err := WriteRecord(&first, *rec); err != nil {
			t.Fatal(err)
		}
		again, err := ReadRecord(bytes.NewReader(first.Bytes()))
		if err != nil {
			t.Fatal(err)
		}
		if err := WriteRecord(&second, *again); err != nil {
			t.Fatal(err)
		}
		if !json.Valid(first.Bytes()) || !bytes.Equal(first.Bytes(), second.Bytes()) {
			t.Errorf("%s became %s", first.Bytes(), second.Bytes())
		}
	})
}
