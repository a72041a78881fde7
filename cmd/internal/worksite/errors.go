package worksite

import (
	"errors"
	"fmt"

	"github.com/goccy/go-yaml/ast"
)

// An Error says what is wrong with a worksite file, and where.
type Error struct {
	File         string
	Line, Column int    // from 1; 0 if the file as a whole is meant
	Reason       string // what is wrong
	Remedy       string // what to do; may be empty
}

func (e *Error) Error() string {
	s := e.File
	if e.Line > 0 {
		s += fmt.Sprintf(":%d:%d", e.Line, e.Column)
	}
	s += ": " + e.Reason
	if e.Remedy != "" {
		s += "; " + e.Remedy
	}
	return s
}

// ErrNothingQualifies says that a run was finished and written, and that no
// ground in it meets the platform's limits. The error that wraps it says why.
var ErrNothingQualifies = errors.New("nothing qualifies")

// A SurveyError says that a survey cannot be used.
type SurveyError struct {
	Err error
}

func (e *SurveyError) Error() string { return e.Err.Error() }

func (e *SurveyError) Unwrap() error { return e.Err }

// A FolderError says that a folder given for the run cannot be written, or
// read.
type FolderError struct {
	Reason string
	Remedy string // what to do; may be empty
}

func (e *FolderError) Error() string {
	if e.Remedy == "" {
		return e.Reason
	}
	return e.Reason + "; " + e.Remedy
}

// errorAt is an Error at node n; the file's name is filled in by Parse.
func errorAt(n ast.Node, reason, remedy string) *Error {
	e := &Error{Reason: reason, Remedy: remedy}
	// The token of a block of keys is its first colon; its place is its first key.
	switch m := n.(type) {
	case *ast.MappingNode:
		if !m.IsFlowStyle && len(m.Values) > 0 {
			n = m.Values[0].Key
		}
	case *ast.MappingValueNode:
		n = m.Key
	}
	if t := n.GetToken(); t != nil && t.Position != nil {
		e.Line, e.Column = t.Position.Line, t.Position.Column
	}
	return e
}
