package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"strings"

	"ledgework/cmd/internal/worksite"
)

// The exit codes. Scripts rely on them.
const (
	exitDone        = 0
	exitFailure     = 1
	exitUsage       = 2
	exitSurvey      = 3
	exitNothing     = 4
	exitInterrupted = 130
)

// exitTable is the part of every command's help that explains exit codes.
func exitTable() string {
	var b strings.Builder
	b.WriteString("Exit codes:\n")
	for _, c := range []struct {
		code    int
		meaning string
	}{
		{exitDone, "done"},
		{exitFailure, "internal failure, or the results could not be written"},
		{exitUsage, "wrong usage or worksite file"},
		{exitSurvey, "survey unusable"},
		{exitNothing, "done, but no ground qualifies for the platform"},
		{exitInterrupted, "interrupted"},
	} {
		fmt.Fprintf(&b, "  %-4d %s\n", c.code, c.meaning)
	}
	return b.String()
}

// A usageError is a command line that cannot be run.
type usageError struct {
	error
}

func (e usageError) Unwrap() error { return e.error }

// exitCode is the code that err ends with.
func exitCode(err error) int {
	var (
		usage  usageError
		file   *worksite.Error
		folder *worksite.FolderError
		survey *worksite.SurveyError
	)
	switch {
	case err == nil:
		return exitDone
	case errors.Is(err, context.Canceled):
		return exitInterrupted
	case errors.As(err, &usage), errors.As(err, &file), errors.As(err, &folder):
		return exitUsage
	case errors.As(err, &survey):
		return exitSurvey
	case errors.Is(err, worksite.ErrNothingQualifies):
		return exitNothing
	}
	return exitFailure
}

// report tells the user of err, if there is one, and returns its exit code.
func report(term *terminal, g *globals, err error) int {
	code := exitCode(err)
	if err == nil {
		return code
	}
	text := err.Error()
	if code == exitInterrupted {
		text = "interrupted"
	}
	// One line, whatever a library put into its message.
	text = strings.Join(strings.Fields(text), " ")
	fmt.Fprintln(term.err, "ledgework: "+text)
	if g.JSON && code != exitNothing {
		enc := json.NewEncoder(term.out)
		enc.SetEscapeHTML(false)
		if err := enc.Encode(map[string]any{"error": text, "exit": code}); err != nil {
			return exitFailure
		}
	}
	return code
}
