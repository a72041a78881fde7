package xyz

import (
	"errors"
	"fmt"
	"io"
	"math"

	"ledgework/terrain"
	"ledgework/terrain/internal/decimal"
)

// Options choose how a file is read. The zero value refuses damaged files.
type Options struct {
	// Tolerant passes over lines that are no points, and a file that ends
	// before the promised number of points; both are counted as defects. The
	// default is an error.
	Tolerant bool
}

// The defects that a Reader passes over.
const (
	reasonLine    = "line is no point"
	reasonMissing = "point is missing, the file ends before it"
	reasonExtra   = "point is beyond the promised number"
)

// A Reader reads points from text. It implements terrain.Reader.
type Reader struct {
	in     *input
	layout *layout
	header *terrain.Header
	opts   Options

	last    int   // the last column of x, y and z
	target  []int // the target of each column up to the last that is read
	promise int64 // points promised by all blocks so far, -1 if unknown
	points  int64 // points delivered
	err     error // what every further Read returns
	row     [targets]float64
	defects [3]terrain.Defect
}

const (
	badLine = iota
	missing
	extra
)

var _ terrain.Reader = (*Reader)(nil)

// NewReader decides on the layout of a text file from its beginning. The size
// in bytes is for progress only. It does not close r.
//
// The error is a *terrain.FormatError, a *terrain.UnsupportedError (PTX, text
// in UTF-16), or r's own.
func NewReader(r io.Reader, size int64, opts Options) (*Reader, error) {
	in := newInput(r)
	head, whole, err := in.head()
	if err != nil {
		return nil, err
	}
	l, err := findLayout(head, whole)
	if err != nil {
		return nil, err
	}
	in.end = l.end
	t := &Reader{in: in, layout: l, header: l.header(size), opts: opts, promise: l.promise,
		defects: [3]terrain.Defect{{Reason: reasonLine}, {Reason: reasonMissing}, {Reason: reasonExtra}}}
	t.last = max(l.at[toX], l.at[toY], l.at[toZ])
	for k, i := range l.at {
		for len(t.target) <= i {
			t.target = append(t.target, -1)
		}
		if i >= 0 {
			t.target[i] = k
		}
	}
	for in.lines < l.skip {
		if _, err := in.line(); err != nil {
			return nil, err
		}
	}
	return t, nil
}

// Header is what the file says of itself.
func (t *Reader) Header() *terrain.Header { return t.header }

// Consumed is the number of bytes read so far. It may be called from another
// goroutine.
func (t *Reader) Consumed() int64 { return t.in.read.n.Load() }

// Defects lists what has been passed over so far. Points beyond the promised
// number are read, by a Reader that is not tolerant too.
func (t *Reader) Defects() []terrain.Defect {
	var d []terrain.Defect
	for _, v := range t.defects {
		if v.Count > 0 {
			d = append(d, v)
		}
	}
	return d
}

// Close does nothing: the caller owns the io.Reader.
func (t *Reader) Close() error { return nil }

func (t *Reader) defect(kind int, n int64) {
	d := &t.defects[kind]
	if d.Count == 0 {
		d.First = fmt.Sprintf("line %d", t.in.lines)
	}
	d.Count += n
}

// Read fills b with the next points. See terrain.Reader. Points before an
// error are delivered before it.
func (t *Reader) Read(b *terrain.Batch) error {
	b.Resize(0)
	if b.Cap() == 0 {
		return nil
	}
	for t.err == nil && b.Len() < b.Cap() {
		t.err = t.next(b)
	}
	if b.Len() > 0 {
		return nil
	}
	return t.err
}

// next appends the point of the next line, if it has one, to b.
func (t *Reader) next(b *terrain.Batch) error {
	line, err := t.in.line()
	if errors.Is(err, io.EOF) {
		return t.finish()
	}
	if err != nil {
		return err
	}
	if t.in.lines == 1 && len(line) >= 3 && string(line[:3]) == "\xef\xbb\xbf" {
		line = trim(line[3:])
	}
	if isComment(line) {
		return nil
	}
	if cell, reason := t.parse(line); reason != "" {
		return t.bad(line, cell, reason)
	}
	t.store(b)
	if t.points++; t.promise >= 0 && t.points > t.promise {
		t.defect(extra, 1)
	}
	return nil
}

// finish ends the file: with io.EOF, or an error if points are missing.
func (t *Reader) finish() error {
	lost := t.promise - t.points - t.defects[badLine].Count
	if lost <= 0 {
		return io.EOF
	}
	if !t.opts.Tolerant {
		return &terrain.FormatError{Format: "xyz", Place: fmt.Sprintf("line %d", t.in.lines), Reason: fmt.Sprintf(
			"the file ends after %d points, its first line promises %d", t.points, t.promise),
			Remedy: "get the file again, or allow damaged files", Err: io.ErrUnexpectedEOF}
	}
	t.defect(missing, lost)
	return io.EOF
}

// bad deals with a line that is no point. In a PTS file it may be the number
// of points of one more block.
func (t *Reader) bad(line, cell []byte, reason string) error {
	if n, ok := count(line); ok && t.promise >= 0 && t.points+t.defects[badLine].Count >= t.promise && n <= math.MaxInt64-t.promise {
		t.promise += n
		return nil
	}
	if !t.opts.Tolerant {
		return formatError(t.in.lines, reason, remedyFor(cell))
	}
	t.defect(badLine, 1)
	return nil
}

// parse reads a line into t.row. It returns what is wrong with it, or "", and
// the cell where.
func (t *Reader) parse(line []byte) (cell []byte, reason string) {
	rest := line
	for i, target := range t.target {
		var ok bool
		// Missing cells at the end of a table's line are empty ones.
		if cell, rest, ok = nextCell(rest, t.layout.sep); !ok && (t.layout.sep == blanks || i <= t.last) {
			return nil, fmt.Sprintf("the line has %d columns, the points need %d", i, len(t.target))
		}
		if target < 0 {
			continue
		}
		if len(cell) == 0 && target > toZ {
			t.row[target] = 0 // an empty cell of a table
			continue
		}
		if t.row[target], ok = decimal.Parse(cell); !ok {
			return cell, fmt.Sprintf("%.40q is no number", cell)
		}
	}
	return nil, ""
}

// store appends the point in t.row to b.
func (t *Reader) store(b *terrain.Batch) {
	i := b.Len()
	b.Resize(i + 1)
	b.X[i], b.Y[i], b.Z[i] = t.row[toX], t.row[toY], t.row[toZ]
	if len(b.Intensity) > 0 {
		b.Intensity[i] = 0
		if t.layout.at[toIntensity] >= 0 {
			b.Intensity[i] = to16(t.row[toIntensity]*t.layout.gain + t.layout.shift)
		}
	}
	if len(b.Red) > 0 {
		s := t.layout.scale
		b.Red[i], b.Green[i], b.Blue[i] = to16(t.row[toRed]*s), to16(t.row[toGreen]*s), to16(t.row[toBlue]*s)
	}
	if len(b.Class) > 0 {
		b.Class[i], b.Flags[i] = to8(t.row[toClass]), 0
	}
	if len(b.Return) > 0 {
		b.Return[i], b.Returns[i] = 0, 0
	}
}

// to16 rounds to the nearest whole number from 0 to 65535; NaN becomes 0.
func to16(v float64) uint16 {
	if !(v > 0) {
		return 0
	}
	return uint16(min(v+0.5, math.MaxUint16))
}

// to8 rounds to the nearest whole number from 0 to 255. What is outside of it
// is no class: 0, which means never classified.
func to8(v float64) uint8 {
	if !(v > 0 && v < math.MaxUint8+0.5) {
		return 0
	}
	return uint8(v + 0.5)
}
