package grid

import (
	"cmp"
	"fmt"
	"io"
	"math"
	"os"
	"sync/atomic"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// maxBlockBytes is the largest block that is decoded: GDAL does so in memory as
// a whole, and a survey must not take more than a small part of a laptop's.
const maxBlockBytes = 512 << 20

// A reader is the terrain.Reader of one grid.
type reader struct {
	path      string
	ds        *gdal.Dataset
	band      *gdal.Band
	header    terrain.Header
	transform [6]float64
	// A height is scale·stored + offset, in the vertical unit of the CRS.
	scale, offset float64
	// numberNoData: the file marks missing cells by a number, so that a NaN
	// among the others is damage and not another missing cell.
	numberNoData bool

	windows            windows
	values             []float64
	valid              []uint8
	x, y, w, h         int // the window in values
	at                 int // the next cell of it
	done               int64
	consumed           atomic.Int64
	notHeight          int64
	firstRow, firstCol int
}

// Open opens the elevation grid at path. Heights are delivered in the vertical
// unit of the CRS, the file's own or the given one, or if it has none in its horizontal unit, or if that
// is degrees or unknown in metres: a band that states another unit is converted
// and a note in the header says so. Cells that hold the nodata value, are
// masked out or not finite give no point.
//
// It fails with a terrain.FormatError for a file that is no raster, has no such
// band, or no geotransform to place its cells with.
func Open(path string, opts Options) (terrain.Reader, error) {
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
	return r, nil
}

func (r *reader) start(opts Options) error {
	band, note, err := chooseBand(r.ds, r.path, opts.Band)
	if err != nil {
		return err
	}
	r.band = band
	r.note(note)
	r.note(r.ds.Warnings())
	if err := r.place(); err != nil {
		return err
	}
	if err := r.heights(opts.CRS); err != nil {
		return err
	}
	if n := band.BlockBytes(); n > maxBlockBytes {
		w, h := band.BlockSize()
		return &terrain.UnsupportedError{Format: "grid", Feature: fmt.Sprintf("%s: a raster stored in blocks of %d × %d cells (%d MB each)", r.path, w, h, n>>20),
			Remedy: "write it again in tiles, with the creation option TILED=YES of a GeoTIFF"}
	}
	width, height := r.ds.Size()
	h := &r.header
	h.Format = fmt.Sprintf("elevation grid (%s, %d × %d)", r.ds.Driver(), width, height)
	h.CRS = r.ds.CRS()
	h.Points = -1
	if band.AllValid() && band.Integer() {
		h.Points = int64(width) * int64(height)
	}
	if info, err := os.Stat(r.path); err == nil && info.Mode().IsRegular() {
		h.Bytes = info.Size()
	}
	if date, ok := r.ds.Metadata("TIFFTAG_DATETIME"); ok {
		h.Date = isoDate(date)
	}
	h.Producer, _ = r.ds.Metadata("TIFFTAG_SOFTWARE")
	nodata, has := band.NoData()
	r.numberNoData = has && isFinite(nodata)
	blockW, blockH := band.BlockSize()
	r.windows = newWindows(width, height, blockW, blockH)
	r.values = make([]float64, r.windows.windowW*r.windows.stepH)
	r.valid = make([]uint8, len(r.values))
	return nil
}

func (r *reader) note(text string) {
	if text != "" {
		r.header.Notes = append(r.header.Notes, text)
	}
}

// place reads the geotransform.
func (r *reader) place() error {
	t, ok := r.ds.GeoTransform()
	if !ok {
		e := &terrain.FormatError{Format: "grid", Place: r.path, Reason: "the raster says nowhere where its cells lie (no geotransform)",
			Remedy: "put a world file beside it, or write it again with a georeference"}
		if n := r.ds.GroundControlPoints(); n > 0 {
			e.Reason = fmt.Sprintf("the raster has %d ground control points but no geotransform", n)
			e.Remedy = "resample it to a north-up grid first, as gdalwarp does"
		}
		return e
	}
	along, across := math.Hypot(t[1], t[4]), math.Hypot(t[2], t[5])
	area := math.Abs(t[1]*t[5] - t[2]*t[4])
	sum := t[0] + t[3] + along + across
	if !isFinite(sum) || !(area > 0) {
		return &terrain.FormatError{Format: "grid", Place: r.path, Reason: fmt.Sprintf("the geotransform %v gives cells no area", t),
			Remedy: "write it again with a georeference"}
	}
	r.transform = t
	r.header.Cell = math.Sqrt(along * across)
	if math.Abs(along-across) > squareTolerance*max(along, across) {
		r.note(fmt.Sprintf("cells are not square: %g × %g", along, across))
	}
	if t[2] != 0 || t[4] != 0 {
		r.note(fmt.Sprintf("the grid is turned: its rows run %.4g° off the first axis", math.Atan2(t[4], t[1])*180/math.Pi))
	}
	return nil
}

// squareTolerance is the relative difference of a cell's sides below which it is
// called square: geographic grids store their cell size with six or more digits
// and need not round both sides alike.
const squareTolerance = 1e-5

// heights finds the factor and summand of heights, given what takes the place
// of the file's CRS, if anything does.
func (r *reader) heights(given string) error {
	if r.band.Complex() {
		return &terrain.UnsupportedError{Format: "grid", Feature: fmt.Sprintf("%s: a band of complex numbers (%s)", r.path, r.band.DataType()),
			Remedy: "choose a band of real numbers"}
	}
	r.scale, r.offset = r.band.ScaleOffset()
	if r.scale == 0 || !isFinite(r.scale) || !isFinite(r.offset) {
		return &terrain.FormatError{Format: "grid", Place: r.path, Reason: fmt.Sprintf("heights are scaled by %g and offset by %g", r.scale, r.offset)}
	}
	if metres, ok := unitMetres(r.band.Unit()); ok {
		unit, name, err := heightUnit(cmp.Or(given, r.ds.CRS()))
		if err != nil && given != "" {
			// Not the file's fault, hence no FormatError.
			return fmt.Errorf("grid: %s: the given CRS can't be understood: %s; give EPSG:n, WKT or PROJJSON", r.path, err.Error())
		}
		if err != nil {
			return err
		}
		// The two definitions of a unit may differ in the last digits.
		if math.Abs(metres-unit) > unitTolerance*unit {
			r.scale *= metres / unit
			r.offset *= metres / unit
			r.note(fmt.Sprintf("heights were converted from the band's unit, %q, to %s", r.band.Unit(), name))
		}
	}
	if r.band.Integer() {
		r.header.Step[2] = math.Abs(r.scale)
	}
	return nil
}

// unitTolerance tells apart the international and the US survey foot, which
// differ by 2e-6, but not two roundings of one of them.
const unitTolerance = 1e-7

// heightUnit is the unit in metres in which heights that belong to a CRS are
// understood, with its name.
func heightUnit(wkt string) (metres float64, name string, err error) {
	if wkt == "" {
		return 1, "metre", nil
	}
	crs, err := gdal.ParseCRS(wkt)
	if err != nil {
		return 0, "", err
	}
	defer func() { _ = crs.Close() }()
	if name, metres := crs.VerticalUnit(); metres > 0 {
		return metres, name, nil
	}
	if name, metres := crs.LinearUnit(); metres > 0 {
		return metres, name, nil
	}
	return 1, "metre", nil
}

// isoDate is the day of a TIFF date, "2026:05:14 09:30:00", or "".
func isoDate(s string) string {
	var y, m, d int
	if _, err := fmt.Sscanf(s, "%4d:%2d:%2d", &y, &m, &d); err != nil || y < 1900 || m < 1 || m > 12 || d < 1 || d > 31 {
		return ""
	}
	return fmt.Sprintf("%04d-%02d-%02d", y, m, d)
}

// Header implements terrain.Reader.
func (r *reader) Header() *terrain.Header { return &r.header }

// Consumed implements terrain.Reader. It is the file's size times the share of
// the cells that were read, since GDAL does not tell where in the file it is.
func (r *reader) Consumed() int64 { return r.consumed.Load() }

// Defects implements terrain.Reader.
func (r *reader) Defects() []terrain.Defect {
	if r.notHeight == 0 {
		return nil
	}
	return []terrain.Defect{{
		Reason: "value is neither a height nor the nodata value",
		Count:  r.notHeight,
		First:  fmt.Sprintf("column %d, row %d", r.firstCol, r.firstRow),
	}}
}

// Close implements terrain.Reader.
func (r *reader) Close() error { return r.ds.Close() }

// Read implements terrain.Reader. It may return fewer points than b has room
// for, even none at all over a stretch without data, before io.EOF.
func (r *reader) Read(b *terrain.Batch) error {
	b.Resize(0)
	if r.at == r.w*r.h {
		if err := r.load(); err != nil {
			return err
		}
	}
	b.Resize(b.Cap())
	n := r.fill(b)
	b.Resize(n)
	clear(b.Intensity)
	clear(b.Red)
	clear(b.Green)
	clear(b.Blue)
	clear(b.Class)
	clear(b.Flags)
	clear(b.Return)
	clear(b.Returns)
	return nil
}

// load reads the next window.
func (r *reader) load() error {
	x, y, w, h, ok := r.windows.next()
	if !ok {
		r.consumed.Store(r.header.Bytes)
		return io.EOF
	}
	r.x, r.y, r.w, r.h, r.at = x, y, 0, 0, 0
	if err := r.band.ReadMasked(x, y, w, h, r.values, r.valid); err != nil {
		return err
	}
	r.w, r.h = w, h
	r.done += int64(w) * int64(h)
	width, height := r.ds.Size()
	r.consumed.Store(int64(float64(r.header.Bytes) * (float64(r.done) / (float64(width) * float64(height)))))
	return nil
}

// fill puts cells of the window into b until either is exhausted, and returns
// the number of points.
func (r *reader) fill(b *terrain.Batch) int {
	n, t := 0, &r.transform
	for r.at < r.w*r.h && n < b.Len() {
		row, col := r.at/r.w, r.at%r.w
		v := float64(r.y+row) + 0.5
		x0, y0 := t[0]+v*t[2], t[3]+v*t[5]
		for ; col < r.w && n < b.Len(); col++ {
			z := r.values[r.at]*r.scale + r.offset
			ok := r.valid[r.at] != 0
			r.at++
			if !ok {
				if r.numberNoData && !isFinite(r.values[r.at-1]) {
					r.bad(row, col)
				}
				continue
			}
			if !(math.Abs(z) <= maxHeight) {
				r.bad(row, col)
				continue
			}
			u := float64(r.x+col) + 0.5
			b.X[n], b.Y[n], b.Z[n] = x0+u*t[1], y0+u*t[4], z
			n++
		}
	}
	return n
}

// maxHeight is the largest height that is passed on, in whatever unit: it is
// above the Earth's highest mountain in millimetres, and below what files put
// where they have no data (1e10 and up) without saying so.
const maxHeight = 1e9

// bad counts a height that is none.
func (r *reader) bad(row, col int) {
	if r.notHeight == 0 {
		r.firstRow, r.firstCol = r.y+row, r.x+col
	}
	r.notHeight++
}

func isFinite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
