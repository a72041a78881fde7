package export

import (
	"bufio"
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"

	"ledgework/terrain/gdal"
)

// lonLatDecimals and heightDecimals are the digits of written positions.
const (
	lonLatDecimals = 9
	heightDecimals = 4
)

// WriteGeoJSON writes a layer as an RFC 7946 feature collection: WGS 84
// longitude and latitude, the height of the ground as third coordinate, outer
// rings counter-clockwise, a bounding box for each feature and for all, cut at
// the antimeridian. Each geometry is a MultiPolygon that passed valid.
//
// An outline that projection and rounding make invalid is written with more
// vertices, then repaired by GEOS if that keeps its area, and at last replaced
// by its convex hull, which a warning says. An error leaves a partial document.
func WriteGeoJSON(w io.Writer, t *Table, p Projector, valid ValidityCheck) (warnings []string, err error) {
	if p == nil {
		return nil, ErrNoCRS
	}
	if valid == nil {
		valid = gdal.ValidWKB
	}
	out := bufio.NewWriterSize(w, 1<<16)
	e := &geoJSON{w: out}
	e.raw(`{"type":"FeatureCollection","name":`).text(t.Name).raw(`,"caution":`).text(Caution).raw(`,"features":[`)
	all := emptyBox()
	for i := range t.Features {
		f := &t.Features[i]
		g, warning, err := t.globe(i, p, valid)
		if err != nil {
			return warnings, fmt.Errorf("export: layer %s: %s: %w", t.Name, f.ID, err)
		}
		if warning != "" {
			warnings = append(warnings, fmt.Sprintf("layer %s: %s: %s", t.Name, f.ID, warning))
		}
		all.union(g.box)
		if i > 0 {
			e.raw(",")
		}
		e.raw("\n").feature(t.Fields, f, &g)
		if err := e.flush(); err != nil {
			return warnings, fmt.Errorf("export: layer %s: %w", t.Name, err)
		}
	}
	e.raw("\n]")
	if !all.empty() {
		e.raw(",").box(&all)
	}
	e.raw("}\n")
	if err := errors.Join(e.flush(), out.Flush()); err != nil {
		return warnings, fmt.Errorf("export: layer %s: %w", t.Name, err)
	}
	return warnings, nil
}

// globe is the geometry of feature i, valid as written.
func (t *Table) globe(i int, p Projector, valid ValidityCheck) (g globe, warning string, err error) {
	for _, dense := range [2]bool{false, true} {
		if g, err = toGlobe(t.shape(i, dense), p); err != nil {
			return globe{}, "", err
		}
		if ok, _, err := g.check(valid); ok || err != nil {
			return g, "", err
		}
	}
	if r, same, err := g.repaired(); err != nil {
		return globe{}, "", err
	} else if same {
		if ok, _, err := r.check(valid); ok || err != nil {
			return r, "", err
		}
	}
	if g, err = toGlobe(hull(t.shape(i, true)), p); err != nil {
		return globe{}, "", err
	}
	ok, reason, err := g.check(valid)
	if err != nil {
		return globe{}, "", err
	}
	if !ok {
		return globe{}, "", fmt.Errorf("no valid outline in longitude and latitude: %s", reason)
	}
	return g, "its outline is not valid in longitude and latitude and was replaced by its convex hull", nil
}

// geoJSON appends tokens to a buffer that goes to w feature by feature.
type geoJSON struct {
	w   io.Writer
	buf []byte
}

func (e *geoJSON) flush() error {
	_, err := e.w.Write(e.buf)
	e.buf = e.buf[:0]
	return err
}

func (e *geoJSON) raw(s string) *geoJSON {
	e.buf = append(e.buf, s...)
	return e
}

func (e *geoJSON) text(s string) *geoJSON {
	b, err := json.Marshal(s)
	if err != nil {
		panic(err) // a string always marshals
	}
	e.buf = append(e.buf, b...)
	return e
}

// number appends v, or null if it is not finite.
func (e *geoJSON) number(v float64, decimals int) *geoJSON {
	e.buf = appendNumber(e.buf, v, decimals, "null")
	return e
}

// appendNumber appends v with the given digits after the point, trailing
// zeros removed, or with FullPrecision the fewest digits that read back as v.
// It appends other where v is not finite, and 0 for -0.
func appendNumber(b []byte, v float64, decimals int, other string) []byte {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return append(b, other...)
	case v == 0:
		return append(b, '0')
	case decimals == FullPrecision:
		if a := math.Abs(v); a < 1e-6 || a >= 1e21 {
			return strconv.AppendFloat(b, v, 'e', -1, 64)
		}
		return strconv.AppendFloat(b, v, 'f', -1, 64)
	}
	from := len(b)
	b = strconv.AppendFloat(b, v, 'f', decimals, 64)
	if decimals > 0 {
		for b[len(b)-1] == '0' {
			b = b[:len(b)-1]
		}
		if b[len(b)-1] == '.' {
			b = b[:len(b)-1]
		}
	}
	if string(b[from:]) == "-0" {
		b = append(b[:from], '0')
	}
	return b
}

// box appends the bbox member.
func (e *geoJSON) box(b *box) *geoJSON {
	e.raw(`"bbox":[`)
	for i, v := range b.wrapped() {
		if i > 0 {
			e.raw(",")
		}
		decimals := lonLatDecimals
		if i%3 == 2 {
			decimals = heightDecimals
		}
		e.number(v, decimals)
	}
	return e.raw("]")
}

func (e *geoJSON) feature(fields []Field, f *Feature, g *globe) {
	e.raw(`{"type":"Feature","id":`).text(f.ID).raw(",").box(&g.box).raw(`,"geometry":{"type":"MultiPolygon","coordinates":[`)
	for i, polygon := range g.polygons {
		e.separate(i, "[")
		for j, ring := range polygon {
			e.separate(j, "[")
			for k, p := range ring {
				e.separate(k, "[").number(p[0], lonLatDecimals).raw(",").number(p[1], lonLatDecimals).raw(",").
					number(g.heights[i][j][k], heightDecimals).raw("]")
			}
			e.raw("]")
		}
		e.raw("]")
	}
	e.raw(`]},"properties":{`)
	for i, field := range fields {
		e.separate(i, "").text(field.Name).raw(":").value(f.Values[i], field.Decimals)
	}
	e.raw("}}")
}

// separate appends a comma unless it is the first of its list, then open.
func (e *geoJSON) separate(i int, open string) *geoJSON {
	if i > 0 {
		e.raw(",")
	}
	return e.raw(open)
}

func (e *geoJSON) value(v any, decimals int) {
	switch v := v.(type) {
	case nil:
		e.raw("null")
	case string:
		e.text(v)
	case bool:
		e.buf = strconv.AppendBool(e.buf, v)
	case int64:
		e.buf = strconv.AppendInt(e.buf, v, 10)
	case float64:
		from := len(e.buf)
		e.number(v, decimals)
		// Readers that guess a column's type from its values take 3 for an
		// integer, and then lose the fraction of what follows.
		if !bytes.ContainsAny(e.buf[from:], ".en") {
			e.raw(".0")
		}
	default:
		panic(fmt.Sprintf("export: value of type %T", v))
	}
}
