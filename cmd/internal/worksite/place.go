package worksite

import (
	"errors"
	"fmt"
	"strings"

	"ledgework/export"
	"ledgework/terrain"
	"ledgework/terrain/gdal"
	"ledgework/terrain/survey"
)

// checkCRS makes sure that the CRSs of the file can be understood, so that a
// slip in them is an error of the worksite and not of the survey.
func (w *Worksite) checkCRS() error {
	if w.CRS != auto {
		projected, err := parseCRS(w.CRS)
		if err != nil {
			return w.at("$.crs", err.Error(), "write auto, EPSG:n, WKT or PROJJSON")
		}
		if !projected {
			return w.at("$.crs", fmt.Sprintf("%q is no projected CRS, so its units are not metres", w.CRS), "write auto, and the CRS of the coordinates with the surveys")
		}
	}
	for i := range w.Surveys {
		if text := w.Surveys[i].CRS; text != "" {
			if _, err := parseCRS(text); err != nil {
				return w.at(fmt.Sprintf("$.surveys[%d].crs", i), err.Error(), "write EPSG:n, WKT or PROJJSON")
			}
		}
	}
	return nil
}

func parseCRS(text string) (projected bool, err error) {
	c, err := gdal.ParseCRS(text)
	var bad *terrain.FormatError
	if errors.As(err, &bad) {
		return false, fmt.Errorf("%q: %s", text, bad.Reason)
	}
	if err != nil {
		return false, err
	}
	defer c.Close()
	return c.IsProjected(), nil
}

// siteCRS is the working CRS as the layers describe it.
func siteCRS(f *survey.Frame) export.CRS {
	c := export.CRS{Name: f.Name, WKT: f.CRS, Vertical: f.VerticalName}
	c.Authority, c.Code, _ = strings.Cut(f.AuthorityCode, ":")
	return c
}

// A projector brings working coordinates to WGS 84. Heights stay as surveyed:
// they refer to the survey's vertical datum in every layer.
type projector struct {
	*gdal.Transform
}

// newProjector returns the projector of a working CRS, or nil for local
// coordinates. The caller closes it.
func newProjector(c export.CRS) (*projector, error) {
	if c.Local() {
		return nil, nil
	}
	from, err := gdal.ParseCRS(c.WKT)
	if err != nil {
		return nil, err
	}
	defer from.Close()
	to, err := gdal.ParseCRS("EPSG:4326")
	if err != nil {
		return nil, err
	}
	defer to.Close()
	t, err := gdal.NewTransform(from, to)
	if err != nil {
		return nil, err
	}
	return &projector{t}, nil
}

// ToWGS84 implements export.Projector.
func (p *projector) ToWGS84(x, y, _ []float64) error { return p.Apply(x, y, nil) }
