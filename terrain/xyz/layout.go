package xyz

import (
	"bytes"
	"fmt"
	"math"
	"strings"

	"ledgework/terrain"
	"ledgework/terrain/internal/decimal"
)

// Targets of a column: where its values go.
const (
	toX = iota
	toY
	toZ
	toIntensity
	toRed
	toGreen
	toBlue
	toClass
	targets
)

const (
	// sampleLines is how many lines with points decide on the layout.
	sampleLines = 100

	// Intensities of PTS files are 12 bit numbers with a sign.
	ptsMin, ptsMax = -2048, 2047
)

// A layout says how the lines are made.
type layout struct {
	sep     byte
	end     byte         // of a line
	skip    int64        // lines before the first point: number and names
	columns int          // of the first line with a point
	at      [targets]int // columns, -1 for none
	promise int64        // number of points promised, -1 for none
	scale   float64      // of colours
	gain    float64      // of intensities: stored × gain + shift
	shift   float64
	notes   []string
}

func formatError(line int64, reason, remedy string) error {
	place := fmt.Sprintf("line %d", line)
	if line == 0 {
		place = "byte 0"
	}
	return &terrain.FormatError{Format: "xyz", Place: place, Reason: reason, Remedy: remedy}
}

const (
	remedyPoints = "write one point a line as x, y and z"
	remedyCommas = "write the numbers with decimal points"
)

// remedyFor is what to do about a cell that is no number.
func remedyFor(cell []byte) string {
	if hasDecimalComma(cell) {
		return remedyCommas
	}
	return remedyPoints
}

// Looks reports whether a file that begins with head can be text with points:
// the first line that is no comment has three numbers, or is a number of
// points, or names the columns x and y.
func Looks(head []byte) bool {
	text := bytes.TrimPrefix(head, []byte("\xef\xbb\xbf"))
	if bytes.IndexByte(text, 0) >= 0 {
		return false
	}
	end := lineEnd(text)
	for len(text) > 0 {
		line, rest, _ := bytes.Cut(text, []byte{end})
		line, text = trim(line), rest
		if isComment(line) {
			continue
		}
		if _, ok := count(line); ok || decimalCommas(line) {
			return true
		}
		c := cells(line, separator(line))
		if numbers(c) >= 3 || len(c) >= 3 && hasDecimalComma(c[0]) {
			return true
		}
		at := columnNames(c)
		return at[toX] >= 0 && at[toY] >= 0
	}
	return false
}

// lineEnd is the byte that ends lines: a line feed, or a carriage return where
// there is no line feed.
func lineEnd(head []byte) byte {
	if bytes.IndexByte(head, '\n') < 0 && bytes.IndexByte(head, '\r') >= 0 {
		return '\r'
	}
	return '\n'
}

// A sample is a line of the file's beginning.
type sample struct {
	text   []byte
	number int64 // from 1
}

// sampled splits the beginning of a file into lines that are no comments. It
// also returns the last comment before them.
func sampled(head []byte, whole bool, end byte) (lines []sample, comment []byte) {
	for n := int64(1); len(head) > 0 && len(lines) < sampleLines; n++ {
		i := bytes.IndexByte(head, end)
		if i < 0 && !whole {
			break // a line that is cut off
		}
		line := head
		if i >= 0 {
			line, head = head[:i], head[i+1:]
		} else {
			head = nil
		}
		line = trim(line)
		switch {
		case !isComment(line):
			lines = append(lines, sample{line, n})
		case len(lines) == 0 && len(line) > 0:
			comment = line
		}
	}
	return lines, comment
}

// findLayout decides how the lines of a file are made from its beginning.
func findLayout(head []byte, whole bool) (*layout, error) {
	l := &layout{sep: blanks, end: '\n', promise: -1, gain: 1, scale: 257}
	for i := range l.at {
		l.at[i] = -1
	}
	if len(head) == 0 {
		return nil, formatError(0, "the file is empty", "get the file again from its source")
	}
	if bytes.HasPrefix(head, []byte("\xff\xfe")) || bytes.HasPrefix(head, []byte("\xfe\xff")) {
		return nil, &terrain.UnsupportedError{Format: "xyz", Feature: "text in UTF-16", Remedy: "save it as UTF-8"}
	}
	if i := bytes.IndexByte(head, 0); i >= 0 {
		return nil, formatError(int64(bytes.Count(head[:i], []byte("\n"))+1), "the file is not text", "check the kind of file")
	}
	head = bytes.TrimPrefix(head, []byte("\xef\xbb\xbf"))
	l.end = lineEnd(head)
	lines, comment := sampled(head, whole, l.end)
	if isPTX(lines) {
		return nil, &terrain.UnsupportedError{Format: "xyz", Feature: "a PTX file of gridded scans", Remedy: "export the points as PTS, XYZ or LAS"}
	}
	if len(lines) > 0 {
		if n, ok := count(lines[0].text); ok {
			l.promise, l.skip = n, lines[0].number
			lines = lines[1:]
		}
	}
	var names [][]byte
	if len(lines) > 0 {
		c := cells(lines[0].text, separator(lines[0].text))
		if numbers(c) == 0 && !hasDecimalComma(c[0]) {
			names = c
			l.skip = lines[0].number
			if at := columnNames(c); at[toX] < 0 || at[toY] < 0 || at[toZ] < 0 {
				return nil, formatError(lines[0].number, fmt.Sprintf("%.60q names no columns x, y and z", lines[0].text), "name the columns x, y and z")
			}
			lines = lines[1:]
		}
	}
	if len(lines) == 0 {
		if !whole && l.skip == 0 && comment == nil {
			return nil, formatError(1, fmt.Sprintf("the line has more than %d bytes", maxLine), "check that it is a text file")
		}
		l.at[toX], l.at[toY], l.at[toZ] = 0, 1, 2
		if names != nil {
			l.at = columnNames(names)
		}
		return l, nil
	}
	first := lines[0]
	l.sep = separator(first.text)
	c := cells(first.text, l.sep)
	l.columns = len(c)
	if names == nil && comment != nil {
		// Some programs write the names as a comment.
		text := trim(bytes.TrimLeft(comment, "#/"))
		if n := cells(text, separator(text)); len(n) == l.columns {
			if at := columnNames(n); at[toX] >= 0 && at[toY] >= 0 && at[toZ] >= 0 {
				names = n
			}
		}
	}
	if names != nil {
		l.at = columnNames(names)
		if last := max(l.at[toX], l.at[toY], l.at[toZ]); len(c) > len(names) || last >= len(c) {
			return nil, formatError(first.number, fmt.Sprintf("the line has %d columns, there are %d names", len(c), len(names)),
				"give each column a name of one word, and write the numbers with decimal points")
		}
		for _, i := range l.at[:toZ+1] {
			if hasDecimalComma(c[i]) {
				return nil, formatError(first.number, fmt.Sprintf("%.40q is no number", c[i]), remedyCommas)
			}
		}
	} else {
		for i := range min(3, len(c)) {
			if !isNumber(c[i]) {
				return nil, formatError(first.number, fmt.Sprintf("%.40q is no number", c[i]), remedyFor(c[i]))
			}
		}
		if len(c) < 3 {
			return nil, formatError(first.number, fmt.Sprintf("the line has %d columns, a point needs 3", len(c)), remedyPoints)
		}
		l.at[toX], l.at[toY], l.at[toZ] = 0, 1, 2
		l.byCount(lines)
	}
	l.scaleColors(lines)
	l.scaleIntensity(lines)
	return l, nil
}

// isPTX recognises the header of a PTX scan: its numbers of columns and rows,
// four lines of a pose as three numbers each and four lines of a matrix.
func isPTX(lines []sample) bool {
	if len(lines) < 10 {
		return false
	}
	for i, want := range [10]int{1, 1, 3, 3, 3, 3, 4, 4, 4, 4} {
		c := cells(lines[i].text, blanks)
		if len(c) != want || numbers(c) != want {
			return false
		}
	}
	_, a := count(lines[0].text)
	_, b := count(lines[1].text)
	return a && b
}

// columnNames finds the columns by their names, -1 for none.
func columnNames(names [][]byte) (at [targets]int) {
	find := func(known ...string) int {
		for _, k := range known {
			for i, n := range names {
				s := string(n)
				if j := strings.IndexAny(s, "([{"); j > 0 {
					s = s[:j]
				}
				if strings.EqualFold(strings.Trim(s, " \"'"), k) {
					return i
				}
			}
		}
		return -1
	}
	at[toX] = find("x", "easting", "east", "e")
	at[toY] = find("y", "northing", "north", "n")
	at[toZ] = find("z", "height", "elevation", "elev", "h")
	at[toIntensity] = find("intensity", "i")
	at[toRed], at[toGreen], at[toBlue] = find("red", "r"), find("green", "g"), find("blue", "b")
	if at[toRed] < 0 || at[toGreen] < 0 || at[toBlue] < 0 {
		at[toRed], at[toGreen], at[toBlue] = -1, -1, -1
	}
	at[toClass] = find("classification", "class")
	return at
}

// byCount gives meaning to the columns after x, y and z of a file that does
// not name them.
func (l *layout) byCount(lines []sample) {
	colors := -1
	switch l.columns {
	case 3:
		return
	case 4:
		l.at[toIntensity] = 3
		return
	case 6:
		colors = 3
	case 7:
		colors = 4
	}
	bytesOnly := colors >= 0
	for _, s := range lines {
		for k := 0; k < 3 && colors >= 0; k++ {
			v, ok := s.value(colors+k, l.sep)
			bytesOnly = bytesOnly && (!ok || v >= 0 && v <= math.MaxUint8 && v == math.Trunc(v))
		}
	}
	if !bytesOnly {
		l.notes = append(l.notes, fmt.Sprintf("the columns after the third of %d have no names: they are left out", l.columns))
		return
	}
	l.at[toRed], l.at[toGreen], l.at[toBlue] = colors, colors+1, colors+2
	if colors == 4 {
		l.at[toIntensity] = 3
	}
}

// value reads one column of a sample, false if there is no such number.
func (s sample) value(column int, sep byte) (float64, bool) {
	rest := s.text
	for i := 0; ; i++ {
		cell, r, ok := nextCell(rest, sep)
		if !ok {
			return 0, false
		}
		if i == column {
			return decimal.Parse(cell)
		}
		rest = r
	}
}

// span tells the range of some columns over the samples, and whether there are
// fractions. Without any number the range is empty.
func (l *layout) span(lines []sample, columns ...int) (low, high float64, fractions bool) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, s := range lines {
		for _, k := range columns {
			if v, ok := s.value(k, l.sep); ok && !math.IsNaN(v) {
				low, high = min(low, v), max(high, v)
				fractions = fractions || v != math.Trunc(v)
			}
		}
	}
	return low, high, fractions
}

// scaleColors tells colours of 8 bits, of 16 bits and fractions of 1 apart.
func (l *layout) scaleColors(lines []sample) {
	if l.at[toRed] < 0 {
		return
	}
	low, high, fractions := l.span(lines, l.at[toRed], l.at[toGreen], l.at[toBlue])
	switch {
	case fractions && low >= 0 && high <= 1:
		l.scale = math.MaxUint16
		l.notes = append(l.notes, "colours are taken as fractions of 1")
	case high > math.MaxUint8:
		l.scale = 1
		l.notes = append(l.notes, "colours are taken as 0 to 65535")
	}
}

// scaleIntensity tells whole intensities, PTS ones and fractions of 1 apart.
func (l *layout) scaleIntensity(lines []sample) {
	if l.at[toIntensity] < 0 {
		return
	}
	low, high, fractions := l.span(lines, l.at[toIntensity])
	switch {
	case fractions && low >= 0 && high <= 1:
		l.gain = math.MaxUint16
		l.notes = append(l.notes, "intensities are taken as fractions of 1")
	case (l.promise >= 0 || low < 0) && low >= ptsMin && high <= ptsMax:
		l.shift = -ptsMin
		l.notes = append(l.notes, "intensities are taken as -2048 to 2047 and raised by 2048")
	}
}

// header builds the model's header.
func (l *layout) header(size int64) *terrain.Header {
	t := &terrain.Header{Format: "XYZ text", Points: l.promise, Bytes: size, Notes: l.notes}
	switch {
	case l.promise >= 0:
		t.Format = "PTS text"
	case l.sep == ',' || l.sep == ';':
		t.Format = "CSV text"
	}
	if l.at[toIntensity] >= 0 {
		t.Columns |= terrain.Intensity
	}
	if l.at[toRed] >= 0 {
		t.Columns |= terrain.Color
	}
	if l.at[toClass] >= 0 {
		t.Columns |= terrain.Class
	}
	return t
}
