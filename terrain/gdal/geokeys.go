package gdal

/*
#include "binding.h"
#cgo noescape lw_crs_of_tiff
#cgo nocallback lw_crs_of_tiff
*/
import "C"

import (
	"encoding/binary"
	"errors"
	"math"
	"regexp"
	"unsafe"

	"ledgework/terrain"
)

// FromGeoTIFFKeys returns the WKT of the CRS that GeoTIFF keys describe, as LAS
// files carry them: dir is the GeoKeyDirectory (tag 34735), doubles the
// GeoDoubleParams (34736) and ascii the GeoAsciiParams (34737), of which the
// last two may be empty. A vertical system among the keys is kept. Warnings are
// what the libraries found odd about keys that they understood, in one line. GDAL
// itself reads the keys, from a TIFF file of one pixel in memory.
func FromGeoTIFFKeys(dir []uint16, doubles []float64, ascii string) (wkt, warnings string, err error) {
	const place = "GeoTIFF keys"
	if len(dir) < 4 {
		return "", "", &terrain.FormatError{Format: "gdal", Place: place, Reason: "the key directory is shorter than its header"}
	}
	tiff := keyTIFF(dir, doubles, ascii)
	var log C.lw_log
	text := C.lw_crs_of_tiff((*C.uint8_t)(unsafe.Pointer(unsafe.SliceData(tiff))), C.size_t(len(tiff)), &log)
	warnings = withoutTIFFName(takeLog(&log))
	if text == nil {
		e := &terrain.FormatError{Format: "gdal", Place: place, Reason: "they describe no coordinate system"}
		if warnings != "" {
			e.Err = errors.New(warnings)
		}
		return "", "", e
	}
	return takeString(text), warnings, nil
}

// withoutTIFFName takes the name of the file in memory out of messages: nobody
// knows it, and its number differs from run to run.
func withoutTIFFName(messages string) string {
	name := regexp.MustCompile("[`']?(/vsimem/)?ledgework-keys-[0-9]+(\\.tif)?'?:? ?")
	return name.ReplaceAllString(messages, "")
}

// keyTIFF is a little-endian TIFF 6.0 file of one grey pixel with the GeoTIFF
// tags (OGC 19-008r4, chapter 7).
func keyTIFF(dir []uint16, doubles []float64, ascii string) []byte {
	const (
		short, long, double, text = 3, 4, 12, 2
		headerBytes, entryBytes   = 8, 12
	)
	le := binary.LittleEndian
	type entry struct {
		tag, kind uint16
		count     uint32
		data      []byte
	}
	number := func(tag, v uint16) entry { return entry{tag, short, 1, le.AppendUint16(nil, v)} }
	var shorts, reals []byte
	for _, v := range dir {
		shorts = le.AppendUint16(shorts, v)
	}
	for _, v := range doubles {
		reals = le.AppendUint64(reals, math.Float64bits(v))
	}
	entries := []entry{
		number(256, 1), number(257, 1), // width, length
		number(258, 8), number(259, 1), number(262, 1), // bits, no compression, black is zero
		{273, long, 1, le.AppendUint32(nil, headerBytes)}, // the pixel's place: see below
		number(277, 1), number(278, 1), number(279, 1), // samples, rows per strip, strip bytes
		{34735, short, uint32(len(dir)), shorts},
	}
	if len(doubles) > 0 {
		entries = append(entries, entry{34736, double, uint32(len(doubles)), reals})
	}
	if ascii != "" {
		entries = append(entries, entry{34737, text, uint32(len(ascii) + 1), append([]byte(ascii), 0)})
	}
	const ifd = headerBytes + 2 // the pixel and a byte of padding stand before it
	out := append([]byte("II*\x00"), le.AppendUint32(nil, ifd)...)
	out = append(out, 0, 0)
	out = le.AppendUint16(out, uint16(len(entries)))
	at := uint32(ifd + 2 + len(entries)*entryBytes + 4)
	var values []byte
	for _, e := range entries {
		out = le.AppendUint16(out, e.tag)
		out = le.AppendUint16(out, e.kind)
		out = le.AppendUint32(out, e.count)
		if len(e.data) <= 4 {
			out = append(out, append(e.data, 0, 0, 0, 0)[:4]...)
			continue
		}
		out = le.AppendUint32(out, at+uint32(len(values)))
		values = append(values, e.data...)
		if len(values)%2 == 1 {
			values = append(values, 0)
		}
	}
	out = le.AppendUint32(out, 0) // no further directory
	return append(out, values...)
}
