package main

import (
	"cmp"
	"context"
	"math"

	"ledgework/fit"
	"ledgework/terrain/gdal"
	"ledgework/terrain/grid"
)

// Slopes are how steep and rugged an elevation grid is, over the cells that have
// eight neighbours.
type Slopes struct {
	Method       string  `json:"method"`
	Cells        int64   `json:"cells"` // those with all eight neighbours; the others are left out
	P10Deg       float64 `json:"p10_deg"`
	MedianDeg    float64 `json:"median_deg"`
	P90Deg       float64 `json:"p90_deg"`
	MaxDeg       float64 `json:"max_deg"`
	Above45      float64 `json:"share_above_45_deg"`
	Above60      float64 `json:"share_above_60_deg"`
	RuggednessM  float64 `json:"ruggedness_median_m"`
	RuggednessBy string  `json:"ruggedness_method"`
}

// slopesOf reads the grid at path once more, three rows at a time. Its positions
// are in the given CRS, as WKT, or in metres where that is empty. It is nil where
// no cell has eight neighbours.
func slopesOf(ctx context.Context, path string, opts grid.Options, crs string) (*Slopes, error) {
	rows, err := grid.OpenRows(path, opts)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	u, err := unitsOf(crs, cmp.Or(opts.CRS, rows.Header().CRS))
	if err != nil {
		return nil, err
	}
	width, height := rows.Size()
	var p fit.GridProfile
	last := [3][]float64{make([]float64, width), make([]float64, width), make([]float64, width)}
	along, across := rows.CellSize()
	for r := range height {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		last = [3][]float64{last[1], last[2], last[0]}
		if err := rows.Read(r, last[2]); err != nil {
			return nil, err
		}
		for i := range last[2] {
			last[2][i] *= u.vertical
		}
		if r >= 2 {
			_, y := rows.Cell(width/2, r-1)
			east, north := u.metres(y)
			p.Add(last[0], last[1], last[2], along*east, across*north)
		}
	}
	return summed(&p), nil
}

func summed(p *fit.GridProfile) *Slopes {
	if p.Cells() == 0 {
		return nil
	}
	s := &Slopes{Method: "Horn 1981", RuggednessBy: "Riley, DeGloria & Elliot 1999", Cells: p.Cells(), Above45: p.SteeperThan(45), Above60: p.SteeperThan(60)}
	for q, v := range map[float64]*float64{0.1: &s.P10Deg, 0.5: &s.MedianDeg, 0.9: &s.P90Deg, 1: &s.MaxDeg} {
		*v, _ = p.SlopeDeg(q)
	}
	s.RuggednessM, _ = p.RuggednessM(0.5)
	return s
}

// units are those of a grid: metres to a unit of height and, unless it is in
// degrees, of position.
type units struct {
	degrees              bool
	horizontal, vertical float64
}

// unitsOf are the units of positions in the CRS horizontal, and of the heights
// that a grid delivers whose CRS, given or the file's, is own: in its vertical
// unit, else in its horizontal one. Either may be empty.
func unitsOf(horizontal, own string) (units, error) {
	u := units{horizontal: 1, vertical: 1}
	if horizontal != "" {
		c, err := gdal.ParseCRS(horizontal)
		if err != nil {
			return u, err
		}
		defer c.Close()
		u.degrees = c.IsGeographic()
		if _, m := c.LinearUnit(); m > 0 {
			u.horizontal = m
		}
	}
	if own != "" {
		c, err := gdal.ParseCRS(own)
		if err != nil {
			return u, err
		}
		defer c.Close()
		if _, m := c.LinearUnit(); m > 0 {
			u.vertical = m
		}
		if _, m := c.VerticalUnit(); m > 0 {
			u.vertical = m
		}
	}
	return u, nil
}

// metres are the lengths of a unit of position east and north at northing or
// latitude y: of a degree, on the ellipsoid of WGS 84, which others differ from
// by less than 0.1 %.
func (u units) metres(y float64) (east, north float64) {
	if !u.degrees {
		return u.horizontal, u.horizontal
	}
	const (
		a  = 6378137.0           // semi-major axis, m
		e2 = 0.00669437999014132 // first eccentricity squared
	)
	sin, cos := math.Sincos(y * math.Pi / 180)
	w := 1 - e2*sin*sin
	return math.Pi / 180 * a * cos / math.Sqrt(w), math.Pi / 180 * a * (1 - e2) / (w * math.Sqrt(w))
}
