package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"testing"

	"ledgework/cmd/internal/worksite"
	"ledgework/terrain"
)

func TestReport(t *testing.T) {
	for _, c := range []struct {
		err        error
		code       int
		text, json string
	}{
		{nil, 0, "", ""},
		{errors.New("a\n  b"), 1, "ledgework: a b\n", `{"error":"a b","exit":1}` + "\n"},
		{usageError{errors.New("no")}, 2, "ledgework: no\n", `{"error":"no","exit":2}` + "\n"},
		{&worksite.Error{File: "w.yaml", Line: 2, Column: 3, Reason: "bad", Remedy: "mend it"}, 2,
			"ledgework: w.yaml:2:3: bad; mend it\n", `{"error":"w.yaml:2:3: bad; mend it","exit":2}` + "\n"},
		{&worksite.FolderError{Reason: "taken"}, 2, "ledgework: taken\n", `{"error":"taken","exit":2}` + "\n"},
		{&worksite.SurveyError{Err: &terrain.FormatError{Format: "las", Place: "byte 0", Reason: "no <magic>"}}, 3,
			"ledgework: las: byte 0: no <magic>\n", `{"error":"las: byte 0: no <magic>","exit":3}` + "\n"},
		// The result was printed before, with its reason and code.
		{fmt.Errorf("%w: too steep", worksite.ErrNothingQualifies), 4, "ledgework: nothing qualifies: too steep\n", ""},
		{fmt.Errorf("reading: %w", context.Canceled), 130, "ledgework: interrupted\n", `{"error":"interrupted","exit":130}` + "\n"},
	} {
		for _, asJSON := range []bool{false, true} {
			var out, errs bytes.Buffer
			if got := report(&terminal{out: &out, err: &errs}, &globals{JSON: asJSON}, c.err); got != c.code {
				t.Errorf("%v: code %d, want %d", c.err, got, c.code)
			}
			if got := errs.String(); got != c.text {
				t.Errorf("%v: stderr %q, want %q", c.err, got, c.text)
			}
			want := ""
			if asJSON {
				want = c.json
			}
			if got := out.String(); got != want {
				t.Errorf("%v: stdout %q, want %q", c.err, got, want)
			}
		}
	}
}
