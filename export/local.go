package export

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"strconv"
)

// WriteCSV writes a layer as comma-separated text (RFC 4180) in working
// coordinates. The first column, WKT, is the plan outline with the height of
// the ground as third coordinate; the others are the layer's fields. Null is
// the empty text.
func WriteCSV(w io.Writer, t *Table) error {
	out := csv.NewWriter(w)
	record := make([]string, 1, 1+len(t.Fields))
	record[0] = "WKT"
	for _, f := range t.Fields {
		record = append(record, f.Name)
	}
	if err := out.Write(record); err != nil {
		return fmt.Errorf("export: layer %s: %w", t.Name, err)
	}
	var buf []byte
	for i := range t.Features {
		buf = appendWKT(buf[:0], t.shape(i, false))
		record = append(record[:0], string(buf))
		for j, v := range t.Features[i].Values {
			record = append(record, csvValue(v, t.Fields[j].Decimals))
		}
		if err := out.Write(record); err != nil {
			return fmt.Errorf("export: layer %s: %s: %w", t.Name, t.Features[i].ID, err)
		}
	}
	out.Flush()
	if err := out.Error(); err != nil {
		return fmt.Errorf("export: layer %s: %w", t.Name, err)
	}
	return nil
}

// WriteCSVTypes writes the column types that GDAL's CSV driver looks for in a
// file beside the table, of the same name with the ending .csvt.
func WriteCSVTypes(w io.Writer, l Layer) error {
	var b bytes.Buffer
	b.WriteString(`"WKT"`)
	for _, f := range l.Fields {
		switch f.Type {
		case Integer:
			b.WriteString(`,"Integer64"`)
		case Real:
			b.WriteString(`,"Real"`)
		case Boolean:
			b.WriteString(`,"Integer(Boolean)"`)
		default:
			b.WriteString(`,"String"`)
		}
	}
	b.WriteString("\n")
	if _, err := b.WriteTo(w); err != nil {
		return fmt.Errorf("export: types of layer %s: %w", l.Name, err)
	}
	return nil
}

// appendWKT appends a shape as ISO well-known text.
func appendWKT(b []byte, s shape) []byte {
	b = append(b, "MULTIPOLYGON Z ("...)
	for i, polygon := range s {
		b = appendComma(b, i)
		b = append(b, '(')
		for j, r := range polygon {
			b = appendComma(b, j)
			b = append(b, '(')
			for k, v := range r {
				b = appendComma(b, k)
				b = appendNumber(b, v.E, metreDigits, "nan")
				b = append(b, ' ')
				b = appendNumber(b, v.N, metreDigits, "nan")
				b = append(b, ' ')
				b = appendNumber(b, v.H, heightDecimals, "nan")
			}
			b = append(b, ')')
		}
		b = append(b, ')')
	}
	return append(b, ')')
}

func appendComma(b []byte, i int) []byte {
	if i > 0 {
		b = append(b, ',')
	}
	return b
}

func csvValue(v any, decimals int) string {
	switch v := v.(type) {
	case nil:
		return ""
	case string:
		return v
	case bool:
		if v {
			return "1" // GDAL's boolean columns are 0 and 1
		}
		return "0"
	case int64:
		return strconv.FormatInt(v, 10)
	case float64:
		return string(appendNumber(nil, v, decimals, ""))
	default:
		panic(fmt.Sprintf("export: value of type %T", v))
	}
}
