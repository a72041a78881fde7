package las

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"strings"

	"ledgework/terrain"
)

// Variable length records (section 2.5) and extended ones (section 2.7).
const (
	vlrHeader  = 54
	evlrHeader = 60

	// maxRecords bounds the time spent on a chain of records. The largest
	// honest files have a few hundred.
	maxRecords = 1 << 16

	// maxPayload bounds the memory for one CRS record. A compound CRS with
	// many parameters takes some ten thousand bytes.
	maxPayload = 1 << 20
)

// Identifiers of the records that are used (section 3).
const (
	projectionUser = "LASF_Projection"
	recordWKT      = 2112
	recordKeys     = 34735
	recordDoubles  = 34736
	recordASCII    = 34737
	lazUser        = "laszip encoded"
	recordLaz      = 22204
)

// geoKeys are the contents of the three GeoTIFF records (section 3.1).
type geoKeys struct {
	dir     []uint16
	doubles []float64
	ascii   string
}

// records is what the variable length records tell.
type records struct {
	wkt   string
	keys  geoKeys
	laz   bool
	notes []string
}

func (t *records) note(format string, args ...any) {
	t.notes = append(t.notes, fmt.Sprintf(format, args...))
}

// readVLRs reads the records between the header and the points. A chain that
// runs into the points is cut there: the points can still be read.
func (t *records) readVLRs(r io.ReaderAt, size int64, h *rawHeader) error {
	end := min(int64(h.dataOffset), size)
	at := int64(h.size)
	for i := range h.vlrs {
		if i == maxRecords {
			t.note("the header promises %d variable length records: those after %d are passed over", h.vlrs, i)
			return nil
		}
		var head [vlrHeader]byte
		if at+vlrHeader > end {
			t.note("the header promises %d variable length records, there is room for %d", h.vlrs, i)
			return nil
		}
		if err := readFull(r, head[:], at); err != nil {
			return err
		}
		length := int64(binary.LittleEndian.Uint16(head[20:]))
		if at+vlrHeader+length > end {
			t.note("variable length record %d at byte %d runs into the points: it and those after it are passed over", i, at)
			return nil
		}
		if err := t.take(r, userID(head[2:18]), binary.LittleEndian.Uint16(head[18:]), at+vlrHeader, length); err != nil {
			return err
		}
		at += vlrHeader + length
	}
	return nil
}

// readEVLRs reads the records after the points. It reports where they start,
// which is where points must end, or size if there are none that make sense.
func (t *records) readEVLRs(r io.ReaderAt, size int64, h *rawHeader) (start int64, err error) {
	if h.evlrs == 0 {
		return size, nil
	}
	if h.evlrStart < uint64(h.dataOffset) || h.evlrStart > uint64(size) {
		t.note("extended records are said to start at byte %d, where there can be none", h.evlrStart)
		return size, nil
	}
	start = int64(h.evlrStart)
	at := start
	for i := range h.evlrs {
		var head [evlrHeader]byte
		if i == maxRecords || size-at < evlrHeader {
			t.note("the header promises %d extended records, %d are read", h.evlrs, i)
			if i == 0 {
				return size, nil
			}
			return start, nil
		}
		if err := readFull(r, head[:], at); err != nil {
			return 0, err
		}
		length := binary.LittleEndian.Uint64(head[20:])
		if length > uint64(size-at-evlrHeader) {
			t.note("extended record %d at byte %d is longer than the file", i, at)
			if i == 0 {
				return size, nil
			}
			return start, nil
		}
		if err := t.take(r, userID(head[2:18]), binary.LittleEndian.Uint16(head[18:]), at+evlrHeader, int64(length)); err != nil {
			return 0, err
		}
		at += evlrHeader + int64(length)
	}
	return start, nil
}

func userID(b []byte) string {
	if i := bytes.IndexByte(b, 0); i >= 0 {
		b = b[:i]
	}
	return string(b)
}

// take keeps the payload of the records that matter. Of several equal ones the
// first counts.
func (t *records) take(r io.ReaderAt, user string, id uint16, at, length int64) error {
	if user == lazUser && id == recordLaz {
		t.laz = true
		return nil
	}
	if user != projectionUser || length == 0 {
		return nil
	}
	if length > maxPayload {
		t.note("record %s %d at byte %d has %d bytes: it is passed over", user, id, at, length)
		return nil
	}
	switch id {
	case recordWKT, recordKeys, recordDoubles, recordASCII:
	default:
		return nil
	}
	b := make([]byte, length)
	if err := readFull(r, b, at); err != nil {
		return err
	}
	switch {
	case id == recordWKT && t.wkt == "":
		t.wkt = strings.TrimSpace(strings.TrimRight(string(b), "\x00"))
	case id == recordKeys && t.keys.dir == nil:
		for i := 0; i+2 <= len(b); i += 2 {
			t.keys.dir = append(t.keys.dir, binary.LittleEndian.Uint16(b[i:]))
		}
	case id == recordDoubles && t.keys.doubles == nil:
		for i := 0; i+8 <= len(b); i += 8 {
			t.keys.doubles = append(t.keys.doubles, math.Float64frombits(binary.LittleEndian.Uint64(b[i:])))
		}
	case id == recordASCII && t.keys.ascii == "":
		t.keys.ascii = strings.TrimRight(string(b), "\x00")
	}
	return nil
}

// valid reports whether the directory has the four header values and room for
// all the keys that it counts.
func (k *geoKeys) valid() bool {
	return len(k.dir) >= 4 && k.dir[0] == 1 && len(k.dir) >= 4+4*int(k.dir[3])
}

// crs puts the file's CRS into t. The bit of the global encoding decides
// between WKT and GeoTIFF keys where a file has both (section 2.4, table 4);
// where it has one, that one is used whatever the bit says. fromKeys turns
// GeoTIFF keys into WKT.
func (t *records) crs(h *rawHeader, to *terrain.Header, fromKeys func(dir []uint16, doubles []float64, ascii string) (wkt, warnings string, err error)) {
	preferWKT := h.encoding&wktBit != 0
	if t.wkt != "" && (preferWKT || len(t.keys.dir) == 0) {
		to.CRS = t.wkt
		return
	}
	if len(t.keys.dir) > 0 {
		if !t.keys.valid() {
			t.note("the GeoTIFF keys are damaged")
		} else if t.keys.dir[3] > 0 {
			wkt, warnings, err := fromKeys(t.keys.dir, t.keys.doubles, t.keys.ascii)
			if warnings != "" {
				t.note("the GeoTIFF keys: %s", warnings)
			}
			if err == nil && wkt != "" {
				to.CRS = wkt
				return
			}
			if err == nil {
				t.note("the GeoTIFF keys name no CRS")
			} else {
				t.note("the GeoTIFF keys make no CRS: %v", err)
			}
		}
	}
	to.CRS = t.wkt
}
