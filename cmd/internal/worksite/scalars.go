package worksite

import (
	"encoding/json"
	"fmt"
	"math"
	"strconv"
	"strings"

	"github.com/goccy/go-yaml"
	"github.com/goccy/go-yaml/ast"
)

// UnmarshalYAML reads auto or a positive number.
func (l *AutoLength) UnmarshalYAML(n ast.Node) error {
	if s, ok := n.(*ast.StringNode); ok && s.Value == "auto" {
		*l = 0
		return nil
	}
	var v float64
	if err := yaml.NodeToValue(n, &v); err != nil || !(v > 0) || math.IsInf(v, 0) {
		return errorAt(n, fmt.Sprintf("%s is neither auto nor a positive number", text(n)), "write a length in metres, or auto")
	}
	*l = AutoLength(v)
	return nil
}

// MarshalJSON writes "auto" or the number.
func (l AutoLength) MarshalJSON() ([]byte, error) {
	if l == 0 {
		return []byte(`"auto"`), nil
	}
	return json.Marshal(float64(l))
}

// String is auto or the number.
func (l AutoLength) String() string {
	if l == 0 {
		return "auto"
	}
	return strconv.FormatFloat(float64(l), 'f', -1, 64)
}

// UnmarshalYAML reads [E, N, H].
func (p *Point) UnmarshalYAML(n ast.Node) error {
	v, err := numbers(n, len(p))
	if err != nil {
		return errorAt(n, err.Error(), "write [E, N, H] in metres of the working CRS")
	}
	copy(p[:], v)
	return nil
}

// UnmarshalYAML reads a file name or [Emin, Nmin, Emax, Nmax].
func (c *Crop) UnmarshalYAML(n ast.Node) error {
	const remedy = "write a polygon file, or [Emin, Nmin, Emax, Nmax] in metres of the working CRS"
	if s, ok := n.(*ast.StringNode); ok && s.Value != "" {
		*c = Crop{File: s.Value}
		return nil
	}
	v, err := numbers(n, len(c.Box))
	if err != nil {
		return errorAt(n, err.Error(), remedy)
	}
	*c = Crop{Box: [4]float64(v)}
	if !(c.Box[0] < c.Box[2] && c.Box[1] < c.Box[3]) {
		return errorAt(n, "the box is empty: its minima are not below its maxima", remedy)
	}
	return nil
}

// MarshalJSON writes what the YAML says.
func (c *Crop) MarshalJSON() ([]byte, error) {
	if c.File != "" {
		return json.Marshal(c.File)
	}
	return json.Marshal(c.Box)
}

// numbers reads a list of n finite numbers.
func numbers(node ast.Node, n int) ([]float64, error) {
	if _, ok := node.(*ast.SequenceNode); !ok {
		return nil, fmt.Errorf("%s is not a list of %d numbers", text(node), n)
	}
	var v []float64
	if err := yaml.NodeToValue(node, &v); err != nil || len(v) != n {
		return nil, fmt.Errorf("%s is not a list of %d numbers", text(node), n)
	}
	for _, x := range v {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return nil, fmt.Errorf("%s is not finite", text(node))
		}
	}
	return v, nil
}

// text is the source of a node, cut to what fits an error message.
func text(n ast.Node) string {
	const longest = 40
	s := strconv.Quote(n.String())
	if len(s) > longest {
		s = s[:longest-4] + `…"`
	}
	return s
}

// MarshalJSON writes a list of numbers, where encoding/json would write base64.
func (c Classes) MarshalJSON() ([]byte, error) {
	return []byte(c.String()), nil
}

// String is the classes as a YAML or JSON list.
func (c Classes) String() string {
	return "[" + strings.Trim(strings.ReplaceAll(fmt.Sprint([]uint8(c)), " ", ", "), "[]") + "]"
}
