package las

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"time"

	"ledgework/terrain"
)

// systemOther is the system identifier of points that no instrument measured
// and no other file was the source of (section 2.4, table 5).
const systemOther = "OTHER"

// WriterOptions say what to write. A Writer needs PointFormat and Scale to be
// set on purpose, the rest may stay zero.
type WriterOptions struct {
	// PointFormat is 0 or 1, written as LAS 1.2, or 6 or 7, written as LAS
	// 1.4. Formats 1, 6 and 7 have a GPS time, which is written as 0; format 7
	// has colours. The default is 0.
	PointFormat uint8

	// Scale is the step of stored coordinates. It must be positive; a step of
	// 0 is taken as 0.001.
	Scale [3]float64

	// Offset is added to stored coordinates. Points must lie within 2^31
	// steps of it. The default is the origin.
	Offset [3]float64

	// WKT is the CRS. The default is none.
	WKT string

	// Producer names the generating software, at most 32 ASCII characters.
	Producer string

	// Date is the creation date. The zero date is written as none, so that
	// the same points always give the same file.
	Date time.Time
}

const defaultScale = 0.001

// A Writer writes points to a LAS file.
type Writer struct {
	w      io.WriteSeeker
	opts   WriterOptions
	minor  uint8
	length int
	count  uint64
	byRet  [15]uint64
	extent terrain.Extent // of the points as stored
	buf    []byte
	err    error // the first error; nothing is written after it
}

// NewWriter writes a header without points, and the CRS, at the beginning of
// w. Close completes the header.
func NewWriter(w io.WriteSeeker, opts WriterOptions) (*Writer, error) {
	t := &Writer{w: w, opts: opts, extent: terrain.EmptyExtent()}
	switch opts.PointFormat {
	case 0, 1:
		t.minor = 2
	case 6, 7:
		t.minor = 4
	default:
		return nil, fmt.Errorf("las: cannot write point format %d, only 0, 1, 6 and 7", opts.PointFormat)
	}
	t.length = int(recordLengths()[opts.PointFormat])
	for i := range 3 {
		if t.opts.Scale[i] == 0 {
			t.opts.Scale[i] = defaultScale
		}
		if s := t.opts.Scale[i]; !(s > 0) || !finite(s) || !finite(opts.Offset[i]) {
			return nil, fmt.Errorf("las: cannot write with scale %g and offset %g", s, opts.Offset[i])
		}
	}
	if n := len(opts.WKT); n >= math.MaxUint16 {
		return nil, fmt.Errorf("las: the WKT of %d bytes does not fit a variable length record", n)
	}
	if len(opts.Producer) > 32 {
		return nil, fmt.Errorf("las: producer %q has more than 32 characters", opts.Producer)
	}
	if y := opts.Date.Year(); !opts.Date.IsZero() && (y < earliestYear || y > latestYear) {
		return nil, fmt.Errorf("las: cannot write the year %d", y)
	}
	if _, err := w.Write(t.preamble()); err != nil {
		return nil, fmt.Errorf("las: header: %w", err)
	}
	return t, nil
}

// Write appends the points of b. Columns that b lacks are written as zeros. A
// point that the format cannot hold is an error and ends the file before it.
func (t *Writer) Write(b *terrain.Batch) error {
	if t.err != nil {
		return t.err
	}
	t.buf = t.buf[:0]
	done := t.count
	for i := range b.Len() {
		if err := t.append(b, i); err != nil {
			t.err = fmt.Errorf("las: point %d: %w", t.count, err)
			break
		}
	}
	if t.count > done {
		if _, err := t.w.Write(t.buf); err != nil {
			t.err = fmt.Errorf("las: points %d to %d: %w", done, t.count-1, err)
		}
	}
	return t.err
}

// append encodes point i of b at the end of the buffer and counts it.
func (t *Writer) append(b *terrain.Batch, i int) error {
	if t.minor < 4 && t.count == math.MaxUint32 {
		return errors.New("LAS 1.2 holds no more points")
	}
	start := len(t.buf)
	var p [3]float64
	for k, v := range [3]float64{b.X[i], b.Y[i], b.Z[i]} {
		q := math.RoundToEven((v - t.opts.Offset[k]) / t.opts.Scale[k])
		if !(q >= math.MinInt32 && q <= math.MaxInt32) { // false for NaN too
			t.buf = t.buf[:start]
			return fmt.Errorf("coordinate %g is not within 2^31 steps of %g from %g", v, t.opts.Scale[k], t.opts.Offset[k])
		}
		p[k] = float64(q*t.opts.Scale[k]) + t.opts.Offset[k]
		t.buf = binary.LittleEndian.AppendUint32(t.buf, uint32(int32(q)))
	}
	var number, returns, class uint8
	var flags terrain.Flags
	var intensity uint16
	if len(b.Intensity) > 0 {
		intensity = b.Intensity[i]
	}
	if len(b.Return) > 0 {
		number, returns = b.Return[i], b.Returns[i]
	}
	if len(b.Class) > 0 {
		class, flags = b.Class[i], b.Flags[i]
	}
	t.buf = binary.LittleEndian.AppendUint16(t.buf, intensity)
	bits := 4
	if t.minor < 4 {
		bits = 3
	}
	if number >= 1<<bits || returns >= 1<<bits {
		t.buf = t.buf[:start]
		return fmt.Errorf("return %d of %d does not fit point format %d", number, returns, t.opts.PointFormat)
	}
	t.buf = append(t.buf, number|returns<<bits)
	if t.minor < 4 {
		if class > legacyClasses {
			t.buf = t.buf[:start]
			return fmt.Errorf("class %d does not fit point format %d", class, t.opts.PointFormat)
		}
		// Scan angle, user data and point source stay zero.
		t.buf = append(t.buf, class|uint8(flags&7)<<5, 0, 0, 0, 0)
		if t.opts.PointFormat == 1 {
			t.buf = append(t.buf, 0, 0, 0, 0, 0, 0, 0, 0)
		}
	} else {
		// User data, scan angle, point source and GPS time stay zero.
		t.buf = append(t.buf, uint8(flags)&0x0f, class, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0)
		if t.opts.PointFormat == 7 {
			var red, green, blue uint16
			if len(b.Red) > 0 {
				red, green, blue = b.Red[i], b.Green[i], b.Blue[i]
			}
			t.buf = binary.LittleEndian.AppendUint16(t.buf, red)
			t.buf = binary.LittleEndian.AppendUint16(t.buf, green)
			t.buf = binary.LittleEndian.AppendUint16(t.buf, blue)
		}
	}
	if number > 0 {
		t.byRet[number-1]++
	}
	t.extent.Add(p[0], p[1], p[2])
	t.count++
	return nil
}

// Close completes the header with counts and extent. It does not close the
// underlying writer and leaves it after the last point.
func (t *Writer) Close() error {
	if t.err != nil {
		return t.err
	}
	t.err = errors.New("las: the writer is closed")
	if _, err := t.w.Seek(0, io.SeekStart); err != nil {
		return fmt.Errorf("las: header: %w", err)
	}
	if _, err := t.w.Write(t.preamble()); err != nil {
		return fmt.Errorf("las: header: %w", err)
	}
	if _, err := t.w.Seek(0, io.SeekEnd); err != nil {
		return fmt.Errorf("las: header: %w", err)
	}
	return nil
}

// preamble encodes all that comes before the points.
func (t *Writer) preamble() []byte {
	size := headerSize12
	if t.minor >= 4 {
		size = headerSize14
	}
	vlrs, offset := uint32(0), size
	if t.opts.WKT != "" {
		vlrs, offset = 1, size+vlrHeader+len(t.opts.WKT)+1
	}
	b := make([]byte, 0, offset)
	u16 := func(v uint16) { b = binary.LittleEndian.AppendUint16(b, v) }
	u32 := func(v uint32) { b = binary.LittleEndian.AppendUint32(b, v) }
	u64 := func(v uint64) { b = binary.LittleEndian.AppendUint64(b, v) }
	f64 := func(v float64) { u64(math.Float64bits(v)) }
	text := func(s string, n int) { b = append(append(b, s...), make([]byte, n-len(s))...) }

	text("LASF", 4)
	u16(0)
	if t.minor >= 4 {
		u16(wktBit) // section 2.4: always set for formats 6 and above
	} else {
		u16(0)
	}
	text("", 16)
	b = append(b, 1, t.minor)
	text(systemOther, 32)
	text(t.opts.Producer, 32)
	if d := t.opts.Date; d.IsZero() {
		u32(0)
	} else {
		u16(uint16(d.YearDay()))
		u16(uint16(d.Year()))
	}
	u16(uint16(size))
	u32(uint32(offset))
	u32(vlrs)
	b = append(b, t.opts.PointFormat)
	u16(uint16(t.length))
	// Formats 6 and above leave the legacy counts zero (section 2.4).
	legacy := t.minor < 4
	for _, n := range append([]uint64{t.count}, t.byRet[:5]...) {
		if legacy {
			u32(uint32(n))
		} else {
			u32(0)
		}
	}
	for _, v := range t.opts.Scale {
		f64(v)
	}
	for _, v := range t.opts.Offset {
		f64(v)
	}
	e := t.extent
	if e.Empty() {
		e = terrain.Extent{}
	}
	for i := range 3 {
		f64(e.Max[i])
		f64(e.Min[i])
	}
	if t.minor >= 4 {
		u64(0) // waveform data
		u64(0) // extended records
		u32(0)
		u64(t.count)
		for _, n := range t.byRet {
			u64(n)
		}
	}
	if t.opts.WKT != "" {
		u16(0)
		text(projectionUser, 16)
		u16(recordWKT)
		u16(uint16(len(t.opts.WKT) + 1))
		text("CRS as OGC WKT", 32)
		text(t.opts.WKT, len(t.opts.WKT)+1)
	}
	return b
}
