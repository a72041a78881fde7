package gdal

/*
#include "binding.h"
#cgo noescape lw_layer_describe
#cgo nocallback lw_layer_describe
#cgo noescape lw_layer_read
#cgo nocallback lw_layer_read
*/
import "C"

import (
	"encoding/binary"
	"iter"
	"math"
	"strings"

	"ledgework/terrain"
)

// A Layer is one layer of a vector file. It is part of its Dataset and needs no
// Close. The features of one layer are read by one loop at a time.
type Layer struct {
	d      *Dataset
	index  int
	name   string
	crs    string
	count  int64
	fields []string
}

// A Feature is a geometry with its attributes.
type Feature struct {
	ID     int64
	WKB    []byte         // ISO WKB, little endian; empty if there is no geometry
	Fields map[string]any // string, int64 or float64; a null field is absent
}

// Layers describes the layers of a vector file, in its order.
func (d *Dataset) Layers() ([]*Layer, error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.handle == nil {
		return nil, ErrClosed
	}
	layers := make([]*Layer, d.layers)
	for i := range layers {
		var info C.lw_layer
		var log C.lw_log
		if C.lw_layer_describe(d.handle, C.int(i), &info, &log) == 0 {
			return nil, failure(&log, d.place("layer %d", i), "cannot be described")
		}
		takeLog(&log)
		l := &Layer{d: d, index: i, name: takeString(info.name), crs: takeString(info.crs), count: int64(info.count)}
		lines := strings.Split(takeString(info.fields), "\n")
		for j := 0; j+1 < len(lines); j += 2 {
			l.fields = append(l.fields, lines[j])
		}
		layers[i] = l
	}
	return layers, nil
}

// Name is the layer's name.
func (l *Layer) Name() string { return l.name }

// CRS is the WKT of the layer's coordinate reference system, empty if it has
// none.
func (l *Layer) CRS() string { return l.crs }

// Count is the number of features, -1 if it is not known without reading them.
func (l *Layer) Count() int64 { return l.count }

// Fields names the attributes. The slice must not be changed.
func (l *Layer) Fields() []string { return l.fields }

// Features reads the layer from its first feature. A failure ends the loop with
// an error.
func (l *Layer) Features() iter.Seq2[Feature, error] {
	return func(yield func(Feature, error) bool) {
		for rewind := C.int(1); ; rewind = 0 {
			features, err := l.next(rewind)
			for _, f := range features {
				if !yield(f, nil) {
					return
				}
			}
			if err != nil {
				yield(Feature{}, err)
				return
			}
			if len(features) == 0 {
				return
			}
		}
	}
}

// featuresPerCall keeps the cost of a call into C small beside the features.
const featuresPerCall = 128

func (l *Layer) next(rewind C.int) ([]Feature, error) {
	d := l.d
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.handle == nil {
		return nil, ErrClosed
	}
	var out C.lw_features
	var log C.lw_log
	ok := C.lw_layer_read(d.handle, C.int(l.index), rewind, featuresPerCall, &out, &log)
	blob := takeBytes(out.data, out.len)
	if ok == 0 {
		return nil, failure(&log, d.place("layer %q", l.name), "cannot be read")
	}
	takeLog(&log)
	c := cursor{blob}
	features := make([]Feature, int(out.count))
	for i := range features {
		f := Feature{ID: int64(c.uint64()), Fields: map[string]any{}}
		f.WKB = c.sized()
		for _, name := range l.fields {
			switch c.take(1)[0] {
			case 'i':
				f.Fields[name] = int64(c.uint64())
			case 'f':
				f.Fields[name] = math.Float64frombits(c.uint64())
			case 's':
				f.Fields[name] = string(c.sized())
			}
		}
		features[i] = f
	}
	return features, nil
}

// A cursor walks the bytes that lw_layer_read packed; they come from our own C
// code, so a short buffer is a bug and panics.
type cursor struct{ rest []byte }

func (c *cursor) take(n int) []byte {
	b := c.rest[:n:n]
	c.rest = c.rest[n:]
	return b
}

func (c *cursor) uint64() uint64 { return binary.NativeEndian.Uint64(c.take(8)) }

func (c *cursor) sized() []byte { return c.take(int(c.uint64())) }

// ReadPolygons reads every polygon and multipolygon of the vector file at path,
// such as a crop area, as ISO WKB, with the WKT of their CRS (empty if the file
// has none). Features without a geometry are passed over; one that is not a
// polygon, two layers of different CRS, or no polygon at all is an error.
func ReadPolygons(path string) (wkb [][]byte, crs string, err error) {
	d, err := OpenVector(path)
	if err != nil {
		return nil, "", err
	}
	defer func() { _ = d.Close() }() // nothing was written
	layers, err := d.Layers()
	if err != nil {
		return nil, "", err
	}
	for _, l := range layers {
		for f, err := range l.Features() {
			if err != nil {
				return nil, "", err
			}
			if len(f.WKB) == 0 {
				continue
			}
			place := d.place("layer %q, feature %d", l.name, f.ID)
			if kind := wkbKind(f.WKB); kind != 3 && kind != 6 {
				return nil, "", &terrain.FormatError{Format: "gdal", Place: place, Reason: "not a polygon",
					Remedy: "give a file of polygons only"}
			}
			if len(wkb) > 0 && crs != l.crs {
				return nil, "", &terrain.FormatError{Format: "gdal", Place: place, Reason: "layers have different coordinate systems"}
			}
			crs = l.crs
			wkb = append(wkb, f.WKB)
		}
	}
	if len(wkb) == 0 {
		return nil, "", &terrain.FormatError{Format: "gdal", Place: path, Reason: "no polygon in the file"}
	}
	return wkb, crs, nil
}

// wkbKind is the geometry type of little-endian ISO WKB without its dimension:
// 3 a polygon, 6 a multipolygon.
func wkbKind(wkb []byte) uint32 {
	if len(wkb) < 5 {
		return 0
	}
	return binary.LittleEndian.Uint32(wkb[1:]) % 1000
}
