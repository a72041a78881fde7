package las

import (
	"encoding/binary"

	"ledgework/terrain"
)

// colorOffset is the place of red, green and blue in a record, 0 where the
// point format has none (section 2.6).
func colorOffset(format uint8) int {
	switch format {
	case 2:
		return 20
	case 3, 5:
		return 28
	case 7, 8, 10:
		return 30
	}
	return 0
}

// Places in a record that all formats share, and that formats 0 to 5 and 6 to
// 10 have each (section 2.6, tables 7 and 14).
const (
	atIntensity   = 12
	atReturns     = 14
	atFlags       = 15 // formats 0 to 5: with the class
	atClass       = 16 // formats 6 to 10
	legacyClasses = 0x1f
	classOverlap  = 12 // formats 0 to 5 have a class in place of a flag (table 9)
)

// decode puts the records src into b from point n on; b has been resized to
// hold them. One column after the other: records stay in the cache and the
// loop for coordinates, which every survey needs, stays tight.
func (h *rawHeader) decode(b *terrain.Batch, n int, src []byte) {
	length := int(h.recordLength)
	decodeXYZ(b.X[n:], b.Y[n:], b.Z[n:], src, length, h.scale, h.offset)
	if len(b.Intensity) > 0 {
		decode16(b.Intensity[n:], src[atIntensity:], length)
	}
	if len(b.Class) > 0 {
		if h.format < 6 {
			decodeLegacyClass(b.Class[n:], b.Flags[n:], src, length)
		} else {
			decodeClass(b.Class[n:], b.Flags[n:], src, length)
		}
	}
	if len(b.Return) > 0 {
		bits := 3
		if h.format >= 6 {
			bits = 4
		}
		decodeReturns(b.Return[n:], b.Returns[n:], src, length, bits)
	}
	if len(b.Red) > 0 {
		if at := colorOffset(h.format); at > 0 {
			decode16(b.Red[n:], src[at:], length)
			decode16(b.Green[n:], src[at+2:], length)
			decode16(b.Blue[n:], src[at+4:], length)
		} else {
			clear(b.Red[n:])
			clear(b.Green[n:])
			clear(b.Blue[n:])
		}
	}
}

func decodeXYZ(x, y, z []float64, src []byte, length int, scale, offset [3]float64) {
	y, z = y[:len(x)], z[:len(x)]
	sx, sy, sz := scale[0], scale[1], scale[2]
	ox, oy, oz := offset[0], offset[1], offset[2]
	for i := range x {
		p := src[i*length:]
		p = p[:12]
		// The conversions keep compilers from fusing the two operations,
		// which would round once on some machines and twice on others.
		x[i] = float64(float64(int32(binary.LittleEndian.Uint32(p)))*sx) + ox
		y[i] = float64(float64(int32(binary.LittleEndian.Uint32(p[4:])))*sy) + oy
		z[i] = float64(float64(int32(binary.LittleEndian.Uint32(p[8:])))*sz) + oz
	}
}

func decode16(dst []uint16, src []byte, length int) {
	for i := range dst {
		dst[i] = binary.LittleEndian.Uint16(src[i*length:])
	}
}

// decodeLegacyClass reads the class byte of formats 0 to 5 (table 8): five
// bits of class, then synthetic, key point and withheld in the order of
// terrain.Flags.
func decodeLegacyClass(class []uint8, flags []terrain.Flags, src []byte, length int) {
	for i := range class {
		v := src[i*length+atFlags]
		class[i] = v & legacyClasses
		f := terrain.Flags(v >> 5)
		if class[i] == classOverlap {
			f |= terrain.Overlap
		}
		flags[i] = f
	}
}

// decodeClass reads the flags and the class of formats 6 to 10 (tables 15 to
// 17); the flag bits are those of terrain.Flags.
func decodeClass(class []uint8, flags []terrain.Flags, src []byte, length int) {
	for i := range class {
		flags[i] = terrain.Flags(src[i*length+atFlags] & 0x0f)
		class[i] = src[i*length+atClass]
	}
}

// decodeReturns reads the return number and the number of returns, of the
// given number of bits each.
func decodeReturns(number, count []uint8, src []byte, length, bits int) {
	mask := uint8(1)<<bits - 1
	for i := range number {
		v := src[i*length+atReturns]
		number[i] = v & mask
		count[i] = v >> bits & mask
	}
}
