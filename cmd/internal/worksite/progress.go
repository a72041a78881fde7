package worksite

import (
	"context"
	"time"
)

// A Unit is what a stage's progress counts.
type Unit string

// The units of progress.
const (
	Bytes  Unit = "B"
	Points Unit = "points"
	Voxels Unit = "voxels"
)

// A Progress hears how a run gets on. Its methods are called by one goroutine
// at a time.
type Progress interface {
	// Begin starts a stage of total units of work, 0 where that is unknown.
	Begin(stage string, total int64, unit Unit)
	// Set says how many units of the current stage are done.
	Set(done int64)
	// End says that the current stage is finished.
	End()
}

// silent is the Progress of a run that nobody watches.
type silent struct{}

func (silent) Begin(string, int64, Unit) {}
func (silent) Set(int64)                 {}
func (silent) End()                      {}

// A Stage is a finished part of a run.
type Stage struct {
	Name    string        `json:"stage"`
	Elapsed time.Duration `json:"-"`
	Seconds float64       `json:"seconds"`
	Note    string        `json:"note,omitempty"` // what came of it, for the reader
}

// stages times the parts of a run.
type stages struct {
	progress Progress
	done     []Stage
}

// do runs f as one stage. f returns a note for the table of timings.
func (s *stages) do(ctx context.Context, name string, total int64, unit Unit, f func() (note string, err error)) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	start := time.Now()
	s.progress.Begin(name, total, unit)
	note, err := f()
	if err != nil {
		return err
	}
	s.progress.End()
	elapsed := time.Since(start)
	s.done = append(s.done, Stage{Name: name, Elapsed: elapsed, Seconds: elapsed.Seconds(), Note: note})
	return ctx.Err()
}
