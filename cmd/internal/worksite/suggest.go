package worksite

import (
	"reflect"
	"strings"
)

// keys appends the YAML keys of struct t and of the structs below it to dst.
func keys(t reflect.Type, dst []string) []string {
	switch t.Kind() {
	case reflect.Pointer, reflect.Slice:
		return keys(t.Elem(), dst)
	case reflect.Struct:
		for i := range t.NumField() {
			f := t.Field(i)
			if !f.IsExported() {
				continue
			}
			if name, _, _ := strings.Cut(f.Tag.Get("yaml"), ","); name != "" {
				dst = append(dst, name)
			}
			dst = keys(f.Type, dst)
		}
	}
	return dst
}

// nearest returns the name that differs from s by the fewest single-letter
// edits, or "" if none is close: up to a third of its letters, as a slip of
// the fingers or a forgotten unit is.
func nearest(s string, names []string) string {
	best, at := "", len(s)+1
	for _, n := range names {
		d := edits(strings.ToLower(s), n)
		if d < at && d <= max(2, len(n)/3) {
			best, at = n, d
		}
		// A key without its unit: bulge_height for bulge_height_m.
		if s != "" && strings.HasPrefix(n, s+"_") && at > 1 {
			best, at = n, 1
		}
	}
	return best
}

// edits is the Levenshtein distance between a and b, in bytes.
func edits(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			d := diagonal
			if a[i] != b[j] {
				d++
			}
			diagonal = row[j+1]
			row[j+1] = min(d, row[j]+1, diagonal+1)
		}
	}
	return row[len(b)]
}
