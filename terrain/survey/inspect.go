package survey

import (
	"context"

	"ledgework/terrain"
)

// A Summary is what Inspect found in one survey file.
type Summary struct {
	Path     string `json:"path"`
	Format   string `json:"format"`
	Bytes    int64  `json:"bytes"`
	Date     string `json:"date,omitempty"`     // YYYY-MM-DD, as the file has it
	Producer string `json:"producer,omitempty"` // as the file has it

	Promised  int64      `json:"points_promised"` // by the header, -1 if it doesn't say
	Points    int64      `json:"points"`          // read
	NotFinite int64      `json:"points_not_finite"`
	Min       [3]float64 `json:"min"`  // of the finite points, in the units of the CRS
	Max       [3]float64 `json:"max"`  // likewise
	Step      [3]float64 `json:"step"` // resolution of stored coordinates, 0 where unknown

	CRS     CRSSummary   `json:"crs"`
	Working FrameSummary `json:"working"`

	// Unusable says why the file can't be worked with as it is; the figures
	// in metres are then zero.
	Unusable string `json:"unusable,omitempty"`

	Density float64 `json:"density_per_m2"`   // points per m² of plan cells of 1 m that hold any
	Spacing float64 `json:"median_spacing_m"` // see MedianSpacing

	Cell        float64 `json:"cell,omitempty"`         // of a grid, in units of the CRS
	CellM       float64 `json:"cell_m,omitempty"`       // of a grid, see Frame.GridCell
	NodataShare float64 `json:"nodata_share,omitempty"` // of a grid's cells

	Classes   []ClassCount  `json:"classes"`
	Returns   []ReturnCount `json:"returns"`
	Flags     FlagCounts    `json:"flags"`
	Intensity *[2]uint16    `json:"intensity,omitempty"` // least and largest; nil without intensity
	Color     bool          `json:"color"`

	Defects []terrain.Defect `json:"defects"`
	Notes   []string         `json:"notes"` // oddities, and what was assumed
}

// A CRSSummary says what a file's coordinates are.
type CRSSummary struct {
	Name         string  `json:"name,omitempty"` // of the horizontal part; empty if there is no CRS
	Code         string  `json:"code,omitempty"` // "EPSG:32633"
	Unit         string  `json:"unit,omitempty"` // of horizontal coordinates
	VerticalName string  `json:"vertical_name,omitempty"`
	VerticalUnit float64 `json:"vertical_unit_m,omitempty"` // metres per unit of height
	WKT          string  `json:"wkt,omitempty"`             // of the horizontal part
}

// A FrameSummary says in which CRS a file by itself would be worked.
type FrameSummary struct {
	Name  string     `json:"name,omitempty"`
	Code  string     `json:"code,omitempty"`
	Local bool       `json:"local"`
	Min   [3]float64 `json:"min"` // of the points, metres
	Max   [3]float64 `json:"max"`
}

// A ClassCount says how many points have a class.
type ClassCount struct {
	Class uint8  `json:"class"`
	Name  string `json:"name"`
	Count int64  `json:"count"`
}

// A ReturnCount says how many points are a certain return of a pulse with a
// certain number of returns; 0 is unknown.
type ReturnCount struct {
	Return uint8 `json:"return"`
	Of     uint8 `json:"of"`
	Count  int64 `json:"count"`
}

// FlagCounts say how many points carry a flag.
type FlagCounts struct {
	Synthetic int64 `json:"synthetic"`
	KeyPoint  int64 `json:"key_point"`
	Withheld  int64 `json:"withheld"`
	Overlap   int64 `json:"overlap"`
}

// Inspect reads a survey file from end to end and says what is in it. A file
// whose coordinates make no site is no error but Summary.Unusable.
func Inspect(ctx context.Context, path string, opts Options) (*Summary, error) {
	src := Source{Path: path, CRS: opts.CRS, Tolerant: opts.Tolerant, Band: opts.Band}
	p, err := look(ctx, src, make(systems))
	if err != nil {
		return nil, err
	}
	f, err := open(path, opts)
	if err != nil {
		return nil, err
	}
	s, err := inspect(ctx, p, f)
	if closed := f.Close(); err == nil {
		err = closed
	}
	if err != nil {
		return nil, err
	}
	return s, nil
}

// inspect is Inspect on an open reader.
func inspect(ctx context.Context, p *probe, r terrain.Reader) (*Summary, error) {
	h := r.Header()
	s := &Summary{
		Path: p.src.Path, Format: h.Format, Bytes: h.Bytes, Date: h.Date, Producer: h.Producer,
		Promised: h.Points, Step: h.Step, Cell: h.Cell, Color: h.Columns.Has(terrain.Color),
		Classes: []ClassCount{}, Returns: []ReturnCount{}, Defects: []terrain.Defect{}, Notes: []string{},
	}
	c := newCensus(h)
	frame, err := choose([]*probe{p}, "auto")
	if err == nil {
		c.place, err = frame.Transformer(p.src)
	}
	switch {
	case err != nil:
		s.Unusable = err.Error()
		s.Notes = append(s.Notes, gatherNotes([]*probe{p})...)
	default:
		defer c.place.Close()
		c.sample = newSample(frame)
		s.Notes = append(s.Notes, frame.Notes...)
		s.CellM = frame.GridCell
		s.Working = FrameSummary{Name: frame.Name, Code: frame.AuthorityCode, Local: frame.Local}
	}
	if sys := p.system; sys.name != "" {
		s.CRS = CRSSummary{Name: sys.name, Code: sys.code, Unit: sys.unitName, VerticalName: sys.heights, VerticalUnit: sys.vertical, WKT: sys.wkt}
		if sys.kind == geographic {
			s.CRS.Unit = "degree"
		}
	}
	if err := c.read(ctx, r); err != nil {
		return nil, err
	}
	c.fill(s, legacyClasses(h.Format))
	s.Defects = append(s.Defects, r.Defects()...)
	return s, nil
}
