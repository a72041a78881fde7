package demo

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"sync"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// Defaults of a scan.
const (
	DefaultPoints = 2_500_000 // in a season, all stations together
	DefaultNoiseM = 0.004     // 1 sigma
	DefaultStrays = 3e-4      // share of the points
)

// ScanOptions say how a season is scanned. The zero value asks for the
// defaults.
type ScanOptions struct {
	// Points is the number of points to aim at for all stations together; the
	// scan meets it within a few percent.
	Points int

	// NoiseM is the standard deviation of a point in metres, negative for none.
	NoiseM float64

	// RangeNoise puts the noise along the ray. Without, every axis has it
	// independently, so that the distances to a plane have exactly this
	// standard deviation from wherever it is seen.
	RangeNoise bool

	// Strays is the share of pulses that report a point in the air, negative
	// for none.
	Strays float64
}

func (o ScanOptions) withDefaults() ScanOptions {
	if o.Points == 0 {
		o.Points = DefaultPoints
	}
	if o.NoiseM == 0 {
		o.NoiseM = DefaultNoiseM
	}
	if o.Strays == 0 {
		o.Strays = DefaultStrays
	}
	o.NoiseM, o.Strays = max(o.NoiseM, 0), max(o.Strays, 0)
	return o
}

// Columns are the optional columns that scans fill.
const Columns = terrain.Intensity | terrain.Color | terrain.Class | terrain.Returns

// surveyed is the box, in the site frame, that the surveyor kept. The
// platform's outer part is not in it.
func surveyed() (lo, hi r3.Vec) {
	return r3.Vec{X: -6.5, Y: -21, Z: -1.5}, r3.Vec{X: 64, Y: platformY - 3, Z: 34}
}

// leastElevation keeps the masts from looking down their own poles, where the
// columns of the grid run together.
const leastElevation = -65 * math.Pi / 180

// A sweep is the angular grid of one station: columns from east to west, each
// from low to high, as a scanner that spins about a horizontal axis takes them.
type sweep struct {
	from          r3.Vec
	azimuth, rise float64 // of the first column and row, radians, azimuth from -Y to +X
	columns, rows int
	step          float64 // radians
}

// newSweep covers the surveyed box from the station with the given step.
func newSweep(from r3.Vec, step float64) sweep {
	lo, hi := surveyed()
	az0, az1 := math.Inf(1), math.Inf(-1)
	el0, el1 := math.Inf(1), math.Inf(-1)
	// The station is outside of the box on its seaward side: azimuths and
	// elevations are extreme on its edges. Elevation may be so between corners.
	const n = 64
	for i := range n + 1 {
		x := lo.X + (hi.X-lo.X)*float64(i)/n
		for _, y := range []float64{lo.Y, hi.Y} {
			for _, z := range []float64{lo.Z, hi.Z} {
				d := r3.Sub(r3.Vec{X: x, Y: y, Z: z}, from)
				az, el := math.Atan2(d.X, -d.Y), math.Atan2(d.Z, math.Hypot(d.X, d.Y))
				az0, az1 = min(az0, az), max(az1, az)
				el0, el1 = min(el0, el), max(el1, el)
			}
		}
	}
	el0 = max(el0, leastElevation)
	return sweep{
		from: from, azimuth: az0, rise: el0, step: step,
		columns: int((az1-az0)/step) + 1, rows: int((el1-el0)/step) + 1,
	}
}

// ray is the direction of a place in the grid, which may be between its nodes.
func (s *sweep) ray(column, row float64) r3.Vec {
	sa, ca := math.Sincos(s.azimuth + column*s.step)
	se, ce := math.Sincos(s.rise + row*s.step)
	return r3.Vec{X: ce * sa, Y: -ce * ca, Z: se}
}

// sweeps chooses the angular steps that give about the wanted number of
// points, by trying coarse grids.
func (s *Season) sweeps(points int) []sweep {
	const coarse = 0.02 // radians: about a thousand rays a station
	hits := 0
	scratch := make([]int, 0, len(s.solid.features))
	for _, p := range s.setups {
		w := newSweep(p.at, coarse*p.step)
		for c := range w.columns {
			for r := range w.rows {
				if _, _, ok := s.first(p.at, w.ray(float64(c), float64(r)), scratch); ok {
					hits++
				}
			}
		}
	}
	step := coarse * math.Sqrt(float64(max(hits, 1))/float64(points))
	all := make([]sweep, len(s.setups))
	for i, p := range s.setups {
		all[i] = newSweep(p.at, step*p.step)
	}
	return all
}

// first is the first rock that a ray meets inside the surveyed box.
func (s *Season) first(o, dir r3.Vec, scratch []int) (t float64, surface int, ok bool) {
	lo, hi := surveyed()
	in, out := slab(o, r3.Vec{X: 1 / dir.X, Y: 1 / dir.Y, Z: 1 / dir.Z}, lo, hi)
	if in > out {
		return 0, 0, false
	}
	return s.solid.hit(o, dir, in, out, scratch)
}

// Scan streams the season's points, station after station, to emit in batches
// of varying length. The order and every value depend on the site's seed and
// the options only, not on the number of workers, which is at least 1. A batch
// is valid until emit returns. Scan stops at the first error of emit or of ctx.
func (s *Season) Scan(ctx context.Context, o ScanOptions, workers int, emit func(*terrain.Batch) error) error {
	for i := range s.setups {
		if err := s.ScanStation(ctx, i, o, workers, emit); err != nil {
			return err
		}
	}
	return nil
}

// ScanStation is Scan for one station, an index into Stations.
func (s *Season) ScanStation(ctx context.Context, station int, o ScanOptions, workers int, emit func(*terrain.Batch) error) error {
	if o.Points < 0 {
		return errors.New("demo: negative number of points")
	}
	o = o.withDefaults()
	w := s.sweeps(o.Points)[station]
	workers = max(workers, 1)

	// Worker k scans blocks k, k+workers, …; taking one from each in turn
	// restores the order.
	const perBlock = 8 // columns
	blocks := (w.columns + perBlock - 1) / perBlock
	stop, cancel := context.WithCancel(ctx)
	defer cancel()
	full := make([]chan *terrain.Batch, workers)
	free := make([]chan *terrain.Batch, workers)
	var wait sync.WaitGroup
	for k := range workers {
		const ahead = 2
		full[k], free[k] = make(chan *terrain.Batch, ahead), make(chan *terrain.Batch, ahead)
		for range ahead {
			free[k] <- terrain.NewBatch(perBlock*w.rows, Columns)
		}
		wait.Go(func() {
			defer close(full[k])
			c := newScanner(s, &w, station, o)
			for i := k; i < blocks; i += workers {
				select {
				case <-stop.Done():
					return
				case b := <-free[k]:
					b.Resize(0)
					for col := i * perBlock; col < min((i+1)*perBlock, w.columns); col++ {
						c.column(col, b)
					}
					full[k] <- b // never blocks: there are as many places as batches
				}
			}
		})
	}
	defer wait.Wait()
	defer cancel()
	for i := range blocks {
		b, ok := <-full[i%workers]
		if !ok {
			return ctx.Err()
		}
		if err := ctx.Err(); err != nil {
			return err
		}
		if b.Len() > 0 {
			if err := emit(b); err != nil {
				return err
			}
		}
		free[i%workers] <- b
	}
	return nil
}

// A scanner scans columns for one worker.
type scanner struct {
	season  *Season
	sweep   *sweep
	station int
	o       ScanOptions
	pcg     *rand.PCG
	rng     *rand.Rand
	scratch []int
}

func newScanner(s *Season, w *sweep, station int, o ScanOptions) *scanner {
	pcg := rand.NewPCG(0, 0)
	return &scanner{
		season: s, sweep: w, station: station, o: o,
		pcg: pcg, rng: rand.New(pcg),
		scratch: make([]int, 0, len(s.solid.features)),
	}
}

// column appends the points of one column to b, which has room for them. Each
// column has random numbers of its own.
func (c *scanner) column(col int, b *terrain.Batch) {
	s, w := c.season, c.sweep
	c.pcg.Seed(s.site.seed, uint64(s.number)<<48|uint64(c.station)<<40|uint64(col))
	n := b.Len()
	b.Resize(b.Cap())
	for row := range w.rows {
		// The head trembles by a fifth of a step.
		const tremble = 0.2
		dir := w.ray(float64(col)+tremble*(c.rng.Float64()-0.5), float64(row)+tremble*(c.rng.Float64()-0.5))
		t, surface, ok := s.first(w.from, dir, c.scratch)
		if !ok {
			continue
		}
		look := c.rock(along(w.from, dir, t), dir, t, surface)
		if u, leaf := c.leaf(dir, t); leaf {
			t, look = u, c.green(u)
		}
		if c.rng.Float64() < c.o.Strays {
			t -= 0.5 + 7.5*c.rng.Float64()
		}
		c.put(b, n, dir, t, look)
		n++
	}
	b.Resize(n)
}

// A look is what a scanner sees of a surface.
type look struct{ intensity, red, green, blue uint16 }

// put writes point i with its noise.
func (c *scanner) put(b *terrain.Batch, i int, dir r3.Vec, t float64, l look) {
	var p r3.Vec
	if c.o.RangeNoise {
		p = along(c.sweep.from, dir, t+c.o.NoiseM*c.rng.NormFloat64())
	} else {
		p = along(c.sweep.from, dir, t)
		p.X += c.o.NoiseM * c.rng.NormFloat64()
		p.Y += c.o.NoiseM * c.rng.NormFloat64()
		p.Z += c.o.NoiseM * c.rng.NormFloat64()
	}
	p = c.season.ToDelivered(c.season.site.toWorld(p))
	b.X[i], b.Y[i], b.Z[i] = p.X, p.Y, p.Z
	b.Intensity[i] = l.intensity
	b.Red[i], b.Green[i], b.Blue[i] = l.red, l.green, l.blue
	b.Class[i], b.Flags[i] = 1, 0 // unclassified
	b.Return[i], b.Returns[i] = 1, 1
}
