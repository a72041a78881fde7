package worksite

import (
	"context"
	"errors"
	"slices"
	"testing"
)

// heard writes down what a run tells.
type heard []string

func (h *heard) Begin(stage string, _ int64, _ Unit) { *h = append(*h, "begin "+stage) }
func (h *heard) Set(int64)                           { *h = append(*h, "set") }
func (h *heard) End()                                { *h = append(*h, "end") }

func TestStages(t *testing.T) {
	var h heard
	s := stages{progress: &h}
	if err := s.do(t.Context(), "one", 0, Voxels, func() (string, error) { h.Set(1); return "note", nil }); err != nil {
		t.Fatal(err)
	}
	failure := errors.New("no")
	if err := s.do(t.Context(), "two", 0, Voxels, func() (string, error) { return "", failure }); !errors.Is(err, failure) {
		t.Errorf("got %v", err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	// An interrupt during a stage that took no notice of it still ends the run.
	err := s.do(ctx, "three", 0, Voxels, func() (string, error) { cancel(); return "", nil })
	if !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
	if err := s.do(ctx, "four", 0, Voxels, func() (string, error) { panic("runs after an interrupt") }); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
	if want := []string{"begin one", "set", "end", "begin two", "begin three", "end"}; !slices.Equal(h, want) {
		t.Errorf("heard %q, want %q", h, want)
	}
	if len(s.done) != 2 || s.done[0].Name != "one" || s.done[0].Note != "note" || s.done[0].Seconds != s.done[0].Elapsed.Seconds() {
		t.Errorf("got %+v", s.done)
	}
}
