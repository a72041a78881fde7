package ply

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

	// maxLine bounds a line of the header or of an ascii file.
	maxLine = 64 << 10
)

// input is a buffered file that knows where it is.
type input struct {
	buf    *bufio.Reader
	offset int64 // bytes taken out of the buffer
	lines  int64 // lines taken
	read   counter
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
	in := &input{read: counter{r: r}}
	in.buf = bufio.NewReaderSize(&in.read, bufferBytes)
	return in
}

// line returns the next line without its end. It is valid until the next call.
// The last line needs no end. After it the error is io.EOF.
func (in *input) line() ([]byte, error) {
	b, err := in.buf.ReadSlice('\n')
	in.offset += int64(len(b))
	if len(b) > 0 {
		in.lines++
	}
	if len(b) > maxLine || errors.Is(err, bufio.ErrBufferFull) {
		return nil, formatError(fmt.Sprintf("line %d", in.lines), fmt.Sprintf("the line has more than %d bytes", maxLine), "check that it is a PLY file")
	}
	if err != nil && (len(b) == 0 || !errors.Is(err, io.EOF)) {
		return nil, in.wrap(err)
	}
	return bytes.TrimRight(b, "\r\n"), nil
}

// peek returns the next n bytes, which must fit the buffer, without taking
// them. The error is io.EOF if there are fewer.
func (in *input) peek(n int) ([]byte, error) {
	b, err := in.buf.Peek(n)
	if err != nil {
		return nil, in.wrap(err)
	}
	return b, nil
}

// skip takes n bytes. The error is io.EOF if there are fewer.
func (in *input) skip(n int64) error {
	for n > 0 {
		got, err := in.buf.Discard(int(min(n, 1<<30)))
		in.offset += int64(got)
		n -= int64(got)
		if err != nil {
			return in.wrap(err)
		}
	}
	return nil
}

// wrap adds the place to the file's own errors.
func (in *input) wrap(err error) error {
	if errors.Is(err, io.EOF) {
		return io.EOF
	}
	return fmt.Errorf("ply: byte %d: %w", in.offset+int64(in.buf.Buffered()), err)
}
