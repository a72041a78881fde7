package las

import (
	"bytes"
	"encoding/binary"
	"errors"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"ledgework/terrain"
)

// A spec describes a file to build byte by byte from the tables of the
// specification, apart from the package's own writer.
type spec struct {
	major, minor uint8
	format       uint8
	extra        int    // bytes after each record's fields
	points       int    // written
	promised     *int64 // count in the header, if not points
	legacyOnly   bool   // 1.4 with only the legacy count
	encoding     uint16
	vlrs         []vlr
	vlrCount     *uint32
	evlrs        []vlr
	headerExtra  int // bytes between the standard header and the first VLR
	scale        [3]float64
	offset       [3]float64
	day, year    uint16
	system       string
	software     string
}

type vlr struct {
	user string
	id   uint16
	data []byte
}

// A point is the truth about one built record.
type point struct {
	x, y, z   int32
	intensity uint16
	ret, of   uint8
	class     uint8
	flags     terrain.Flags
	rgb       [3]uint16
}

func put(b []byte, vs ...any) []byte {
	for _, v := range vs {
		var err error
		if b, err = binary.Append(b, binary.LittleEndian, v); err != nil {
			panic(err)
		}
	}
	return b
}

func fixed(s string, n int) []byte { return append([]byte(s), make([]byte, n-len(s))...) }

// build returns the file and its points.
func build(s spec) ([]byte, []point) {
	if s.major == 0 {
		s.major = 1
	}
	if s.scale == [3]float64{} {
		s.scale = [3]float64{0.01, 0.02, 0.005}
	}
	size := 227
	if s.minor == 3 {
		size = 235
	} else if s.minor >= 4 {
		size = 375
	}
	size += s.headerExtra
	var records []byte
	for _, v := range s.vlrs {
		records = append(put(records, uint16(0), fixed(v.user, 16), v.id, uint16(len(v.data)), fixed("test", 32)), v.data...)
	}
	if s.minor == 0 {
		records = put(records, uint16(0xCCDD)) // LAS 1.0: point data start signature
	}
	rnd := rand.New(rand.NewPCG(1, uint64(s.format)))
	lengths := [...]int{20, 28, 26, 34, 57, 63, 30, 36, 38, 59, 67}
	length := 20 + s.extra
	if int(s.format) < len(lengths) {
		length = lengths[s.format] + s.extra
	}
	var data []byte
	var truth []point
	for range s.points {
		p, rec := buildPoint(rnd, s.format)
		for len(rec) < length {
			rec = append(rec, uint8(rnd.Uint32()))
		}
		truth = append(truth, p)
		data = append(data, rec...)
	}
	promised := int64(s.points)
	if s.promised != nil {
		promised = *s.promised
	}
	vlrCount := uint32(len(s.vlrs))
	if s.vlrCount != nil {
		vlrCount = *s.vlrCount
	}
	legacy := uint32(promised)
	if s.minor >= 4 && s.format >= 6 && !s.legacyOnly {
		legacy = 0
	}
	b := put(nil, []byte("LASF"), uint16(0), s.encoding, make([]byte, 16), s.major, s.minor, fixed(s.system, 32), fixed(s.software, 32),
		s.day, s.year, uint16(size), uint32(size+len(records)), vlrCount, s.format, uint16(length), legacy, make([]byte, 20), s.scale, s.offset)
	b = put(b, 10.0, -10.0, 20.0, -20.0, 30.0, -30.0)
	if s.minor >= 3 {
		b = put(b, uint64(0))
	}
	if s.minor >= 4 {
		at, n := uint64(0), promised
		if len(s.evlrs) > 0 {
			at = uint64(size + len(records) + len(data))
		}
		if s.legacyOnly {
			n = 0
		}
		b = put(b, at, uint32(len(s.evlrs)), n, make([]byte, 120))
	}
	b = append(b, make([]byte, s.headerExtra)...)
	b = append(append(b, records...), data...)
	for _, v := range s.evlrs {
		b = append(put(b, uint16(0), fixed(v.user, 16), v.id, uint64(len(v.data)), fixed("test", 32)), v.data...)
	}
	return b, truth
}

func buildPoint(rnd *rand.Rand, format uint8) (point, []byte) {
	p := point{x: int32(rnd.Uint32()), y: int32(rnd.Uint32()), z: int32(rnd.Uint32()), intensity: uint16(rnd.Uint32())}
	for i := range p.rgb {
		p.rgb[i] = uint16(rnd.Uint32())
	}
	rec := put(nil, p.x, p.y, p.z, p.intensity)
	if format < 6 {
		p.ret, p.of, p.class = uint8(rnd.IntN(8)), uint8(rnd.IntN(8)), uint8(rnd.IntN(32))
		synthetic, key, withheld := uint8(rnd.IntN(2)), uint8(rnd.IntN(2)), uint8(rnd.IntN(2))
		p.flags = terrain.Flags(synthetic)*terrain.Synthetic | terrain.Flags(key)*terrain.KeyPoint | terrain.Flags(withheld)*terrain.Withheld
		if p.class == 12 {
			p.flags |= terrain.Overlap
		}
		rec = put(rec, p.ret|p.of<<3|uint8(rnd.IntN(4))<<6, p.class|synthetic<<5|key<<6|withheld<<7, int8(-3), uint8(7), uint16(9))
	} else {
		p.ret, p.of, p.class = uint8(rnd.IntN(16)), uint8(rnd.IntN(16)), uint8(rnd.Uint32())
		bits := [4]uint8{uint8(rnd.IntN(2)), uint8(rnd.IntN(2)), uint8(rnd.IntN(2)), uint8(rnd.IntN(2))}
		p.flags = terrain.Flags(bits[0])*terrain.Synthetic | terrain.Flags(bits[1])*terrain.KeyPoint |
			terrain.Flags(bits[2])*terrain.Withheld | terrain.Flags(bits[3])*terrain.Overlap
		rec = put(rec, p.ret|p.of<<4, bits[0]|bits[1]<<1|bits[2]<<2|bits[3]<<3|uint8(rnd.IntN(16))<<4, p.class, uint8(7), int16(-3), uint16(9), 1.5)
	}
	switch format { // what follows, by tables 9 to 18
	case 1, 4:
		rec = put(rec, 1.5)
	case 2:
		rec = put(rec, p.rgb)
	case 3, 5:
		rec = put(rec, 1.5, p.rgb)
	case 7, 8, 10:
		rec = put(rec, p.rgb)
	default:
		p.rgb = [3]uint16{}
	}
	if format == 1 || format == 4 {
		p.rgb = [3]uint16{}
	}
	if format == 8 || format == 10 {
		rec = put(rec, uint16(77)) // near infrared
	}
	if format == 4 || format == 5 || format == 9 || format == 10 {
		rec = put(rec, make([]byte, 29)) // waveform
	}
	return p, rec
}

const allColumns = terrain.Intensity | terrain.Color | terrain.Class | terrain.Returns

// A cloud is all points of a file.
type cloud struct {
	x, y, z   []float64
	intensity []uint16
	rgb       [3][]uint16
	class     []uint8
	flags     []terrain.Flags
	ret, of   []uint8
}

// drain reads all points in batches of n.
func drain(r terrain.Reader, n int) (cloud, error) {
	var c cloud
	b := terrain.NewBatch(n, allColumns)
	for {
		if err := r.Read(b); err != nil {
			if errors.Is(err, io.EOF) {
				return c, nil
			}
			return c, err
		}
		c.x, c.y, c.z = append(c.x, b.X...), append(c.y, b.Y...), append(c.z, b.Z...)
		c.intensity = append(c.intensity, b.Intensity...)
		for i, v := range [3][]uint16{b.Red, b.Green, b.Blue} {
			c.rgb[i] = append(c.rgb[i], v...)
		}
		c.class, c.flags = append(c.class, b.Class...), append(c.flags, b.Flags...)
		c.ret, c.of = append(c.ret, b.Return...), append(c.of, b.Returns...)
	}
}

func (c cloud) append(o cloud) cloud {
	c.x, c.y, c.z = append(c.x, o.x...), append(c.y, o.y...), append(c.z, o.z...)
	c.intensity = append(c.intensity, o.intensity...)
	for i := range c.rgb {
		c.rgb[i] = append(c.rgb[i], o.rgb[i]...)
	}
	c.class, c.flags = append(c.class, o.class...), append(c.flags, o.flags...)
	c.ret, c.of = append(c.ret, o.ret...), append(c.of, o.of...)
	return c
}

func (c cloud) equal(o cloud) bool {
	same := func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }
	return slices.EqualFunc(c.x, o.x, same) && slices.EqualFunc(c.y, o.y, same) && slices.EqualFunc(c.z, o.z, same) &&
		slices.Equal(c.intensity, o.intensity) && slices.Equal(c.rgb[0], o.rgb[0]) && slices.Equal(c.rgb[1], o.rgb[1]) &&
		slices.Equal(c.rgb[2], o.rgb[2]) && slices.Equal(c.class, o.class) && slices.Equal(c.flags, o.flags) &&
		slices.Equal(c.ret, o.ret) && slices.Equal(c.of, o.of)
}

// compare checks a cloud against the truth.
func compare(t *testing.T, got cloud, want []point, scale, offset [3]float64) {
	t.Helper()
	if len(got.x) != len(want) {
		t.Fatalf("got %d points, want %d", len(got.x), len(want))
	}
	for i, w := range want {
		x, y, z := float64(w.x)*scale[0], float64(w.y)*scale[1], float64(w.z)*scale[2]
		if got.x[i] != x+offset[0] || got.y[i] != y+offset[1] || got.z[i] != z+offset[2] {
			t.Fatalf("point %d: got %v %v %v", i, got.x[i], got.y[i], got.z[i])
		}
		g := point{x: w.x, y: w.y, z: w.z, intensity: got.intensity[i], ret: got.ret[i], of: got.of[i], class: got.class[i], flags: got.flags[i],
			rgb: [3]uint16{got.rgb[0][i], got.rgb[1][i], got.rgb[2][i]}}
		if g != w {
			t.Fatalf("point %d: got %+v, want %+v", i, g, w)
		}
	}
}

func open(t testing.TB, b []byte, opts Options) *Reader {
	t.Helper()
	r, err := NewReader(bytes.NewReader(b), int64(len(b)), opts)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func ptr[T any](v T) *T { return &v }
