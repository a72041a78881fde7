package grid

import (
	"fmt"
	"strings"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// chooseBand returns the band to read and, where the choice was a guess, a note
// that says so.
func chooseBand(ds *gdal.Dataset, path string, want int) (*gdal.Band, string, error) {
	n := ds.Bands()
	if n == 0 {
		return nil, "", &terrain.FormatError{Format: "grid", Place: path, Reason: "the file has no raster band"}
	}
	if want > n {
		return nil, "", &terrain.FormatError{Format: "grid", Place: path, Reason: fmt.Sprintf("there is no band %d", want),
			Remedy: fmt.Sprintf("choose one of 1 to %d", n)}
	}
	if want > 0 {
		b, err := ds.Band(want)
		return b, "", err
	}
	var data []*gdal.Band
	for i := range n {
		b, err := ds.Band(i + 1)
		if err != nil {
			return nil, "", err
		}
		if !b.Alpha() {
			data = append(data, b)
		}
	}
	switch len(data) {
	case 0:
		return nil, "", &terrain.FormatError{Format: "grid", Place: path, Reason: "the file has no band but transparency"}
	case 1:
		return data[0], "", nil
	}
	for _, b := range data {
		if namesElevation(b.Description()) {
			return b, fmt.Sprintf("band %d of %d, %q, is taken for the elevation", b.Number(), n, b.Description()), nil
		}
	}
	var lengths []*gdal.Band
	for _, b := range data {
		if _, ok := unitMetres(b.Unit()); ok {
			lengths = append(lengths, b)
		}
	}
	if len(lengths) == 1 {
		b := lengths[0]
		return b, fmt.Sprintf("band %d of %d, in %q, is taken for the elevation", b.Number(), n, b.Unit()), nil
	}
	b := data[0]
	return b, fmt.Sprintf("none of the %d bands says that it is the elevation: band %d is taken for it", n, b.Number()), nil
}

// namesElevation reports whether a band's name says that it holds heights.
func namesElevation(name string) bool {
	name = strings.ToLower(strings.TrimSpace(name))
	if name == "z" || name == "h" {
		return true
	}
	for _, word := range []string{"elev", "height", "altitude", "dem", "dtm", "dsm", "dgm", "dom"} {
		if at := strings.Index(name, word); at >= 0 && (at == 0 || !isLetter(name[at-1])) {
			return true
		}
	}
	return false
}

func isLetter(c byte) bool { return c >= 'a' && c <= 'z' }

// unitMetres is the length in metres of a unit of height as bands spell it, and
// whether it is one of those known. Feet without a country are international
// ones; the two differ by 2 parts per million, 6 mm in 3000 m.
func unitMetres(unit string) (float64, bool) {
	const (
		foot       = 0.3048
		surveyFoot = 1200.0 / 3937
	)
	switch strings.ToLower(strings.TrimSpace(unit)) {
	case "m", "metre", "metres", "meter", "meters":
		return 1, true
	case "ft", "foot", "feet", "international foot", "international feet":
		return foot, true
	case "us-ft", "ftus", "us_ft", "us ft", "us survey foot", "us survey feet", "us_survey_foot", "us survey ft",
		"foot_us", "sft", "survey foot", "survey feet", "u.s. survey foot", "u.s. survey feet":
		return surveyFoot, true
	case "cm", "centimetre", "centimetres", "centimeter", "centimeters":
		return 0.01, true
	case "mm", "millimetre", "millimetres", "millimeter", "millimeters":
		return 0.001, true
	case "dm", "decimetre", "decimetres", "decimeter", "decimeters":
		return 0.1, true
	case "km", "kilometre", "kilometres", "kilometer", "kilometers":
		return 1000, true
	}
	return 0, false
}
