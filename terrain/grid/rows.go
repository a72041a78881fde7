package grid

import (
	"math"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// Rows reads an elevation grid row by row, for what needs a cell's neighbours.
// It is used by one goroutine at a time.
type Rows struct {
	r     *reader
	valid []uint8
}

// OpenRows opens the elevation grid at path, as Open does.
func OpenRows(path string, opts Options) (*Rows, error) {
	if err := opts.Validate(); err != nil {
		return nil, err
	}
	ds, err := gdal.Open(path)
	if err != nil {
		return nil, err
	}
	r := &reader{path: path, ds: ds}
	if err := r.start(opts); err != nil {
		_ = ds.Close()
		return nil, err
	}
	return &Rows{r: r}, nil
}

// Header is what the file says of itself.
func (r *Rows) Header() *terrain.Header { return &r.r.header }

// Size is the number of columns and of rows.
func (r *Rows) Size() (columns, rows int) { return r.r.ds.Size() }

// Cell is the centre of a cell in the units of the file's CRS.
func (r *Rows) Cell(column, row int) (x, y float64) {
	t := &r.r.transform
	c, l := float64(column)+0.5, float64(row)+0.5
	return t[0] + c*t[1] + l*t[2], t[3] + c*t[4] + l*t[5]
}

// CellSize is the size of a cell along its row and along its column, in the
// units of the file's CRS.
func (r *Rows) CellSize() (along, across float64) {
	t := &r.r.transform
	return math.Hypot(t[1], t[4]), math.Hypot(t[2], t[5])
}

// Read fills dst, as long as a row, with the heights of one row, in the
// vertical unit that Open tells; NaN where a cell has none. It panics for a row
// that the grid does not have.
func (r *Rows) Read(row int, dst []float64) error {
	if len(r.valid) < len(dst) {
		r.valid = make([]uint8, len(dst))
	}
	if err := r.r.band.ReadMasked(0, row, len(dst), 1, dst, r.valid); err != nil {
		return err
	}
	for i := range dst {
		h := r.r.scale*dst[i] + r.r.offset
		if r.valid[i] == 0 || !(math.Abs(h) < maxHeight) {
			h = math.NaN()
		}
		dst[i] = h
	}
	return nil
}

// Close closes the file.
func (r *Rows) Close() error { return r.r.Close() }
