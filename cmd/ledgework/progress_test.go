package main

import (
	"bytes"
	"strings"
	"testing"

	"ledgework/cmd/internal/worksite"
)

func TestProgressIsForScreens(t *testing.T) {
	for _, c := range []struct {
		g           globals
		interactive bool
		want        bool
	}{
		{globals{}, true, true},
		{globals{}, false, false},
		{globals{Quiet: true}, true, false},
		{globals{JSON: true}, true, false},
	} {
		var errs bytes.Buffer
		p, closeProgress := newProgress(&c.g, &terminal{err: &errs, interactive: c.interactive})
		if got := p != nil; got != c.want {
			t.Errorf("%+v, interactive %v: progress %v, want %v", c.g, c.interactive, got, c.want)
		}
		closeProgress()
	}
}

// TestBars goes through a run that fails in its third stage. The bars must let
// go of the screen all the same.
func TestBars(t *testing.T) {
	var errs bytes.Buffer
	p, closeProgress := newProgress(&globals{}, &terminal{err: &errs, interactive: true})
	p.Begin("read", 1000, worksite.Bytes)
	p.Set(500)
	p.Set(1000)
	p.End()
	p.Begin("planes", 0, worksite.Voxels)
	p.End()
	p.Begin("points", 10, worksite.Points)
	p.Set(3)
	closeProgress()
	for _, want := range []string{"read", "100 %", "planes", "points"} {
		if !strings.Contains(errs.String(), want) {
			t.Errorf("%q was not drawn: %q", want, errs.String())
		}
	}
}

func TestPrintStages(t *testing.T) {
	var errs bytes.Buffer
	printStages(&terminal{err: &errs}, []worksite.Stage{{Name: "read", Elapsed: 1500e6, Note: "7 points"}, {Name: "clean", Elapsed: 250e6}})
	const want = "read                   1.50 s   7 points\nclean                  0.25 s\ntotal                  1.75 s\n"
	if got := errs.String(); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}
