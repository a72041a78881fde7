package ply

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"ledgework/terrain"
)

const formatName = "ply"

// maxHeader bounds the header in bytes. It also bounds a fixed size record to
// far less than the reader's buffer: a property takes more bytes in the header
// than in a record.
const maxHeader = 64 << 10

// maxCount bounds an element's count, so that products with record sizes stay
// within 63 bits.
const maxCount = 1 << 44

// Looks reports whether a file that begins with head can be PLY: its first
// line is "ply".
func Looks(head []byte) bool {
	rest, ok := bytes.CutPrefix(head, []byte("ply"))
	if !ok {
		return false
	}
	rest = bytes.TrimLeft(rest, " \t")
	return len(rest) > 0 && (rest[0] == '\n' || rest[0] == '\r')
}

// A scalar is the type of a property.
type scalar uint8

const (
	int8Type scalar = iota + 1
	uint8Type
	int16Type
	uint16Type
	int32Type
	uint32Type
	float32Type
	float64Type
)

// scalarOf knows both sets of type names, or returns 0.
func scalarOf(name string) scalar {
	switch name {
	case "char", "int8":
		return int8Type
	case "uchar", "uint8":
		return uint8Type
	case "short", "int16":
		return int16Type
	case "ushort", "uint16":
		return uint16Type
	case "int", "int32":
		return int32Type
	case "uint", "uint32":
		return uint32Type
	case "float", "float32":
		return float32Type
	case "double", "float64":
		return float64Type
	}
	return 0
}

func (s scalar) size() int {
	switch s {
	case int8Type, uint8Type:
		return 1
	case int16Type, uint16Type:
		return 2
	case int32Type, uint32Type, float32Type:
		return 4
	}
	return 8
}

func (s scalar) isFloat() bool { return s == float32Type || s == float64Type }

type property struct {
	name  string
	typ   scalar // of the value, or of the values of a list
	count scalar // of a list's length; 0 if the property is no list
}

type element struct {
	name       string
	count      int64
	properties []property
}

// size is the number of bytes of a binary record, false if it varies.
func (e *element) size() (int, bool) {
	n := 0
	for _, p := range e.properties {
		if p.count != 0 {
			return 0, false
		}
		n += p.typ.size()
	}
	return n, true
}

type encoding uint8

const (
	ascii encoding = iota + 1
	littleEndian
	bigEndian
)

func (e encoding) String() string {
	return [...]string{"unknown", "ascii", "binary little-endian", "binary big-endian"}[e]
}

// fileHeader is the header as it stands in the file.
type fileHeader struct {
	encoding encoding
	elements []element
	lines    int64
}

func formatError(place, reason, remedy string) error {
	return &terrain.FormatError{Format: formatName, Place: place, Reason: reason, Remedy: remedy}
}

// readHeader reads up to the end of the line "end_header".
func readHeader(in *input) (*fileHeader, error) {
	h := &fileHeader{}
	for {
		line, err := in.line()
		h.lines = in.lines
		place := fmt.Sprintf("line %d", in.lines)
		switch {
		case errors.Is(err, io.EOF) && in.lines == 0:
			return nil, formatError("byte 0", "the file is empty", "get the file again from its source")
		case errors.Is(err, io.EOF):
			return nil, formatError(place, "the file ends within the header", "get the file again from its source")
		case err != nil:
			return nil, err
		case in.offset > maxHeader:
			return nil, formatError(place, fmt.Sprintf("the header has more than %d bytes", maxHeader), "check that it is a PLY file")
		}
		words := strings.Fields(string(line))
		if in.lines == 1 {
			if len(words) != 1 || words[0] != "ply" {
				return nil, formatError("line 1", `the file does not start with "ply"`, "check that it is a PLY file")
			}
			continue
		}
		if len(words) == 0 {
			continue
		}
		if words[0] == "end_header" {
			if h.encoding == 0 {
				return nil, formatError(place, "the header has no format line", "check that it is a PLY file")
			}
			return h, nil
		}
		reason, err := h.add(words)
		if err != nil {
			return nil, err
		}
		if reason != "" {
			return nil, formatError(place, reason, "check the header with a text editor")
		}
	}
}

// add takes one line of the header. It returns what is wrong with it, or "".
func (h *fileHeader) add(words []string) (reason string, err error) {
	switch words[0] {
	case "comment", "obj_info":
		return "", nil
	case "format":
		return h.addFormat(words)
	case "element":
		if len(words) != 3 {
			return "an element line needs a name and a count", nil
		}
		n, err := strconv.ParseInt(words[2], 10, 64)
		if err != nil || n < 0 || n > maxCount {
			return fmt.Sprintf("%q is no possible count of elements", words[2]), nil
		}
		for _, e := range h.elements {
			if e.name == words[1] {
				return fmt.Sprintf("element %q is there twice", words[1]), nil
			}
		}
		h.elements = append(h.elements, element{name: words[1], count: n})
		return "", nil
	case "property":
		return h.addProperty(words), nil
	}
	return fmt.Sprintf("%.40q is no word of a PLY header", words[0]), nil
}

func (h *fileHeader) addFormat(words []string) (reason string, err error) {
	if len(words) != 3 {
		return "a format line needs an encoding and a version", nil
	}
	switch words[1] {
	case "ascii":
		h.encoding = ascii
	case "binary_little_endian":
		h.encoding = littleEndian
	case "binary_big_endian":
		h.encoding = bigEndian
	default:
		return fmt.Sprintf("%.40q is no PLY encoding", words[1]), nil
	}
	if words[2] != "1.0" {
		return "", &terrain.UnsupportedError{Format: formatName, Feature: fmt.Sprintf("PLY version %.20s", words[2]), Remedy: "convert it to PLY 1.0"}
	}
	return "", nil
}

func (h *fileHeader) addProperty(words []string) (reason string) {
	if len(h.elements) == 0 {
		return "a property stands before any element"
	}
	p := property{name: words[len(words)-1]}
	switch {
	case len(words) == 3:
		p.typ = scalarOf(words[1])
	case len(words) == 5 && words[1] == "list":
		p.count, p.typ = scalarOf(words[2]), scalarOf(words[3])
		if p.count == 0 || p.count.isFloat() {
			return fmt.Sprintf("%.40q is no type of a list's length", words[2])
		}
	default:
		return "a property line needs a type and a name"
	}
	if p.typ == 0 {
		return fmt.Sprintf("%.40q is no PLY type", words[len(words)-2])
	}
	e := &h.elements[len(h.elements)-1]
	for _, o := range e.properties {
		if o.name == p.name {
			return fmt.Sprintf("property %.40q is there twice", p.name)
		}
	}
	e.properties = append(e.properties, p)
	return ""
}

// Targets of a vertex property: where its values go.
const (
	toX = iota
	toY
	toZ
	toRed
	toGreen
	toBlue
	toIntensity
	toClass
	targets
)

// layout finds the vertex element and the properties that are read, as indices
// into its properties, -1 where there is none.
func (h *fileHeader) layout() (vertex int, at [targets]int, err error) {
	vertex = -1
	for i, e := range h.elements {
		if e.name == "vertex" {
			vertex = i
		}
	}
	place := fmt.Sprintf("line %d", h.lines)
	if vertex < 0 {
		return 0, at, formatError(place, "the header has no element named vertex", "export the points as vertices")
	}
	e := &h.elements[vertex]
	find := func(names ...string) int {
		for i, p := range e.properties {
			for _, n := range names {
				if p.count == 0 && p.name == n {
					return i
				}
			}
		}
		return -1
	}
	for i, name := range [3]string{"x", "y", "z"} {
		if at[i] = find(name); at[i] < 0 {
			return 0, at, formatError(place, fmt.Sprintf("vertices have no number named %s", name), "export points with x, y and z")
		}
	}
	at[toRed], at[toGreen], at[toBlue] = -1, -1, -1
	for _, names := range [][3]string{{"red", "green", "blue"}, {"r", "g", "b"}, {"diffuse_red", "diffuse_green", "diffuse_blue"}} {
		if r, g, b := find(names[0]), find(names[1]), find(names[2]); r >= 0 && g >= 0 && b >= 0 {
			at[toRed], at[toGreen], at[toBlue] = r, g, b
			break
		}
	}
	at[toIntensity] = find("intensity", "scalar_Intensity", "scalar_intensity")
	at[toClass] = find("classification", "class", "scalar_Classification", "scalar_classification")
	return vertex, at, nil
}

// colorScale turns stored colours into 16 bits: 8 bit ones so that 255 becomes
// 65535, fractions of 1 likewise. Wider integers other than unsigned 16 bit
// ones hold 8 bit colours in practice.
func colorScale(t scalar) float64 {
	switch {
	case t == uint16Type:
		return 1
	case t.isFloat():
		return math.MaxUint16
	}
	return 257
}

// header builds the model's header.
func (h *fileHeader) header(vertex int, at [targets]int, size int64) *terrain.Header {
	e := &h.elements[vertex]
	t := &terrain.Header{Format: "PLY 1.0, " + h.encoding.String(), Points: e.count, Bytes: size}
	if i := at[toRed]; i >= 0 {
		t.Columns |= terrain.Color
		switch p := e.properties[i]; p.typ {
		case int16Type, int32Type, uint32Type:
			t.Notes = append(t.Notes, "colours are wide integers: they are taken as 0 to 255")
		case float32Type, float64Type:
			t.Notes = append(t.Notes, "colours are fractions: they are taken as 0 to 1")
		}
	}
	if i := at[toIntensity]; i >= 0 {
		t.Columns |= terrain.Intensity
		if e.properties[i].typ.isFloat() {
			t.Notes = append(t.Notes, "intensities are fractions: they are rounded to whole numbers from 0 to 65535")
		}
	}
	if at[toClass] >= 0 {
		t.Columns |= terrain.Class
	}
	return t
}
