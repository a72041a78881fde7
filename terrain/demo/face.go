package demo

import (
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"sync/atomic"

	"ledgework/terrain"
)

// FaceOptions describe a plain rough face for measuring speed.
type FaceOptions struct {
	Points          int64   // at least 1
	WidthM, HeightM float64 // along and up the face, positive
	InclinationDeg  float64 // facing south
	RoughM          float64 // amplitude of the relief, which has wavelengths of metres
	NoiseM          float64 // largest noise of a point across the face, uniform
	Seed            uint64
}

// Face is a terrain.Reader that makes the points of a rough face as they are
// read, in the order of a scanner: columns from west to east, each from low to
// high, with irregular spacing. It allocates nothing while reading. The points
// depend on the options only, not on the size of the batches.
type Face struct {
	o             FaceOptions
	header        terrain.Header
	pcg           *rand.PCG
	sin, cos      float64
	columns, rows int64
	column, row   int64
	across        float64 // relief of the column
	read          atomic.Int64
}

// NewFace returns the face's reader. Its lower west corner is at E 412000,
// N 6543000, H 0.
func NewFace(o FaceOptions) (*Face, error) {
	if o.Points < 1 || !(o.WidthM > 0) || !(o.HeightM > 0) {
		return nil, fmt.Errorf("demo: face of %d points, %g by %g m", o.Points, o.WidthM, o.HeightM)
	}
	f := &Face{o: o, pcg: rand.NewPCG(o.Seed, 0)}
	f.sin, f.cos = sincosDeg(o.InclinationDeg)
	f.columns = max(int64(math.Round(math.Sqrt(float64(o.Points)*o.WidthM/o.HeightM))), 1)
	f.rows = (o.Points + f.columns - 1) / f.columns
	f.header = terrain.Header{
		Format: "synthetic face", Points: o.Points, Bytes: o.Points,
		Columns: terrain.Intensity, CRS: crs, Producer: "ledgework",
	}
	return f, nil
}

// Header says what the face has: its Bytes are its points.
func (f *Face) Header() *terrain.Header { return &f.header }

// Read makes the next points.
func (f *Face) Read(b *terrain.Batch) error {
	done := f.read.Load()
	n := int(min(int64(b.Cap()), f.o.Points-done))
	b.Resize(n)
	if n == 0 {
		return io.EOF
	}
	dx, dy := f.o.WidthM/float64(f.columns), f.o.HeightM/float64(f.rows)
	for i := range n {
		if f.row == 0 {
			x := (float64(f.column) + 0.5) * dx
			f.across = math.Sin(1.1*x) + 0.5*math.Sin(2.7*x+1)
		}
		// Three numbers of 21 bits from one draw.
		u := f.pcg.Uint64()
		const scale = 1.0 / (1 << 21)
		a := float64(u&(1<<21-1)) * scale
		c := float64(u>>21&(1<<21-1)) * scale
		e := float64(u>>42&(1<<21-1)) * scale
		along := (float64(f.column) + a) * dx
		up := (float64(f.row) + c) * dy
		relief := f.o.RoughM*f.across*math.Sin(0.9*up) + f.o.NoiseM*(2*e-1)
		b.X[i] = originE + along
		b.Y[i] = originN + up*f.cos - relief*f.sin
		b.Z[i] = up*f.sin + relief*f.cos
		if f.row++; f.row == f.rows {
			f.row, f.column = 0, f.column+1
		}
	}
	f.columnsOf(b)
	f.read.Store(done + int64(n))
	return nil
}

// columnsOf fills the optional columns that b has.
func (f *Face) columnsOf(b *terrain.Batch) {
	for i := range b.Intensity {
		b.Intensity[i] = 1000
	}
	clear(b.Red)
	clear(b.Green)
	clear(b.Blue)
	clear(b.Class)
	clear(b.Flags)
	clear(b.Return)
	clear(b.Returns)
}

// Consumed is the number of points read.
func (f *Face) Consumed() int64 { return f.read.Load() }

// Defects is always empty.
func (f *Face) Defects() []terrain.Defect { return nil }

// Close does nothing.
func (f *Face) Close() error { return nil }
