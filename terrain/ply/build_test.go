package ply

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"

	"ledgework/terrain"
)

const allColumns = terrain.Intensity | terrain.Color | terrain.Class | terrain.Returns

type cloud struct {
	x, y, z   []float64
	intensity []uint16
	rgb       [3][]uint16
	class     []uint8
}

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
		c.intensity, c.class = append(c.intensity, b.Intensity...), append(c.class, b.Class...)
		for i, v := range [3][]uint16{b.Red, b.Green, b.Blue} {
			c.rgb[i] = append(c.rgb[i], v...)
		}
		for i := range b.Len() {
			if b.Flags[i] != 0 || b.Return[i]|b.Returns[i] != 0 {
				return c, errors.New("flags or returns from nowhere")
			}
		}
	}
}

func (c cloud) equal(o cloud) bool {
	same := func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }
	return slices.EqualFunc(c.x, o.x, same) && slices.EqualFunc(c.y, o.y, same) && slices.EqualFunc(c.z, o.z, same) &&
		slices.Equal(c.intensity, o.intensity) && slices.Equal(c.class, o.class) && slices.Equal(c.rgb[0], o.rgb[0]) &&
		slices.Equal(c.rgb[1], o.rgb[1]) && slices.Equal(c.rgb[2], o.rgb[2])
}

// A field of a built file: a property and what it holds.
type field struct {
	decl   string // "float x", or "list uchar int l"
	values []float64
}

// A part is an element of a built file.
type part struct {
	name   string
	count  int
	fields []field
}

// build writes a file value by value, apart from the package's own tables.
func build(format string, parts ...part) []byte {
	var order binary.AppendByteOrder = binary.LittleEndian
	if format == "binary_big_endian" {
		order = binary.BigEndian
	}
	var b []byte
	b = fmt.Appendf(b, "ply\nformat %s 1.0\n", format)
	for _, p := range parts {
		b = fmt.Appendf(b, "element %s %d\n", p.name, p.count)
		for _, f := range p.fields {
			b = fmt.Appendf(b, "property %s\n", f.decl)
		}
	}
	b = append(b, "end_header\n"...)
	put := func(typ string, v float64) {
		if format == "ascii" {
			b = append(strconv.AppendFloat(b, v, 'g', -1, 64), ' ')
			return
		}
		switch typ {
		case "char", "int8":
			b = append(b, uint8(int8(v)))
		case "uchar", "uint8":
			b = append(b, uint8(v))
		case "short", "int16":
			b = order.AppendUint16(b, uint16(int16(v)))
		case "ushort", "uint16":
			b = order.AppendUint16(b, uint16(v))
		case "int", "int32":
			b = order.AppendUint32(b, uint32(int32(v)))
		case "uint", "uint32":
			b = order.AppendUint32(b, uint32(v))
		case "float", "float32":
			b = order.AppendUint32(b, math.Float32bits(float32(v)))
		case "double", "float64":
			b = order.AppendUint64(b, math.Float64bits(v))
		default:
			panic(typ)
		}
	}
	for _, p := range parts {
		for i := range p.count {
			for _, f := range p.fields {
				w := strings.Fields(f.decl)
				if w[0] != "list" {
					put(w[0], f.values[i])
					continue
				}
				n := i % 4
				put(w[1], float64(n))
				for k := range n {
					put(w[2], float64(k))
				}
			}
			if format == "ascii" {
				b = append(b, '\n')
			}
		}
	}
	return b
}

func formats() []string { return []string{"ascii", "binary_little_endian", "binary_big_endian"} }

// random fills a field with values that its type holds exactly.
func random(rnd *rand.Rand, decl string, n int) field {
	f := field{decl: decl, values: make([]float64, n)}
	for i := range f.values {
		switch typ, _, _ := strings.Cut(decl, " "); typ {
		case "char", "int8":
			f.values[i] = float64(int8(rnd.Uint32()))
		case "uchar", "uint8":
			f.values[i] = float64(uint8(rnd.Uint32()))
		case "short", "int16":
			f.values[i] = float64(int16(rnd.Uint32()))
		case "ushort", "uint16":
			f.values[i] = float64(uint16(rnd.Uint32()))
		case "int", "int32":
			f.values[i] = float64(int32(rnd.Uint32()))
		case "uint", "uint32":
			f.values[i] = float64(rnd.Uint32())
		case "float", "float32":
			f.values[i] = float64(float32(rnd.NormFloat64() * 1000))
		default:
			f.values[i] = rnd.NormFloat64() * 1e6
		}
	}
	return f
}

func typeNames() []string {
	return []string{"char", "int8", "uchar", "uint8", "short", "int16", "ushort", "uint16", "int", "int32", "uint", "uint32",
		"float", "float32", "double", "float64"}
}
