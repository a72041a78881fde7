package terrain

import (
	"errors"
	"fmt"
	"math"
)

// Columns is a set of optional point attributes. Coordinates are always read.
type Columns uint8

// The optional attributes of a point.
const (
	Intensity Columns = 1 << iota // return strength, as stored
	Color                         // red, green, blue, 16 bit each
	Class                         // classification code and flags
	Returns                       // return number and number of returns
)

// Has reports whether all columns of want are in c.
func (c Columns) Has(want Columns) bool { return c&want == want }

// Flags are the point flags of the LAS specification, section "Point Data
// Record", with the same meaning for every format.
type Flags uint8

// The point flags.
const (
	Synthetic Flags = 1 << iota // not from a measurement
	KeyPoint                    // not to be thinned
	Withheld                    // deleted, but kept in the file
	Overlap                     // in the overlap of two flight lines
)

// A Batch holds a few thousand points column by column. X, Y and Z always have
// the same length; every other column has either that length or none.
// Batches are reused: what a Batch holds is valid until the next Read into it.
type Batch struct {
	X, Y, Z          []float64 // coordinates, in the units of the file's CRS
	Intensity        []uint16
	Red, Green, Blue []uint16
	Class            []uint8
	Flags            []Flags
	Return           []uint8 // 1 is the first return of a pulse, 0 unknown
	Returns          []uint8 // returns of the pulse, 0 unknown
}

// BatchPoints is the capacity that the package's own loops give a Batch: large
// enough to drown per-batch costs, small enough to stay in a core's cache.
const BatchPoints = 4096

// NewBatch returns an empty batch with room for n points and the given
// columns. It panics if n is not positive.
func NewBatch(n int, cols Columns) *Batch {
	if n <= 0 {
		panic("terrain: batch of no points")
	}
	b := &Batch{X: make([]float64, 0, n), Y: make([]float64, 0, n), Z: make([]float64, 0, n)}
	if cols.Has(Intensity) {
		b.Intensity = make([]uint16, 0, n)
	}
	if cols.Has(Color) {
		b.Red, b.Green, b.Blue = make([]uint16, 0, n), make([]uint16, 0, n), make([]uint16, 0, n)
	}
	if cols.Has(Class) {
		b.Class, b.Flags = make([]uint8, 0, n), make([]Flags, 0, n)
	}
	if cols.Has(Returns) {
		b.Return, b.Returns = make([]uint8, 0, n), make([]uint8, 0, n)
	}
	return b
}

// Len is the number of points in b.
func (b *Batch) Len() int { return len(b.X) }

// Cap is the number of points that b has room for.
func (b *Batch) Cap() int { return cap(b.X) }

// Columns tells which optional columns b has room for.
func (b *Batch) Columns() Columns {
	var c Columns
	if cap(b.Intensity) > 0 {
		c |= Intensity
	}
	if cap(b.Red) > 0 {
		c |= Color
	}
	if cap(b.Class) > 0 {
		c |= Class
	}
	if cap(b.Return) > 0 {
		c |= Returns
	}
	return c
}

// Resize sets the length of every column that b has to n, without clearing
// what stands there. It panics if n exceeds b.Cap().
func (b *Batch) Resize(n int) {
	b.X, b.Y, b.Z = b.X[:n], b.Y[:n], b.Z[:n]
	if cap(b.Intensity) > 0 {
		b.Intensity = b.Intensity[:n]
	}
	if cap(b.Red) > 0 {
		b.Red, b.Green, b.Blue = b.Red[:n], b.Green[:n], b.Blue[:n]
	}
	if cap(b.Class) > 0 {
		b.Class, b.Flags = b.Class[:n], b.Flags[:n]
	}
	if cap(b.Return) > 0 {
		b.Return, b.Returns = b.Return[:n], b.Returns[:n]
	}
}

// Move copies point from to place to, in every column. A filter compacts a
// batch with it.
func (b *Batch) Move(to, from int) {
	b.X[to], b.Y[to], b.Z[to] = b.X[from], b.Y[from], b.Z[from]
	if len(b.Intensity) > 0 {
		b.Intensity[to] = b.Intensity[from]
	}
	if len(b.Red) > 0 {
		b.Red[to], b.Green[to], b.Blue[to] = b.Red[from], b.Green[from], b.Blue[from]
	}
	if len(b.Class) > 0 {
		b.Class[to], b.Flags[to] = b.Class[from], b.Flags[from]
	}
	if len(b.Return) > 0 {
		b.Return[to], b.Returns[to] = b.Return[from], b.Returns[from]
	}
}

// A Reader streams the points of one survey file. It is used by one goroutine
// at a time and allocates nothing per point.
type Reader interface {
	// Header is what the file says of itself. It is known from the start and
	// must not be changed by the caller.
	Header() *Header

	// Read replaces the contents of b with the next points, at most b.Cap()
	// of them, in the columns that b has and the file has too; a column of b
	// that the file lacks is filled with zeros. It returns io.EOF, and no
	// points, after the last one. Other errors are FormatError or the
	// underlying reader's.
	Read(b *Batch) error

	// Consumed is the number of bytes of the input that have been read, for
	// progress against Header.Bytes. It may be called from another goroutine.
	Consumed() int64

	// Defects lists what was wrong and passed over so far.
	Defects() []Defect

	// Close releases the reader's resources.
	Close() error
}

// A Header is what a survey file says of itself.
type Header struct {
	Format   string     // as a surveyor would say it: "LAS 1.4, point format 6"
	Points   int64      // points promised, -1 if the file does not say
	Bytes    int64      // size of the input, for progress
	Columns  Columns    // optional columns that the file has
	Extent   *Extent    // extent promised, nil if the file does not say
	CRS      string     // WKT, PROJJSON or "EPSG:n"; empty if the file has none
	Step     [3]float64 // resolution of stored coordinates, 0 where unknown
	Cell     float64    // cell size of an elevation grid in CRS units, else 0
	Date     string     // survey or creation date, YYYY-MM-DD, empty if unknown
	Producer string     // software or system that wrote it, empty if unknown
	Notes    []string   // oddities in the header that do no harm
}

// An Extent is an axis-aligned box, in the units of its CRS. The zero value is
// no box: see EmptyExtent.
type Extent struct {
	Min, Max [3]float64
}

// EmptyExtent returns the extent of no points: minima +Inf, maxima -Inf.
func EmptyExtent() Extent {
	inf := math.Inf(1)
	return Extent{Min: [3]float64{inf, inf, inf}, Max: [3]float64{-inf, -inf, -inf}}
}

// Empty reports whether e encloses nothing.
func (e Extent) Empty() bool {
	return !(e.Min[0] <= e.Max[0] && e.Min[1] <= e.Max[1] && e.Min[2] <= e.Max[2])
}

// Add grows e to enclose the point.
func (e *Extent) Add(x, y, z float64) {
	for i, v := range [3]float64{x, y, z} {
		e.Min[i] = min(e.Min[i], v)
		e.Max[i] = max(e.Max[i], v)
	}
}

// Union grows e to enclose o.
func (e *Extent) Union(o Extent) {
	for i := range 3 {
		e.Min[i] = min(e.Min[i], o.Min[i])
		e.Max[i] = max(e.Max[i], o.Max[i])
	}
}

// A Defect is a kind of damage that a reader passed over, with the number of
// times and the first place.
type Defect struct {
	Reason string `json:"reason"` // what was wrong: "coordinate is not finite"
	Count  int64  `json:"count"`
	First  string `json:"first"` // the first place: "point 1204 at byte 98312"
}

// A FormatError says that a file's bytes break its format.
type FormatError struct {
	Format string // package that found it: "las"
	Place  string // byte, line or record: "point 1204 at byte 98312"
	Reason string // what is wrong
	Remedy string // what the user can do; may be empty
	Err    error  // cause, may be nil
}

func (e *FormatError) Error() string {
	s := e.Format + ": "
	if e.Place != "" {
		s += e.Place + ": "
	}
	s += e.Reason
	if e.Err != nil {
		s += ": " + e.Err.Error()
	}
	if e.Remedy != "" {
		s += "; " + e.Remedy
	}
	return s
}

func (e *FormatError) Unwrap() error { return e.Err }

// An UnsupportedError says that a file is valid, as far as was read, but uses
// something that ledgework does not do.
type UnsupportedError struct {
	Format  string // "las"
	Feature string // what is used: "point format 11"
	Remedy  string // what the user can do; may be empty
}

func (e *UnsupportedError) Error() string {
	s := fmt.Sprintf("%s: %s is not supported", e.Format, e.Feature)
	if e.Remedy != "" {
		s += "; " + e.Remedy
	}
	return s
}

// ErrNoPoints says that a survey holds no usable point.
var ErrNoPoints = errors.New("the survey holds no usable point")
