package survey

import (
	"context"
	"errors"
	"fmt"
	"io"
	"sync"
	"sync/atomic"
	"time"

	"ledgework/terrain"
)

// A run is the state of one Stream.
type run struct {
	frame   *Frame
	opts    StreamOptions
	emit    func(worker int, b *terrain.Batch) error
	sources []Source
	units   []unit
	bounds  terrain.Extent

	next       atomic.Int64 // unit
	done, seen atomic.Int64 // bytes and points, for progress

	mu      sync.Mutex // guards what follows
	counts  Counts
	defects [][]terrain.Defect // by unit
}

// work reads units until there are none left.
func (r *run) work(ctx context.Context, id int) error {
	w := &worker{run: r, id: id}
	for ctx.Err() == nil {
		i := r.next.Add(1) - 1
		if i >= int64(len(r.units)) {
			return nil
		}
		if err := w.read(ctx, int(i)); err != nil {
			return err
		}
	}
	return context.Cause(ctx)
}

// A worker is one goroutine of a run.
type worker struct {
	run  *run
	id   int
	raw  *terrain.Batch // as read, with the columns that the filter looks at
	view terrain.Batch  // the same points in the columns that were asked for
}

// read streams one unit.
func (w *worker) read(ctx context.Context, i int) (err error) {
	u := w.run.units[i]
	src := w.run.sources[u.source]
	f, err := open(src.Path, src.options())
	if err != nil {
		return err
	}
	defer func() {
		if closed := f.Close(); err == nil {
			err = closed
		}
	}()
	if u.section {
		if f.r, err = f.las.Section(u.first, u.n); err != nil {
			return f.wrap(err)
		}
	}
	t, err := w.run.frame.Transformer(src)
	if err != nil {
		return err
	}
	defer t.Close()
	return w.pump(ctx, i, f, t)
}

// pump reads r, which is that unit, to its end.
func (w *worker) pump(ctx context.Context, unit int, r terrain.Reader, t *Transformer) error {
	path := w.run.sources[w.run.units[unit].source].Path
	sieve := newSieve(w.run.opts.Filter)
	extra := sieve.needs() &^ w.run.opts.Columns
	if w.raw == nil {
		w.raw = terrain.NewBatch(terrain.BatchPoints, w.run.opts.Columns|extra)
	}
	counts := FileCounts{Extent: terrain.EmptyExtent()}
	var consumed int64
	defer func() {
		counts.dropped = sieve.dropped
		w.run.add(unit, &counts, r.Defects())
	}()
	for {
		if ctx.Err() != nil {
			return context.Cause(ctx)
		}
		err := r.Read(w.raw)
		now := r.Consumed()
		w.run.done.Add(now - consumed)
		consumed = now
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		n := int64(w.raw.Len())
		counts.Read += n
		w.run.seen.Add(n)

		sieve.raw(w.raw)
		if err := t.apply(w.raw.X, w.raw.Y, w.raw.Z); err != nil {
			return fmt.Errorf("%s: survey: into the working CRS: %w", path, err)
		}
		sieve.placed(w.raw, w.run.bounds, &counts.Extent)
		if w.raw.Len() == 0 {
			continue
		}
		w.view = *w.raw
		if extra.Has(terrain.Class) {
			w.view.Class, w.view.Flags = nil, nil
		}
		counts.Kept += int64(w.raw.Len())
		if err := w.run.emit(w.id, &w.view); err != nil {
			return fmt.Errorf("%s: %w", path, err)
		}
	}
}

// report calls progress from a goroutine until stop is called.
func (r *run) report(progress Progress, total int64) (stop func()) {
	if progress == nil {
		return func() {}
	}
	const every = 100 * time.Millisecond
	quit, ended := make(chan struct{}), make(chan struct{})
	go func() {
		defer close(ended)
		tick := time.NewTicker(every)
		defer tick.Stop()
		for {
			select {
			case <-quit:
				return
			case <-tick.C:
				progress(min(r.done.Load(), total), total, r.seen.Load())
			}
		}
	}()
	return func() {
		close(quit)
		<-ended
	}
}

func newCounts(sources []Source) Counts {
	c := Counts{Extent: terrain.EmptyExtent(), Files: make([]FileCounts, len(sources))}
	for i, src := range sources {
		c.Files[i] = FileCounts{Path: src.Path, Extent: terrain.EmptyExtent(), Defects: []terrain.Defect{}}
	}
	return c
}

// add adds the counts of one unit.
func (r *run) add(unit int, c *FileCounts, defects []terrain.Defect) {
	r.mu.Lock()
	defer r.mu.Unlock()
	f := &r.counts.Files[r.units[unit].source]
	f.Read += c.Read
	f.Kept += c.Kept
	f.Extent.Union(c.Extent)
	f.dropped.add(&c.dropped)
	r.defects[unit] = defects
}

// sum fills in what depends on all units, in an order that doesn't depend on
// which was read first.
func (r *run) sum() {
	c := &r.counts
	c.Defects = []terrain.Defect{}
	for i, defects := range r.defects {
		f := &c.Files[r.units[i].source]
		f.Defects = addDefects(f.Defects, defects)
	}
	var dropped dropCounts
	for i := range c.Files {
		f := &c.Files[i]
		f.Dropped = f.dropped.list()
		dropped.add(&f.dropped)
		c.Read += f.Read
		c.Kept += f.Kept
		c.Extent.Union(f.Extent)
		c.Defects = addDefects(c.Defects, f.Defects)
	}
	c.Dropped = dropped.list()
}
