package ply

import (
	"errors"
	"fmt"
	"io"
	"math"
	"slices"

	"ledgework/terrain"
)

// Options choose how a file is read. The zero value refuses damaged files.
type Options struct {
	// Tolerant passes over lines that are no vertices, and ends quietly where
	// the file ends before its last vertex; both are counted as defects. The
	// default is an error.
	Tolerant bool
}

// The defects that a Reader passes over.
const (
	reasonMissing = "vertex is missing, the file ends before it"
	reasonLine    = "line is no vertex"
)

const remedyTolerant = "get the file again, or allow damaged files"

// A Reader reads the vertices of a PLY file. It implements terrain.Reader.
//
// Colours of 8 bits are spread to 16 by 257. Intensities and classes are
// rounded to whole numbers and limited to what their columns hold. There are
// no returns and no flags.
type Reader struct {
	in     *input
	file   *fileHeader
	header *terrain.Header
	opts   Options

	vertex  *element
	before  []element    // the elements before it
	at      [targets]int // the properties that are read, -1 for none
	target  []int        // the target of each property, -1 for none
	offset  [targets]int // bytes before each target in a record without lists
	scale   float64      // of colours
	next    int64        // next vertex
	started bool         // the elements before the vertices are passed
	err     error        // what every further Read returns

	row     [targets]float64 // one vertex
	scratch []float64        // one column of some vertices
	missing terrain.Defect
	lines   terrain.Defect
}

var _ terrain.Reader = (*Reader)(nil)

// NewReader reads the header of a PLY file. The size in bytes is for progress
// only. It does not close r.
//
// The error is a *terrain.FormatError, a *terrain.UnsupportedError, or r's own.
// A vertex count that the file cannot hold is no error until the missing
// vertices are read.
func NewReader(r io.Reader, size int64, opts Options) (*Reader, error) {
	t := &Reader{in: newInput(r), opts: opts, missing: terrain.Defect{Reason: reasonMissing}, lines: terrain.Defect{Reason: reasonLine}}
	var err error
	if t.file, err = readHeader(t.in); err != nil {
		return nil, err
	}
	vertex, at, err := t.file.layout()
	if err != nil {
		return nil, err
	}
	t.vertex, t.before, t.at = &t.file.elements[vertex], t.file.elements[:vertex], at
	t.header = t.file.header(vertex, at, size)
	t.target = make([]int, len(t.vertex.properties))
	offset := 0
	for i, p := range t.vertex.properties {
		t.target[i] = slices.Index(at[:], i)
		if k := t.target[i]; k >= 0 {
			t.offset[k] = offset
		}
		offset += p.typ.size()
	}
	if i := at[toRed]; i >= 0 {
		t.scale = colorScale(t.vertex.properties[i].typ)
	}
	return t, nil
}

// Header is what the file says of itself.
func (t *Reader) Header() *terrain.Header { return t.header }

// Consumed is the number of bytes read so far. It may be called from another
// goroutine.
func (t *Reader) Consumed() int64 { return t.in.read.n.Load() }

// Defects lists what a tolerant Reader has passed over so far.
func (t *Reader) Defects() []terrain.Defect {
	var d []terrain.Defect
	for _, v := range [2]terrain.Defect{t.lines, t.missing} {
		if v.Count > 0 {
			d = append(d, v)
		}
	}
	return d
}

// Close does nothing: the caller owns the io.Reader.
func (t *Reader) Close() error { return nil }

// Read fills b with the next vertices. See terrain.Reader. Vertices before an
// error are delivered before it.
func (t *Reader) Read(b *terrain.Batch) error {
	b.Resize(0)
	if b.Cap() == 0 {
		return nil
	}
	if t.err == nil && !t.started {
		t.started = true
		t.err = t.skipElements()
	}
	for t.err == nil && b.Len() < b.Cap() {
		if t.next == t.vertex.count {
			t.err = io.EOF
			break
		}
		t.err = t.some(b)
	}
	if b.Len() > 0 {
		return nil
	}
	return t.err
}

// some appends at least one vertex to b, or returns an error, or has passed
// over a bad line.
func (t *Reader) some(b *terrain.Batch) error {
	if t.file.encoding == ascii {
		return t.readLine(b)
	}
	if size, ok := t.vertex.size(); ok {
		return t.readFixed(b, size)
	}
	return t.readLists(b)
}

// end makes an error of the end of the file, or io.EOF where that is allowed.
func (t *Reader) end(place string) error {
	if !t.opts.Tolerant {
		return &terrain.FormatError{Format: formatName, Place: place, Reason: fmt.Sprintf(
			"the file ends before vertex %d, the header promises %d", t.next, t.vertex.count), Remedy: remedyTolerant, Err: io.ErrUnexpectedEOF}
	}
	t.missing.Count = t.vertex.count - t.next
	t.missing.First = place
	return io.EOF
}

// place names the next vertex of a binary file, given where it starts.
func (t *Reader) place(at int64) string { return fmt.Sprintf("vertex %d at byte %d", t.next, at) }

// skipElements passes over the elements that come before the vertices.
func (t *Reader) skipElements() error {
	for i := range t.before {
		e := &t.before[i]
		err := t.skipElement(e)
		switch {
		case errors.Is(err, io.EOF) && t.file.encoding == ascii:
			return t.end(fmt.Sprintf("line %d", t.in.lines))
		case errors.Is(err, io.EOF):
			return t.end(fmt.Sprintf("element %s at byte %d", e.name, t.in.offset))
		case err != nil:
			return err
		}
	}
	return nil
}

func (t *Reader) skipElement(e *element) error {
	if len(e.properties) == 0 {
		return nil
	}
	if t.file.encoding == ascii {
		for range e.count {
			if _, err := t.fullLine(); err != nil {
				return err
			}
		}
		return nil
	}
	if size, ok := e.size(); ok {
		return t.in.skip(e.count * int64(size))
	}
	for range e.count {
		for _, p := range e.properties {
			if err := t.skipProperty(p); err != nil {
				return err
			}
		}
	}
	return nil
}

// skipProperty passes over one property of a binary record.
func (t *Reader) skipProperty(p property) error {
	if p.count == 0 {
		return t.in.skip(int64(p.typ.size()))
	}
	b, err := t.in.peek(p.count.size())
	if err != nil {
		return err
	}
	n := p.count.value(b, t.file.encoding)
	if n < 0 {
		return formatError(fmt.Sprintf("byte %d", t.in.offset), fmt.Sprintf("a list has the length %g", n), "get the file again from its source")
	}
	return t.in.skip(int64(len(b)) + int64(n)*int64(p.typ.size()))
}

// fullLine returns the next line that is not blank.
func (t *Reader) fullLine() ([]byte, error) {
	for {
		line, err := t.in.line()
		if err != nil {
			return nil, err
		}
		if len(line) > 0 && len(trimBlanks(line)) > 0 {
			return line, nil
		}
	}
}

// readFixed decodes as many vertices as the buffer and b allow, one column
// after the other.
func (t *Reader) readFixed(b *terrain.Batch, size int) error {
	src, err := t.in.peek(size)
	if errors.Is(err, io.EOF) {
		return t.end(t.place(t.in.offset))
	}
	if err != nil {
		return err
	}
	const scratchPoints = 1024
	n := b.Len()
	m := min(b.Cap()-n, t.in.buf.Buffered()/size, scratchPoints, int(min(t.vertex.count-t.next, scratchPoints)))
	if src, err = t.in.peek(m * size); err != nil {
		return err
	}
	if t.scratch == nil {
		t.scratch = make([]float64, scratchPoints)
	}
	b.Resize(n + m)
	column := func(target int, dst []float64) {
		t.vertex.properties[t.at[target]].typ.column(dst, src[t.offset[target]:], size, t.file.encoding)
	}
	column(toX, b.X[n:])
	column(toY, b.Y[n:])
	column(toZ, b.Z[n:])
	v := t.scratch[:m]
	words := func(target int, dst []uint16, scale float64) {
		if t.at[target] < 0 {
			clear(dst)
			return
		}
		column(target, v)
		for i := range dst {
			dst[i] = to16(v[i] * scale)
		}
	}
	if len(b.Red) > 0 {
		words(toRed, b.Red[n:], t.scale)
		words(toGreen, b.Green[n:], t.scale)
		words(toBlue, b.Blue[n:], t.scale)
	}
	if len(b.Intensity) > 0 {
		words(toIntensity, b.Intensity[n:], 1)
	}
	if len(b.Class) > 0 {
		clear(b.Class[n:])
		clear(b.Flags[n:])
		if t.at[toClass] >= 0 {
			column(toClass, v)
			for i := range v {
				b.Class[n+i] = to8(v[i])
			}
		}
	}
	if len(b.Return) > 0 {
		clear(b.Return[n:])
		clear(b.Returns[n:])
	}
	t.next += int64(m)
	return t.in.skip(int64(m * size))
}

// readLists decodes one vertex that has lists among its properties.
func (t *Reader) readLists(b *terrain.Batch) error {
	start := t.in.offset
	for i, p := range t.vertex.properties {
		if p.count == 0 && t.target[i] >= 0 {
			src, err := t.in.peek(p.typ.size())
			if errors.Is(err, io.EOF) {
				return t.end(t.place(start))
			}
			if err != nil {
				return err
			}
			t.row[t.target[i]] = p.typ.value(src, t.file.encoding)
		}
		if err := t.skipProperty(p); errors.Is(err, io.EOF) {
			return t.end(t.place(start))
		} else if err != nil {
			return err
		}
	}
	t.store(b)
	return nil
}

// readLine decodes one line of an ascii file.
func (t *Reader) readLine(b *terrain.Batch) error {
	line, err := t.fullLine()
	if errors.Is(err, io.EOF) {
		return t.end(fmt.Sprintf("line %d", t.in.lines))
	}
	if err != nil {
		return err
	}
	if reason := t.parse(line); reason != "" {
		place := fmt.Sprintf("line %d", t.in.lines)
		if !t.opts.Tolerant {
			return formatError(place, reason, "correct the line, or allow damaged files")
		}
		if t.lines.Count == 0 {
			t.lines.First = place
		}
		t.lines.Count++
		t.next++
		return nil
	}
	t.store(b)
	return nil
}

// store appends the vertex in t.row to b.
func (t *Reader) store(b *terrain.Batch) {
	i := b.Len()
	b.Resize(i + 1)
	b.X[i], b.Y[i], b.Z[i] = t.row[toX], t.row[toY], t.row[toZ]
	if len(b.Red) > 0 {
		b.Red[i], b.Green[i], b.Blue[i] = to16(t.row[toRed]*t.scale), to16(t.row[toGreen]*t.scale), to16(t.row[toBlue]*t.scale)
	}
	if len(b.Intensity) > 0 {
		b.Intensity[i] = to16(t.row[toIntensity])
	}
	if len(b.Class) > 0 {
		b.Class[i], b.Flags[i] = to8(t.row[toClass]), 0
	}
	if len(b.Return) > 0 {
		b.Return[i], b.Returns[i] = 0, 0
	}
	t.next++
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
