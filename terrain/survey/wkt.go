package survey

import "strings"

// A node is one KEYWORD[...] of a WKT text, as the half-open byte range
// from..to of the text it was parsed from.
type node struct {
	key      string
	from, to int
	kids     []node
}

// maxWKTDepth bounds the nesting of a WKT text. ISO 19162 needs about 10
// levels (compound, bound, projected, base, datum, ellipsoid, unit, id).
const maxWKTDepth = 64

// parseWKT returns the outermost node of a WKT text as GDAL writes it
// (ISO 19162, square brackets); ok is false when the text is no such thing.
func parseWKT(s string) (root node, ok bool) {
	root, _, ok = parseNode(s, 0, maxWKTDepth)
	return root, ok
}

// parseNode reads the node whose keyword starts at byte i, and returns the
// byte after it.
func parseNode(s string, i, depth int) (n node, next int, ok bool) {
	open := strings.IndexByte(s[i:], '[')
	if open < 0 || depth == 0 {
		return node{}, i, false
	}
	n = node{key: strings.TrimSpace(s[i : i+open]), from: i}
	i += open + 1
	start := i // of the current argument
	for i < len(s) {
		switch s[i] {
		case '"':
			end := strings.IndexByte(s[i+1:], '"') // a doubled quote is two strings: no harm
			if end < 0 {
				return node{}, i, false
			}
			i += end + 2
		case '[':
			for start < i && (s[start] == ' ' || s[start] == '\n') {
				start++
			}
			kid, after, ok := parseNode(s, start, depth-1)
			if !ok {
				return node{}, i, false
			}
			n.kids = append(n.kids, kid)
			i, start = after, after
		case ']':
			n.to = i + 1
			return n, i + 1, true
		case ',':
			i++
			start = i
		default:
			i++
		}
	}
	return node{}, i, false
}

// find returns the first node with one of the keys, n itself first, then
// depth first.
func (n *node) find(keys ...string) *node {
	for _, k := range keys {
		if n.key == k {
			return n
		}
	}
	for i := range n.kids {
		if m := n.kids[i].find(keys...); m != nil {
			return m
		}
	}
	return nil
}

// axesTurned reports whether an axis of the projected CRS wkt points west, or
// one alone south, as those of southern Africa and of the Czech lands do. In
// such coordinates azimuths are wrong, and where they are southing and westing
// the ground is its own mirror image. The axes of a polar grid, which may both
// point south along meridians, are not meant.
func axesTurned(wkt string) bool {
	root, ok := parseWKT(wkt)
	if !ok {
		return false
	}
	crs := root.find("PROJCRS")
	if crs == nil {
		return false
	}
	west, south := 0, 0
	for _, axis := range crs.kids {
		if axis.key != "AXIS" || axis.find("MERIDIAN") != nil {
			continue
		}
		end := axis.to - 1
		if len(axis.kids) > 0 {
			end = axis.kids[0].from
		}
		head := wkt[axis.from:end] // AXIS["name (abbreviation)",direction,
		switch strings.ToLower(strings.Trim(head[strings.LastIndexByte(head, '"')+1:], ", \n")) {
		case "west":
			west++
		case "south":
			south++
		}
	}
	return west > 0 || south == 1
}

// metricWKT returns the projected CRS wkt with its axes in metres: the same
// projection on the same datum, so that coordinates differ by the ratio of the
// units alone. In ISO 19162 every parameter of the conversion carries its own
// unit, hence only the axes change. The identifier goes, since it names the
// CRS in its old unit, and the name says what was done. ok is false when wkt
// holds no projected CRS.
func metricWKT(wkt string) (metric string, ok bool) {
	root, ok := parseWKT(wkt)
	if !ok {
		return "", false
	}
	crs := root.find("PROJCRS")
	if crs == nil {
		return "", false
	}
	const metre = `LENGTHUNIT["metre",1]`
	var b strings.Builder
	at := root.from
	replace := func(n node, with string) {
		b.WriteString(wkt[at:n.from])
		b.WriteString(with)
		at = n.to
	}
	if open := strings.IndexByte(wkt[crs.from:crs.to], '"'); open >= 0 {
		open += crs.from + 1
		if end := strings.IndexByte(wkt[open:crs.to], '"'); end >= 0 {
			b.WriteString(wkt[at : open+end])
			b.WriteString(" in metres")
			at = open + end
		}
	}
	for _, kid := range crs.kids {
		switch kid.key {
		case "LENGTHUNIT", "UNIT":
			replace(kid, metre)
		case "AXIS":
			for _, unit := range kid.kids {
				if unit.key == "LENGTHUNIT" || unit.key == "UNIT" {
					replace(unit, metre)
				}
			}
		case "ID":
			b.WriteString(strings.TrimRight(wkt[at:kid.from], " \n,"))
			at = kid.to
		}
	}
	b.WriteString(wkt[at:root.to])
	return b.String(), true
}
