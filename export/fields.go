package export

import (
	"bytes"
	"fmt"
	"io"
	"strings"
)

// A FieldType is the type of a property.
type FieldType string

// The types of properties.
const (
	Text    FieldType = "text"
	Integer FieldType = "integer"
	Real    FieldType = "real"
	Boolean FieldType = "boolean"
)

// FullPrecision as Field.Decimals asks for the fewest digits that read back as
// the same 64 bit number.
const FullPrecision = -1

// A Field describes one property of a layer's features.
type Field struct {
	Name     string
	Type     FieldType
	Unit     string // empty for pure numbers and text
	Decimals int    // digits kept after the point of a Real, or FullPrecision
	Range    string // values that can occur
	Null     string // what null says; empty if the property is never null
	Meaning  string
}

// A Layer describes a set of features of one kind.
type Layer struct {
	Name    string // also the file's name
	Title   string
	Meaning string
	Fields  []Field
}

// Dictionary describes every property of every layer, in the order written.
func Dictionary() []Layer {
	return []Layer{
		describe(obstacleLayer(), obstacleColumns()),
		describe(patchLayer(), patchColumns()),
		describe(zoneLayer(), zoneColumns()),
		describe(siteLayer(), siteColumns()),
	}
}

// describe returns the layer with the fields of the columns.
func describe[T any](l Layer, columns []column[T]) Layer {
	l.Fields = make([]Field, len(columns))
	for i := range columns {
		l.Fields[i] = columns[i].Field
	}
	return l
}

// A column is a field and how to get its value from a row.
type column[T any] struct {
	Field
	value func(*T) any // string, int64, float64, bool or nil
}

// values returns a row's value in each column.
func values[T any](row *T, columns []column[T]) []any {
	out := make([]any, len(columns))
	for i := range columns {
		out[i] = columns[i].value(row)
	}
	return out
}

// WriteDictionaryMarkdown writes Dictionary as a Markdown document.
func WriteDictionaryMarkdown(w io.Writer) error {
	var b bytes.Buffer
	b.WriteString("<!-- Code generated from the layers of package export. DO NOT EDIT. -->\n\n# Properties of the layers\n\n")
	fmt.Fprintf(&b, "%s\n\n", Caution)
	b.WriteString("Lengths are metres, angles degrees, azimuths clockwise from grid north. East, north and height are those of the\n" +
		"working CRS, which layer `site` names. A number is written with at most the digits given after the point; \"full\" means\n" +
		"the fewest digits that read back as the same 64 bit number. Names are kept from version to version: a changed name\n" +
		"would be noted here.\n")
	for _, l := range Dictionary() {
		fmt.Fprintf(&b, "\n## %s (`%s`)\n\n%s\n\n", l.Title, l.Name, l.Meaning)
		b.WriteString("| property | type | unit | digits | values | null | meaning |\n|---|---|---|---|---|---|---|\n")
		for _, f := range l.Fields {
			fmt.Fprintf(&b, "| `%s` | %s | %s | %s | %s | %s | %s |\n", f.Name, f.Type, f.Unit, f.digits(), cell(f.Range), cell(f.Null), cell(f.Meaning))
		}
	}
	if _, err := b.WriteTo(w); err != nil {
		return fmt.Errorf("export: data dictionary: %w", err)
	}
	return nil
}

// digits says how a Real is rounded.
func (f Field) digits() string {
	switch {
	case f.Type != Real:
		return ""
	case f.Decimals == FullPrecision:
		return "full"
	}
	return fmt.Sprint(f.Decimals)
}

// cell makes text fit into a Markdown table.
func cell(s string) string { return strings.ReplaceAll(s, "|", "\\|") }
