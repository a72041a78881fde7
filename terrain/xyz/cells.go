package xyz

import (
	"bytes"
	"strconv"

	"ledgework/terrain/internal/decimal"
)

// blanks is the separator of files that put any number of blanks or tabs
// between their numbers. The other separators are ',', ';' and '\t'.
const blanks = ' '

// nextCell splits off the first cell of a trimmed line, without blanks and
// quotes around it. It reports false when nothing is left, not even an empty
// cell: one separator at the end of a line counts for nothing.
func nextCell(b []byte, sep byte) (cell, rest []byte, ok bool) {
	if len(b) == 0 {
		return nil, nil, false
	}
	if sep == blanks {
		i := 0
		for i < len(b) && !isBlank(b[i]) {
			i++
		}
		cell = b[:i]
		for i < len(b) && isBlank(b[i]) {
			i++
		}
		return unquote(cell), b[i:], true
	}
	i := bytes.IndexByte(b, sep)
	if i >= 0 && bytes.HasPrefix(trim(b), []byte{'"'}) {
		i = bareIndex(b, sep)
	}
	if i < 0 {
		return unquote(trim(b)), nil, true
	}
	return unquote(trim(b[:i])), b[i+1:], true
}

// bareIndex is the place of the first c that doesn't stand between quotes, -1
// for none. A quote without a partner is no quote.
func bareIndex(b []byte, c byte) int {
	quoted := false
	for i, v := range b {
		switch {
		case v == '"':
			quoted = !quoted
		case v == c && !quoted:
			return i
		}
	}
	if quoted {
		return bytes.IndexByte(b, c)
	}
	return -1
}

func unquote(b []byte) []byte {
	if len(b) >= 2 && b[0] == '"' && b[len(b)-1] == '"' {
		return b[1 : len(b)-1]
	}
	return b
}

func cells(line []byte, sep byte) [][]byte {
	var out [][]byte
	for {
		cell, rest, ok := nextCell(line, sep)
		if !ok {
			return out
		}
		out = append(out, cell)
		line = rest
	}
}

// separator tells what stands between the cells of a line.
func separator(line []byte) byte {
	if bareIndex(line, ';') >= 0 {
		return ';'
	}
	if bareIndex(line, ',') >= 0 && !decimalCommas(line) {
		return ','
	}
	if bytes.IndexByte(line, '\t') >= 0 {
		// A tab may also be one blank of many.
		for _, c := range cells(line, '\t') {
			if bytes.IndexByte(c, ' ') >= 0 {
				return blanks
			}
		}
		return '\t'
	}
	return blanks
}

// decimalCommas reports whether a line is at least three numbers with decimal
// commas between blanks or tabs.
func decimalCommas(line []byte) bool {
	c := cells(line, blanks)
	for _, v := range c {
		if !hasDecimalComma(v) && !isNumber(v) {
			return false
		}
	}
	return len(c) >= 3 && (hasDecimalComma(c[0]) || hasDecimalComma(c[1]) || hasDecimalComma(c[2]))
}

// hasDecimalComma reports whether b would be a number with a point in place of
// its comma.
func hasDecimalComma(b []byte) bool {
	i := bytes.IndexByte(b, ',')
	if i < 0 || i+1 == len(b) || b[i+1] < '0' || b[i+1] > '9' {
		return false
	}
	return isNumber(append(append(append([]byte(nil), b[:i]...), '.'), b[i+1:]...))
}

func isNumber(b []byte) bool {
	_, ok := decimal.Parse(b)
	return ok
}

// numbers counts the leading cells that are numbers.
func numbers(c [][]byte) int {
	for i, v := range c {
		if !isNumber(v) {
			return i
		}
	}
	return len(c)
}

// count reads a line that is nothing but a whole number that is not negative.
func count(line []byte) (int64, bool) {
	for _, c := range line {
		if c < '0' || c > '9' {
			return 0, false
		}
	}
	n, err := strconv.ParseInt(string(line), 10, 64)
	return n, err == nil
}
