package survey

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"

	"ledgework/terrain"
)

// A probe is what is known of a source before its points are streamed.
type probe struct {
	src    Source
	header *terrain.Header
	system system // of kind local where the source has no CRS
	extent terrain.Extent
	points int64
	notes  []string // for the user, without the path
}

// look opens a source for its header. Where the header tells no extent, or one
// that can't be, all points are read for it.
func look(ctx context.Context, src Source, known systems) (*probe, error) {
	f, err := open(src.Path, src.options())
	if err != nil {
		return nil, err
	}
	p, err := examine(ctx, src, f, known)
	if closed := f.Close(); err == nil {
		err = closed
	}
	return p, err
}

// examine is look on an open reader.
func examine(ctx context.Context, src Source, r terrain.Reader, known systems) (*probe, error) {
	p := &probe{src: src, header: r.Header(), points: r.Header().Points}
	if p.header.CRS != "" {
		s, err := known.parse(p.header.CRS)
		if err != nil && src.CRS != "" {
			return nil, fmt.Errorf("%s: survey: the given CRS %q can't be understood: %s; give EPSG:n, WKT or PROJJSON", src.Path, src.CRS, err.Error())
		}
		if err != nil {
			p.note("the file's CRS can't be understood (%v) and is left aside; give crs: EPSG:n to place it", err)
		}
		p.system = s
	}
	b := terrain.NewBatch(terrain.BatchPoints, 0)
	if e := p.header.Extent; e != nil && p.points > 0 {
		err := r.Read(b)
		if err != nil && !errors.Is(err, io.EOF) {
			return nil, err
		}
		if plausible(*e) && holds(*e, b) {
			p.extent = *e
			// A count beyond the file's size would make the points of all
			// sources overflow, and the search for their spacing too narrow.
			if most := p.header.Bytes / minRecordBytes; most > 0 {
				p.points = min(p.points, most)
			}
			return p, nil
		}
		p.note("the header's extent can't be (%s); the points were read for it", describeExtent(*e))
	}
	var err error
	p.extent, p.points, err = measure(ctx, r, b)
	if err != nil {
		return nil, err
	}
	if p.points == 0 {
		return nil, fmt.Errorf("%s: survey: %w; leave it out or export it again", src.Path, terrain.ErrNoPoints)
	}
	return p, nil
}

// note adds a note on the source.
func (p *probe) note(format string, args ...any) {
	p.notes = append(p.notes, fmt.Sprintf(format, args...))
}

// gatherNotes lists the notes on all sources, and the oddities of their
// headers. What is said of many files is said once.
func gatherNotes(probes []*probe) []string {
	var texts []string
	files := make(map[string][]string)
	for _, p := range probes {
		for _, text := range slices.Concat(p.header.Notes, p.notes) {
			if files[text] == nil {
				texts = append(texts, text)
			}
			files[text] = append(files[text], p.src.Path)
		}
	}
	for i, text := range texts {
		who := files[text][0]
		switch n := len(files[text]) - 1; {
		case n == 1:
			who += " and another file"
		case n > 1:
			who += fmt.Sprintf(" and %d other files", n)
		}
		texts[i] = who + ": " + text
	}
	return texts
}

// maxRawSpan bounds a header's extent before its units are known: 1000 km in
// US survey feet, rounded up.
const maxRawSpan = 3.3e6

// plausible reports whether a header's extent can be one: finite, in order and
// no wider than maxRawSpan.
func plausible(e terrain.Extent) bool {
	if e.Empty() {
		return false
	}
	for i := range 3 {
		if math.IsInf(e.Min[i], 0) || math.IsInf(e.Max[i], 0) || e.Max[i]-e.Min[i] > maxRawSpan {
			return false
		}
	}
	return true
}

func describeExtent(e terrain.Extent) string {
	return fmt.Sprintf("x %g to %g, y %g to %g, z %g to %g", e.Min[0], e.Max[0], e.Min[1], e.Max[1], e.Min[2], e.Max[2])
}

// holds reports whether the finite points of b lie in e, or no more than a
// hundredth of its width off, since headers are rounded.
func holds(e terrain.Extent, b *terrain.Batch) bool {
	slack := max(e.Max[0]-e.Min[0], e.Max[1]-e.Min[1], e.Max[2]-e.Min[2]) / 100
	for i, x := range b.X {
		for a, v := range [3]float64{x, b.Y[i], b.Z[i]} {
			if v < e.Min[a]-slack || v > e.Max[a]+slack {
				return false
			}
		}
	}
	return true
}

// measure counts the points of b, which were read from r already, and all that
// follow, and returns their extent. Points without finite coordinates don't
// count.
func measure(ctx context.Context, r terrain.Reader, b *terrain.Batch) (terrain.Extent, int64, error) {
	e := terrain.EmptyExtent()
	var n int64
	for {
		for i, x := range b.X {
			if y, z := b.Y[i], b.Z[i]; finite(x, y, z) {
				e.Add(x, y, z)
				n++
			}
		}
		if err := ctx.Err(); err != nil {
			return e, n, err
		}
		err := r.Read(b)
		if errors.Is(err, io.EOF) {
			return e, n, nil
		}
		if err != nil {
			return e, n, err
		}
	}
}

// finite reports whether three coordinates are numbers: the difference of a
// number and itself is zero, of anything else NaN.
func finite(x, y, z float64) bool {
	return (x-x)+(y-y)+(z-z) == 0
}
