package xyz

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"sync/atomic"
)

const (
	// bufferBytes is the size of one read from the file.
	bufferBytes = 256 << 10

	// maxLine bounds a line. It is also what the layout is decided on.
	maxLine = 64 << 10
)

// input is a file of lines.
type input struct {
	buf   *bufio.Reader
	end   byte // of a line
	lines int64
	read  counter
}

// counter counts the bytes that pass through it.
type counter struct {
	r io.Reader
	n atomic.Int64
}

func (c *counter) Read(p []byte) (int, error) {
	n, err := c.r.Read(p)
	c.n.Add(int64(n))
	return n, err
}

func newInput(r io.Reader) *input {
	in := &input{end: '\n', read: counter{r: r}}
	in.buf = bufio.NewReaderSize(&in.read, bufferBytes)
	return in
}

// head returns the file's beginning without taking it: maxLine bytes, or
// the whole of a shorter file.
func (in *input) head() (b []byte, whole bool, err error) {
	b, err = in.buf.Peek(maxLine)
	if err != nil && !errors.Is(err, io.EOF) {
		return nil, false, in.wrap(err)
	}
	return b, err != nil, nil
}

// line returns the next line, without blanks at its ends. It is valid until
// the next call. After the last line the error is io.EOF.
func (in *input) line() ([]byte, error) {
	b, err := in.buf.ReadSlice(in.end)
	if len(b) > 0 {
		in.lines++
	}
	if len(b) > maxLine || errors.Is(err, bufio.ErrBufferFull) {
		return nil, formatError(in.lines, fmt.Sprintf("the line has more than %d bytes", maxLine), "check that it is a text file")
	}
	if err != nil && !errors.Is(err, io.EOF) {
		return nil, in.wrap(err)
	}
	if len(b) == 0 {
		return nil, io.EOF
	}
	return trim(b), nil
}

func (in *input) wrap(err error) error { return fmt.Errorf("xyz: after line %d: %w", in.lines, err) }

// trim cuts blanks and line ends off both ends.
func trim(b []byte) []byte {
	for len(b) > 0 && isBlank(b[0]) {
		b = b[1:]
	}
	for len(b) > 0 && isBlank(b[len(b)-1]) {
		b = b[:len(b)-1]
	}
	return b
}

func isBlank(c byte) bool { return c == ' ' || c >= '\t' && c <= '\r' }

// isComment reports whether a trimmed line has no point by intent.
func isComment(line []byte) bool {
	return len(line) == 0 || line[0] == '#' || bytes.HasPrefix(line, []byte("//"))
}
