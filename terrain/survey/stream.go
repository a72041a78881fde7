package survey

import (
	"context"
	"fmt"
	"runtime"
	"sync"

	"ledgework/terrain"
)

// StreamOptions say how surveys are streamed. The zero value is the default.
type StreamOptions struct {
	// Workers is the number of goroutines that read, and hence of emit's
	// callers. The default is runtime.GOMAXPROCS(0).
	Workers int

	// Columns are the optional columns of the batches. The default is none.
	Columns terrain.Columns

	Filter Filter
}

// withWorkers returns o with the default number of workers filled in.
func (o StreamOptions) withWorkers() StreamOptions {
	if o.Workers <= 0 {
		o.Workers = runtime.GOMAXPROCS(0)
	}
	return o
}

// Progress is told now and then, from one goroutine at a time, how many bytes
// of how many have been read and how many points have been seen. The last
// call, with done equal to total, comes before Stream returns without error.
type Progress func(done, total, points int64)

// Counts say what a stream delivered and what it left out.
type Counts struct {
	Read    int64            `json:"read"`    // points read, kept and dropped
	Kept    int64            `json:"kept"`    // points delivered
	Dropped []Drop           `json:"dropped"` // by reason
	Extent  terrain.Extent   `json:"-"`       // of the points delivered, metres; empty if there are none
	Defects []terrain.Defect `json:"defects"` // damage that was passed over, by reason
	Files   []FileCounts     `json:"files"`   // in the order of the sources
}

// FileCounts are the Counts of one file.
type FileCounts struct {
	Path    string           `json:"path"`
	Read    int64            `json:"read"`
	Kept    int64            `json:"kept"`
	Dropped []Drop           `json:"dropped"`
	Extent  terrain.Extent   `json:"-"`
	Defects []terrain.Defect `json:"defects"`

	dropped dropCounts
}

// Err is terrain.ErrNoPoints with what became of the points when none was
// kept, else nil.
func (c *Counts) Err() error {
	if c.Kept > 0 {
		return nil
	}
	err := fmt.Errorf("survey: %w: %d points read", terrain.ErrNoPoints, c.Read)
	for _, d := range c.Dropped {
		err = fmt.Errorf("%w; %d dropped: %s", err, d.Count, d.Reason)
	}
	return err
}

// strayM is how far outside the extent of the headers a point may lie before
// it is dropped: headers are rounded, and some are wrong by a site's width, but
// a voxel lattice has bounds.
const strayM = 100e3

// Stream reads all points of the sources, with which frame must have been
// planned, and hands them to emit in the working CRS: metres, in the wanted
// columns, without what the filter drops. Workers 0 to Workers-1 call emit at
// the same time, each with batches of its own that are valid until emit
// returns; which worker sees which points, and in which order, may differ
// from run to run. A LAS file is shared by several workers, any other read by
// one.
//
// The first error, of a file or of emit, ends the stream, and so does the end
// of ctx, after at most one batch per worker. All goroutines have ended when
// Stream returns. Counts are then of what was done until then. That no point
// was kept is no error: see Counts.Err. progress may be nil.
func Stream(ctx context.Context, frame *Frame, sources []Source, opts StreamOptions,
	emit func(worker int, b *terrain.Batch) error, progress Progress) (Counts, error) {
	opts = opts.withWorkers()
	units, total, err := divide(sources)
	if err != nil {
		return Counts{}, err
	}
	workers := min(opts.Workers, len(units))

	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	r := &run{frame: frame, opts: opts, emit: emit, sources: sources, units: units, bounds: frame.bounds(), counts: newCounts(sources), defects: make([][]terrain.Defect, len(units))}
	var wg sync.WaitGroup
	for w := range workers {
		wg.Go(func() {
			if err := r.work(ctx, w); err != nil {
				cancel(err)
			}
		})
	}
	stop := r.report(progress, total)
	wg.Wait()
	stop()
	r.sum()
	if err := context.Cause(ctx); err != nil {
		return r.counts, err
	}
	if progress != nil {
		progress(total, total, r.counts.Read)
	}
	return r.counts, nil
}

// bounds are what a point must lie in.
func (f *Frame) bounds() terrain.Extent {
	e := f.Extent
	for i := range 3 {
		e.Min[i] -= strayM
		e.Max[i] += strayM
	}
	return e
}

// A unit is what one worker reads at a time: n points of a LAS file from first
// on, or a whole file.
type unit struct {
	source   int
	first, n int64
	section  bool
}

// unitPoints is the size of a unit: small enough that workers finish nearly
// together (5 ms each), large enough that opening the file again is nothing.
const unitPoints = 1 << 18

// minRecordBytes is the size of the shortest LAS point record.
const minRecordBytes = 20

// divide splits the sources into units and sums their bytes.
func divide(sources []Source) (units []unit, bytes int64, err error) {
	for i, src := range sources {
		f, err := open(src.Path, src.options())
		if err != nil {
			return nil, 0, err
		}
		h := f.Header()
		bytes += h.Bytes
		if f.las == nil {
			units = append(units, unit{source: i})
		} else {
			units = append(units, sections(i, h)...)
		}
		if err := f.Close(); err != nil {
			return nil, 0, err
		}
	}
	return units, bytes, nil
}

// sections cuts a LAS file. The last unit takes all points that are promised
// beyond what the file can hold, so that a count that lies makes no units.
func sections(source int, h *terrain.Header) []unit {
	var units []unit
	held := min(h.Points, h.Bytes/minRecordBytes)
	for first := int64(0); ; first += unitPoints {
		if first+unitPoints >= held {
			return append(units, unit{source: source, first: first, n: h.Points - first, section: true})
		}
		units = append(units, unit{source: source, first: first, n: unitPoints, section: true})
	}
}
