package main

import (
	"io"
	"os"
	"sync"

	"golang.org/x/term"
)

// A terminal is where a command writes to: results to out, progress, timings
// and errors to err.
type terminal struct {
	out, err    io.Writer
	interactive bool // err is a screen that bars can be drawn on

	mu      sync.Mutex
	cleanup func() // removes what an unfinished command has written
}

func systemTerminal() *terminal {
	return &terminal{
		out:         os.Stdout,
		err:         os.Stderr,
		interactive: term.IsTerminal(int(os.Stderr.Fd())),
	}
}

// onAbandon sets what removes the traces of an unfinished command; nil when
// there is nothing to remove any more.
func (t *terminal) onAbandon(f func()) {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.cleanup = f
}

// abandon removes the traces of an unfinished command.
func (t *terminal) abandon() {
	t.mu.Lock()
	defer t.mu.Unlock()
	if t.cleanup != nil {
		t.cleanup()
		t.cleanup = nil
	}
}
