package las

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"time"

	"ledgework/terrain"
)

// Sizes of the public header block by version (section 2.4, table 3; the
// older ones from the specifications 1.2 and 1.3).
const (
	headerSize12 = 227
	headerSize13 = 235
	headerSize14 = 375
)

const (
	maxFormat      = 10
	compressedBit  = 0x80   // set by LASzip in the point format of compressed files
	wktBit         = 1 << 4 // of the global encoding: the CRS is WKT (table 4)
	earliestYear   = 1900   // creation years before are typing errors
	latestYear     = 9999   // the last that YYYY-MM-DD can hold
	latestMinor    = 5
	formatName     = "las"
	lazFeature     = "compressed LAS (LAZ)"
	lazRemedy      = "decompress it to LAS first; reading LAZ is not there yet"
	remedyDamaged  = "get the file again from its source"
	remedyTolerant = "get the file again, or allow damaged files"
)

// Looks reports whether a file that begins with head can be LAS: it starts
// with the file signature "LASF" (section 2.4). Compressed files do so too.
func Looks(head []byte) bool { return bytes.HasPrefix(head, []byte("LASF")) }

// rawHeader holds the public header block (section 2.4), as far as used.
type rawHeader struct {
	encoding       uint16
	minor          uint8
	system         string
	software       string
	day, year      uint16
	size           uint16
	dataOffset     uint32
	vlrs           uint32
	format         uint8
	recordLength   uint16
	legacyPoints   uint32
	scale, offset  [3]float64
	extent         terrain.Extent
	waveformStart  uint64
	evlrStart      uint64
	evlrs          uint32
	points         uint64
	extendedCounts bool
}

// A cursor reads little-endian fields one after the other, so that the order
// of the calls is the order of the specification's tables.
type cursor struct{ b []byte }

func (c *cursor) take(n int) []byte {
	f := c.b[:n]
	c.b = c.b[n:]
	return f
}

func (c *cursor) u8() uint8    { return c.take(1)[0] }
func (c *cursor) u16() uint16  { return binary.LittleEndian.Uint16(c.take(2)) }
func (c *cursor) u32() uint32  { return binary.LittleEndian.Uint32(c.take(4)) }
func (c *cursor) u64() uint64  { return binary.LittleEndian.Uint64(c.take(8)) }
func (c *cursor) f64() float64 { return math.Float64frombits(c.u64()) }

// text reads a fixed field that is filled up with zero bytes. Bytes that are
// not printable ASCII become blanks: some writers leave garbage after the end.
func (c *cursor) text(n int) string {
	f := c.take(n)
	if i := bytes.IndexByte(f, 0); i >= 0 {
		f = f[:i]
	}
	clean := bytes.Map(func(r rune) rune {
		if r < ' ' || r > '~' {
			return ' '
		}
		return r
	}, f)
	return strings.TrimSpace(string(clean))
}

// recordLengths lists the bytes of each point format (section 2.6).
func recordLengths() [maxFormat + 1]uint16 {
	return [...]uint16{20, 28, 26, 34, 57, 63, 30, 36, 38, 59, 67}
}

func formatError(place, reason, remedy string) error {
	return &terrain.FormatError{Format: formatName, Place: place, Reason: reason, Remedy: remedy}
}

// readFull reads len(p) bytes at off. A short read is reported as a
// FormatError: the caller has checked off against the size of the file.
func readFull(r io.ReaderAt, p []byte, off int64) error {
	n, err := r.ReadAt(p, off)
	if n == len(p) {
		return nil
	}
	if err == nil || errors.Is(err, io.EOF) {
		return formatError(fmt.Sprintf("byte %d", off+int64(n)), "the file ends earlier than its size says", remedyDamaged)
	}
	return fmt.Errorf("las: byte %d: %w", off+int64(n), err)
}

// readHeader reads and checks the public header block.
func readHeader(r io.ReaderAt, size int64) (*rawHeader, error) {
	if size <= 0 {
		return nil, formatError("byte 0", "the file is empty", remedyDamaged)
	}
	block := make([]byte, min(size, headerSize14))
	if err := readFull(r, block, 0); err != nil {
		return nil, err
	}
	if !Looks(block) {
		return nil, formatError("byte 0", `the file does not start with "LASF"`, "check that it is a LAS file")
	}
	if len(block) < headerSize12 {
		return nil, formatError(fmt.Sprintf("byte %d", size), "the file ends within the header", remedyDamaged)
	}
	h := &rawHeader{}
	c := &cursor{b: block[4:]}
	c.u16() // file source ID
	h.encoding = c.u16()
	c.take(16) // project ID
	major := c.u8()
	h.minor = c.u8()
	if major != 1 || h.minor > latestMinor {
		return nil, &terrain.UnsupportedError{Format: formatName, Feature: fmt.Sprintf("LAS version %d.%d", major, h.minor),
			Remedy: "convert it to LAS 1.4"}
	}
	h.system = c.text(32)
	h.software = c.text(32)
	h.day, h.year = c.u16(), c.u16()
	h.size = c.u16()
	h.dataOffset = c.u32()
	h.vlrs = c.u32()
	h.format = c.u8()
	h.recordLength = c.u16()
	h.legacyPoints = c.u32()
	c.take(5 * 4) // legacy number of points by return
	h.scale = [3]float64{c.f64(), c.f64(), c.f64()}
	h.offset = [3]float64{c.f64(), c.f64(), c.f64()}
	for i := range 3 {
		h.extent.Max[i], h.extent.Min[i] = c.f64(), c.f64()
	}
	if h.size < headerSize12 {
		return nil, formatError("byte 94", fmt.Sprintf("the header is said to have %d bytes, fewer than %d", h.size, headerSize12), remedyDamaged)
	}
	if want := min(int(h.size), headerSize14); len(block) < want {
		return nil, formatError(fmt.Sprintf("byte %d", size), "the file ends within the header", remedyDamaged)
	}
	if h.minor >= 3 && h.size >= headerSize13 {
		h.waveformStart = c.u64()
	}
	if h.minor >= 4 && h.size >= headerSize14 {
		h.evlrStart, h.evlrs = c.u64(), c.u32()
		h.points = c.u64()
		h.extendedCounts = true
	}
	return h, h.check()
}

// check refuses what makes points impossible to find or to place.
func (h *rawHeader) check() error {
	if h.format&compressedBit != 0 {
		return &terrain.UnsupportedError{Format: formatName, Feature: lazFeature, Remedy: lazRemedy}
	}
	if h.format > maxFormat {
		return &terrain.UnsupportedError{Format: formatName, Feature: fmt.Sprintf("point format %d", h.format),
			Remedy: "convert it to a point format from 0 to 10"}
	}
	if need := recordLengths()[h.format]; h.recordLength < need {
		return formatError("byte 105", fmt.Sprintf("point records of %d bytes are too short for point format %d, which needs %d",
			h.recordLength, h.format, need), remedyDamaged)
	}
	if h.dataOffset < uint32(h.size) {
		return formatError("byte 96", fmt.Sprintf("points are said to start at byte %d, within the header of %d bytes",
			h.dataOffset, h.size), remedyDamaged)
	}
	for i, axis := range [3]string{"x", "y", "z"} {
		if s := h.scale[i]; s == 0 || !finite(s) {
			return formatError(fmt.Sprintf("byte %d", 131+8*i), fmt.Sprintf("the %s scale is %g", axis, s),
				"have the header repaired where the file was made")
		}
		if o := h.offset[i]; !finite(o) {
			return formatError(fmt.Sprintf("byte %d", 155+8*i), fmt.Sprintf("the %s offset is %g", axis, o),
				"have the header repaired where the file was made")
		}
	}
	return nil
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// promised is the number of points that the header tells. From version 1.4 on
// it is the 64 bit count; the legacy one is zero or the same (section 2.4,
// "Legacy Number of point records"). Writers that filled in only the legacy
// one are forgiven.
func (h *rawHeader) promised() (points int64, note string) {
	if !h.extendedCounts {
		return int64(h.legacyPoints), ""
	}
	if h.points == 0 && h.legacyPoints != 0 {
		return int64(h.legacyPoints), "the 64 bit point count is zero: the legacy count is used"
	}
	if h.legacyPoints != 0 && uint64(h.legacyPoints) != h.points {
		note = fmt.Sprintf("the legacy point count is %d, the 64 bit one %d: the latter is used", h.legacyPoints, h.points)
	}
	return int64(min(h.points, math.MaxInt64)), note
}

// date turns the creation day of the year into YYYY-MM-DD, or "" where it
// makes no date.
func (h *rawHeader) date() string {
	if h.year < earliestYear || h.year > latestYear || h.day < 1 || h.day > 366 {
		return ""
	}
	t := time.Date(int(h.year), time.January, int(h.day), 0, 0, 0, 0, time.UTC)
	if t.Year() != int(h.year) {
		return "" // day 366 of a common year
	}
	return t.Format(time.DateOnly)
}

// producer joins the generating software and the system identifier. OTHER is
// the specification's word for a system that has no name.
func (h *rawHeader) producer() string {
	switch {
	case h.system == "" || h.system == systemOther:
		return h.software
	case h.software == "":
		return h.system
	}
	return h.software + " (" + h.system + ")"
}

// header builds the model's header, all but the CRS.
func (h *rawHeader) header(size int64) *terrain.Header {
	t := &terrain.Header{
		Format:   fmt.Sprintf("LAS 1.%d, point format %d", h.minor, h.format),
		Bytes:    size,
		Columns:  terrain.Intensity | terrain.Class | terrain.Returns,
		Date:     h.date(),
		Producer: h.producer(),
	}
	if colorOffset(h.format) > 0 {
		t.Columns |= terrain.Color
	}
	var note string
	if t.Points, note = h.promised(); note != "" {
		t.Notes = append(t.Notes, note)
	}
	ok := !h.extent.Empty()
	for i := range 3 {
		t.Step[i] = math.Abs(h.scale[i])
		ok = ok && finite(h.extent.Min[i]) && finite(h.extent.Max[i])
	}
	switch {
	case ok:
		e := h.extent
		t.Extent = &e
	case t.Points > 0:
		t.Notes = append(t.Notes, "the extent in the header is no box: it is left out")
	}
	if h.format >= 6 && h.minor < 4 {
		t.Notes = append(t.Notes, fmt.Sprintf("point format %d needs version 1.4, the file says 1.%d", h.format, h.minor))
	}
	if (h.minor == 3 && h.size < headerSize13) || (h.minor >= 4 && h.size < headerSize14) {
		t.Notes = append(t.Notes, fmt.Sprintf("a header of %d bytes is too short for version 1.%d", h.size, h.minor))
	}
	return t
}
