package las

import (
	"errors"
	"fmt"
	"io"
	"sync/atomic"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// Options choose how a file is read. The zero value refuses damaged files.
type Options struct {
	// Tolerant reads what there is of a file that ends before its last point,
	// and counts the missing points as a defect. The default is an error.
	Tolerant bool
}

// readBytes is the size of one read from the file: large enough to drown the
// cost of a system call, small enough for a core's second level cache.
const readBytes = 256 << 10

// reasonMissing is the one defect that a Reader passes over.
const reasonMissing = "point is missing, the file ends before it"

// A Reader reads the points of a LAS file, or of a section of it. It
// implements terrain.Reader.
//
// Coordinates are integer × scale + offset (section 2.6), rounded twice, so
// that they are the same on every machine.
type Reader struct {
	r      io.ReaderAt
	raw    *rawHeader
	header *terrain.Header
	opts   Options

	first, end int64 // points of this section
	next       int64 // next point to deliver
	held       int64 // complete point records in the file

	buf      []byte // records read ahead
	lo, hi   int    // the part of buf not yet delivered
	missing  int64
	consumed atomic.Int64
}

var _ terrain.Reader = (*Reader)(nil)

// NewReader reads the header and the CRS of a LAS file of size bytes. It does
// not read points and does not close r.
//
// The error is a *terrain.FormatError, a *terrain.UnsupportedError (compressed
// files, unknown versions or point formats), or r's own. A point count that
// the file cannot hold is no error until the missing points are read.
func NewReader(r io.ReaderAt, size int64, opts Options) (*Reader, error) {
	raw, err := readHeader(r, size)
	if err != nil {
		return nil, err
	}
	var recs records
	if err := recs.readVLRs(r, size, raw); err != nil {
		return nil, err
	}
	pointsEnd, err := recs.readEVLRs(r, size, raw)
	if err != nil {
		return nil, err
	}
	if recs.laz {
		return nil, &terrain.UnsupportedError{Format: formatName, Feature: lazFeature, Remedy: lazRemedy}
	}
	t := &Reader{r: r, raw: raw, header: raw.header(size), opts: opts}
	recs.crs(raw, t.header, gdal.FromGeoTIFFKeys)
	t.header.Notes = append(t.header.Notes, recs.notes...)
	t.held = max(0, pointsEnd-int64(raw.dataOffset)) / int64(raw.recordLength)
	t.end = t.header.Points
	if t.held > t.end && pointsEnd == size && raw.waveformStart == 0 {
		t.header.Notes = append(t.header.Notes, fmt.Sprintf("the header promises %d points, the file has room for %d", t.end, t.held))
	}
	t.consumed.Store(min(int64(raw.dataOffset), size))
	return t, nil
}

// Section returns an independent Reader of n points of the file from point
// first on (counted from 0, whatever section t is). Sections read the same
// io.ReaderAt, so that several goroutines can decode one file. Their Consumed
// and Defects are their own; those of sections that cover the file add up to
// the whole's, but for the bytes before the first point.
func (t *Reader) Section(first, n int64) (*Reader, error) {
	if first < 0 || n < 0 || first > t.header.Points || n > t.header.Points-first {
		return nil, fmt.Errorf("las: no section of %d points from point %d on: the file has %d", n, first, t.header.Points)
	}
	return &Reader{r: t.r, raw: t.raw, header: t.header, opts: t.opts, first: first, end: first + n, next: first, held: t.held}, nil
}

// Header is what the file says of itself. Sections share it.
func (t *Reader) Header() *terrain.Header { return t.header }

// Consumed is the number of bytes read so far. It may be called from another
// goroutine.
func (t *Reader) Consumed() int64 { return t.consumed.Load() }

// Defects lists the missing points, if a tolerant Reader has passed them over.
func (t *Reader) Defects() []terrain.Defect {
	if t.missing == 0 {
		return nil
	}
	return []terrain.Defect{{Reason: reasonMissing, Count: t.missing, First: t.place(max(t.first, t.held))}}
}

// Close does nothing: the caller owns the io.ReaderAt.
func (t *Reader) Close() error { return nil }

// place names a point. Points that the file has no room for are all at its
// end.
func (t *Reader) place(point int64) string {
	at := int64(t.raw.dataOffset) + min(point, t.held)*int64(t.raw.recordLength)
	return fmt.Sprintf("point %d at byte %d", point, at)
}

// Read fills b with the next points. See terrain.Reader. After an error the
// Reader stays where it was.
func (t *Reader) Read(b *terrain.Batch) error {
	b.Resize(0)
	length := int(t.raw.recordLength)
	for n := 0; n < b.Cap(); {
		if t.lo == t.hi {
			if t.next >= min(t.end, t.held) {
				break
			}
			if err := t.fill(); err != nil {
				if n > 0 {
					return nil // the next Read comes back here
				}
				return err
			}
		}
		m := min(b.Cap()-n, (t.hi-t.lo)/length)
		b.Resize(n + m)
		t.raw.decode(b, n, t.buf[t.lo:t.lo+m*length])
		t.lo += m * length
		t.next += int64(m)
		n += m
	}
	if b.Len() > 0 || b.Cap() == 0 {
		return nil
	}
	return t.finish()
}

// fill reads the next records of the section into the buffer.
func (t *Reader) fill() error {
	length := int64(t.raw.recordLength)
	todo := min(t.end, t.held) - t.next
	if t.buf == nil {
		t.buf = make([]byte, min(todo, max(1, readBytes/length))*length)
	}
	n := min(todo*length, int64(len(t.buf)))
	got, err := t.r.ReadAt(t.buf[:n], int64(t.raw.dataOffset)+t.next*length)
	if int64(got) < n {
		whole := int64(got) / length * length
		switch {
		case whole > 0:
			n = whole
		case err == nil || errors.Is(err, io.EOF):
			// The file is shorter than it was when its size was asked.
			t.held = t.next
			return t.finish()
		default:
			return fmt.Errorf("las: %s: %w", t.place(t.next), err)
		}
	}
	t.consumed.Add(n)
	t.lo, t.hi = 0, int(n)
	return nil
}

// finish ends a section: with io.EOF, or an error if points are missing.
func (t *Reader) finish() error {
	if t.next >= t.end {
		return io.EOF
	}
	if !t.opts.Tolerant {
		return &terrain.FormatError{Format: formatName, Place: t.place(t.next), Reason: fmt.Sprintf(
			"the file ends before this point, the header promises %d", t.header.Points), Remedy: remedyTolerant, Err: io.ErrUnexpectedEOF}
	}
	t.missing = t.end - t.next
	return io.EOF
}
