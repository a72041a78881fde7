package gdal

/*
#include "binding.h"
#cgo noescape lw_band_describe
#cgo nocallback lw_band_describe
#cgo noescape lw_band_read
#cgo nocallback lw_band_read
*/
import "C"

import (
	"fmt"
	"math"
	"strings"
	"unsafe"
)

// A Band is one band of a raster. It is part of its Dataset and needs no Close.
type Band struct {
	d                       *Dataset
	number                  int
	blockWidth, blockHeight int
	bytes                   int
	mask                    int
	alpha                   bool
	nodata, scale, offset   float64
	hasNodata               bool
	dtype, unit, text       string
}

// Band returns band number i, counted from 1. It panics if i is not a band of
// the file.
func (d *Dataset) Band(i int) (*Band, error) {
	if i < 1 || i > d.bands {
		panic(fmt.Sprintf("gdal: band %d of %d", i, d.bands))
	}
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.handle == nil {
		return nil, ErrClosed
	}
	var info C.lw_band
	var log C.lw_log
	if C.lw_band_describe(d.handle, C.int(i), &info, &log) == 0 {
		return nil, failure(&log, d.place("band %d", i), "cannot be described")
	}
	takeLog(&log)
	b := &Band{
		d: d, number: i,
		blockWidth: int(info.block_width), blockHeight: int(info.block_height), bytes: int(info.bytes),
		mask: int(info.mask), alpha: info.alpha != 0,
		nodata: float64(info.nodata), hasNodata: info.has_nodata != 0, scale: 1,
		dtype: takeString(info._type), unit: takeString(info.unit), text: takeString(info.description),
	}
	if info.has_scale != 0 {
		b.scale = float64(info.scale)
	}
	if info.has_offset != 0 {
		b.offset = float64(info.offset)
	}
	return b, nil
}

// Number is the band's number, counted from 1.
func (b *Band) Number() int { return b.number }

// BlockSize is the width and height in cells of the blocks in which the file
// stores the band. Blocks at the right and lower edge reach past the raster.
func (b *Band) BlockSize() (w, h int) { return b.blockWidth, b.blockHeight }

// BlockBytes is the memory that one block takes once decoded.
func (b *Band) BlockBytes() int64 {
	return int64(b.blockWidth) * int64(b.blockHeight) * int64(b.bytes)
}

// DataType is GDAL's name of the stored type: "Float32".
func (b *Band) DataType() string { return b.dtype }

// NoData is the stored value that means no data, and whether there is one. It
// may be NaN.
func (b *Band) NoData() (float64, bool) { return b.nodata, b.hasNodata }

// ScaleOffset returns the factor and summand that turn a stored value into the
// measured one; 1 and 0 if the file has none.
func (b *Band) ScaleOffset() (scale, offset float64) { return b.scale, b.offset }

// Unit is the unit of the measured values as the file spells it, often empty.
func (b *Band) Unit() string { return b.unit }

// Description is the band's name in the file, often empty.
func (b *Band) Description() string { return b.text }

// Alpha reports whether the band is a transparency mask and not data.
func (b *Band) Alpha() bool { return b.alpha }

// AllValid reports whether every cell holds data as far as the file says: it has
// no nodata value, mask or alpha band. NaN may still occur.
func (b *Band) AllValid() bool { return b.mask&maskAllValid != 0 }

// maskAllValid is GDAL's mask flag GMF_ALL_VALID.
const maskAllValid = 1

// Metadata returns an item of the band's default metadata domain, and whether
// it is there.
func (b *Band) Metadata(key string) (string, bool) { return b.d.metadata(b.number, key) }

// ReadFloat64 fills dst, row by row, with the w × h stored values whose upper
// left cell is x, y. Scale and offset are not applied. It panics if the window
// leaves the raster or dst is shorter than w·h.
func (b *Band) ReadFloat64(x, y, w, h int, dst []float64) error {
	return b.read(x, y, w, h, dst, nil)
}

// ReadMasked does what ReadFloat64 does and sets valid, one byte a cell, to 1
// where the value is finite and neither the nodata value nor masked out by a
// mask or alpha band, and to 0 elsewhere. It panics if valid is shorter than
// w·h.
func (b *Band) ReadMasked(x, y, w, h int, dst []float64, valid []uint8) error {
	if len(valid) < w*h {
		panic("gdal: valid is shorter than the window")
	}
	if err := b.read(x, y, w, h, dst, valid); err != nil {
		return err
	}
	for i, v := range dst[:w*h] {
		if valid[i] != 0 {
			valid[i] = 1
			if math.IsNaN(v) || math.IsInf(v, 0) {
				valid[i] = 0
			}
		}
	}
	return nil
}

func (b *Band) read(x, y, w, h int, dst []float64, valid []uint8) error {
	d := b.d
	if x < 0 || y < 0 || w < 1 || h < 1 || w > d.width-x || h > d.height-y {
		panic(fmt.Sprintf("gdal: window %d,%d %d × %d of a raster %d × %d", x, y, w, h, d.width, d.height))
	}
	if len(dst) < w*h {
		panic("gdal: dst is shorter than the window")
	}
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.handle == nil {
		return ErrClosed
	}
	var log C.lw_log
	ok := C.lw_band_read(d.handle, C.int(b.number), C.int(x), C.int(y), C.int(w), C.int(h),
		(*C.double)(unsafe.Pointer(unsafe.SliceData(dst))), (*C.uint8_t)(unsafe.Pointer(unsafe.SliceData(valid))), &log)
	if ok == 0 {
		return failure(&log, d.place("band %d, column %d, row %d", b.number, x, y), "cannot be read")
	}
	takeLog(&log)
	return nil
}

// Complex reports whether the band stores complex numbers.
func (b *Band) Complex() bool { return strings.HasPrefix(b.dtype, "C") }

// Integer reports whether the band stores whole numbers, which are never NaN.
func (b *Band) Integer() bool {
	return strings.HasPrefix(b.dtype, "Int") || strings.HasPrefix(b.dtype, "UInt") || b.dtype == "Byte"
}
