package ply

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"math/bits"

	"ledgework/terrain/internal/decimal"
)

// value reads one binary value.
func (s scalar) value(b []byte, e encoding) float64 {
	var v [1]float64
	s.column(v[:], b, s.size(), e)
	return v[0]
}

// column reads len(dst) binary values that are stride bytes apart. The switch
// stands outside of the loops, the byte order inside: a branch that always goes
// the same way costs next to nothing.
func (s scalar) column(dst []float64, src []byte, stride int, e encoding) {
	big := e == bigEndian
	switch s {
	case int8Type:
		for i := range dst {
			dst[i] = float64(int8(src[i*stride]))
		}
	case uint8Type:
		for i := range dst {
			dst[i] = float64(src[i*stride])
		}
	case int16Type:
		for i := range dst {
			dst[i] = float64(int16(load16(src[i*stride:], big)))
		}
	case uint16Type:
		for i := range dst {
			dst[i] = float64(load16(src[i*stride:], big))
		}
	case int32Type:
		for i := range dst {
			dst[i] = float64(int32(load32(src[i*stride:], big)))
		}
	case uint32Type:
		for i := range dst {
			dst[i] = float64(load32(src[i*stride:], big))
		}
	case float32Type:
		for i := range dst {
			dst[i] = float64(math.Float32frombits(load32(src[i*stride:], big)))
		}
	default:
		for i := range dst {
			v := binary.LittleEndian.Uint64(src[i*stride:])
			if big {
				v = bits.ReverseBytes64(v)
			}
			dst[i] = math.Float64frombits(v)
		}
	}
}

func load16(b []byte, big bool) uint16 {
	v := binary.LittleEndian.Uint16(b)
	if big {
		v = bits.ReverseBytes16(v)
	}
	return v
}

func load32(b []byte, big bool) uint32 {
	v := binary.LittleEndian.Uint32(b)
	if big {
		v = bits.ReverseBytes32(v)
	}
	return v
}

// parse reads a line of an ascii file into t.row. It returns what is wrong
// with it, or "".
func (t *Reader) parse(line []byte) (reason string) {
	rest := line
	for i, p := range t.vertex.properties {
		var word []byte
		if word, rest = nextWord(rest); len(word) == 0 {
			return fmt.Sprintf("the line ends before the value of %s", p.name)
		}
		if p.count == 0 && t.target[i] < 0 {
			continue
		}
		v, ok := decimal.Parse(word)
		if !ok {
			return fmt.Sprintf("%s: %.40q is no number", p.name, word)
		}
		if p.count == 0 {
			t.row[t.target[i]] = v
			continue
		}
		// A line of n bytes holds no list of n values.
		if !(v >= 0 && v < float64(len(line))) || v != math.Trunc(v) {
			return fmt.Sprintf("%s: a list of length %s does not fit the line", p.name, word)
		}
		for range int(v) {
			if word, rest = nextWord(rest); len(word) == 0 {
				return fmt.Sprintf("the line ends within the list %s", p.name)
			}
		}
	}
	if word, _ := nextWord(rest); len(word) > 0 {
		return fmt.Sprintf("the line has more values than the header's %d properties", len(t.vertex.properties))
	}
	return ""
}

func isBlank(c byte) bool { return c == ' ' || c == '\t' || c == '\r' || c == '\v' || c == '\f' }

func trimBlanks(b []byte) []byte { return bytes.TrimLeft(b, " \t\r\v\f") }

// nextWord splits off the first word.
func nextWord(b []byte) (word, rest []byte) {
	i := 0
	for i < len(b) && isBlank(b[i]) {
		i++
	}
	start := i
	for i < len(b) && !isBlank(b[i]) {
		i++
	}
	return b[start:i], b[i:]
}
