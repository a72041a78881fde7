package las

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"strings"
	"sync"
	"testing"

	"ledgework/terrain"
)

func TestReadEveryVersionAndFormat(t *testing.T) {
	for minor := uint8(0); minor <= 5; minor++ {
		for format := uint8(0); format <= 10; format++ {
			for _, extra := range []int{0, 5} {
				t.Run(fmt.Sprintf("1.%d/%d/%d", minor, format, extra), func(t *testing.T) {
					s := spec{minor: minor, format: format, extra: extra, points: 300, scale: [3]float64{0.01, 0.02, 0.005},
						offset: [3]float64{1000, -2000, 0.5}, headerExtra: extra}
					b, want := build(s)
					r := open(t, b, Options{})
					h := r.Header()
					if h.Points != 300 || h.Bytes != int64(len(b)) {
						t.Errorf("got %d points in %d bytes", h.Points, h.Bytes)
					}
					if w := fmt.Sprintf("LAS 1.%d, point format %d", minor, format); h.Format != w {
						t.Errorf("got format %q, want %q", h.Format, w)
					}
					hasColor := strings.Contains("2 3 5 7 8 10", fmt.Sprint(format)) && format != 0 && format != 1
					if h.Columns.Has(terrain.Color) != hasColor {
						t.Errorf("got columns %b", h.Columns)
					}
					if h.Extent == nil || h.Extent.Min != [3]float64{-10, -20, -30} || h.Extent.Max != [3]float64{10, 20, 30} {
						t.Errorf("got extent %v", h.Extent)
					}
					if h.Step != s.scale {
						t.Errorf("got step %v", h.Step)
					}
					got, err := drain(r, 64)
					if err != nil {
						t.Fatal(err)
					}
					compare(t, got, want, s.scale, s.offset)
					if got, want := r.Consumed(), int64(len(b)); got != want {
						t.Errorf("consumed %d bytes, want %d", got, want)
					}
					if d := r.Defects(); d != nil {
						t.Errorf("got defects %v", d)
					}
				})
			}
		}
	}
}

func TestReadColumnMask(t *testing.T) {
	b, want := build(spec{minor: 4, format: 7, points: 50})
	for cols := terrain.Columns(0); cols <= allColumns; cols++ {
		r := open(t, b, Options{})
		batch := terrain.NewBatch(50, cols)
		if err := r.Read(batch); err != nil {
			t.Fatal(err)
		}
		if batch.Len() != 50 || batch.Columns() != cols {
			t.Fatalf("got %d points, columns %b, want %b", batch.Len(), batch.Columns(), cols)
		}
		if cols.Has(terrain.Class) && (batch.Class[49] != want[49].class || batch.Flags[49] != want[49].flags) {
			t.Errorf("columns %b: got class %d", cols, batch.Class[49])
		}
		if err := r.Read(batch); !errors.Is(err, io.EOF) || batch.Len() != 0 {
			t.Errorf("got %v and %d points at the end", err, batch.Len())
		}
	}
}

func TestReadZeroesMissingColumns(t *testing.T) {
	b, _ := build(spec{minor: 2, format: 0, points: 3})
	batch := terrain.NewBatch(3, terrain.Color)
	batch.Resize(3)
	batch.Red[1], batch.Green[2], batch.Blue[0] = 5, 6, 7
	if err := open(t, b, Options{}).Read(batch); err != nil {
		t.Fatal(err)
	}
	for i := range 3 {
		if batch.Red[i]|batch.Green[i]|batch.Blue[i] != 0 {
			t.Errorf("point %d has colour", i)
		}
	}
}

func TestReadTruncated(t *testing.T) {
	whole, want := build(spec{minor: 4, format: 6, points: 100})
	for _, cut := range []int{1, 29, 30, 31, 100 * 30} {
		b := whole[:len(whole)-cut]
		held := 100 - (cut+29)/30
		got, err := drain(open(t, b, Options{}), 7)
		var fe *terrain.FormatError
		if !errors.As(err, &fe) {
			t.Fatalf("cut %d: got error %v", cut, err)
		}
		if w := fmt.Sprintf("point %d at byte %d", held, 375+30*held); fe.Place != w {
			t.Errorf("cut %d: got place %q, want %q", cut, fe.Place, w)
		}
		if len(got.x) != held {
			t.Errorf("cut %d: got %d points before the error, want %d", cut, len(got.x), held)
		}
		r := open(t, b, Options{Tolerant: true})
		got, err = drain(r, 7)
		if err != nil {
			t.Fatalf("cut %d: tolerant: %v", cut, err)
		}
		compare(t, got, want[:held], [3]float64{0.01, 0.02, 0.005}, [3]float64{})
		if d := r.Defects(); len(d) != 1 || d[0].Count != int64(100-held) || d[0].First != fe.Place {
			t.Errorf("cut %d: got defects %+v", cut, d)
		}
	}
}

func TestReadCountsThatLie(t *testing.T) {
	for _, s := range []spec{
		{minor: 2, format: 0, points: 5, promised: ptr(int64(0xffffffff))},
		{minor: 4, format: 6, points: 5, promised: ptr(int64(-1))}, // 2^64-1
		{minor: 4, format: 6, points: 5, promised: ptr(int64(1) << 60)},
	} {
		b, _ := build(s)
		got, err := drain(open(t, b, Options{}), 100)
		if fe := (*terrain.FormatError)(nil); !errors.As(err, &fe) || len(got.x) != 5 {
			t.Errorf("got %d points and %v", len(got.x), err)
		}
		r := open(t, b, Options{Tolerant: true})
		if got, err = drain(r, 100); err != nil || len(got.x) != 5 || len(r.Defects()) != 1 {
			t.Errorf("tolerant: got %d points, %v and %v", len(got.x), err, r.Defects())
		}
	}
	b, _ := build(spec{minor: 2, format: 0, points: 5, promised: ptr(int64(3))})
	r := open(t, b, Options{})
	if got, err := drain(r, 100); err != nil || len(got.x) != 3 || len(r.Header().Notes) != 1 {
		t.Errorf("got %d points, %v and notes %q", len(got.x), err, r.Header().Notes)
	}
}

func TestSectionsAddUpToTheWhole(t *testing.T) {
	b, _ := build(spec{minor: 4, format: 7, points: 1000})
	for _, cut := range []int{0, 36*100 + 1} {
		b := b[:len(b)-cut]
		opts := Options{Tolerant: true}
		whole := open(t, b, opts)
		want, err := drain(whole, 64)
		if err != nil {
			t.Fatal(err)
		}
		const parts = 7
		clouds, readers := [parts]cloud{}, [parts]*Reader{}
		var wg sync.WaitGroup
		for i := range int64(parts) {
			r, err := whole.Section(i*1000/parts, (i+1)*1000/parts-i*1000/parts)
			if err != nil {
				t.Fatal(err)
			}
			readers[i] = r
			wg.Go(func() { clouds[i], _ = drain(r, 50) })
		}
		wg.Wait()
		var got cloud
		var missing, consumed int64
		for i, c := range clouds {
			got = got.append(c)
			consumed += readers[i].Consumed()
			for _, d := range readers[i].Defects() {
				missing += d.Count
			}
		}
		if !got.equal(want) {
			t.Error("sections differ from the whole")
		}
		if w := whole.Defects(); len(w) > 0 && w[0].Count != missing || len(w) == 0 && missing != 0 {
			t.Errorf("sections miss %d points, the whole %v", missing, w)
		}
		if consumed+375 != whole.Consumed() {
			t.Errorf("sections consumed %d bytes, the whole %d", consumed, whole.Consumed())
		}
	}
}

func TestSectionOutside(t *testing.T) {
	b, _ := build(spec{minor: 2, format: 0, points: 10})
	r := open(t, b, Options{})
	for _, s := range [][2]int64{{-1, 2}, {0, -1}, {11, 0}, {5, 6}, {1 << 62, 1 << 62}} {
		if _, err := r.Section(s[0], s[1]); err == nil {
			t.Errorf("section %v: no error", s)
		}
	}
	s, err := r.Section(10, 0)
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Read(terrain.NewBatch(4, 0)); !errors.Is(err, io.EOF) {
		t.Errorf("empty section: got %v", err)
	}
}

// brokenAt fails for reads at or after a byte.
type brokenAt struct {
	io.ReaderAt
	at  int64
	err error
}

func (r brokenAt) ReadAt(p []byte, off int64) (int, error) {
	if off+int64(len(p)) <= r.at {
		return r.ReaderAt.ReadAt(p, off)
	}
	n := max(0, r.at-off)
	m, _ := r.ReaderAt.ReadAt(p[:n], off)
	return m, r.err
}

func TestReadErrorsOfTheFile(t *testing.T) {
	b, _ := build(spec{minor: 2, format: 0, points: 30})
	failure := errors.New("disk on fire")
	for at := range int64(len(b)) {
		r, err := NewReader(brokenAt{bytes.NewReader(b), at, failure}, int64(len(b)), Options{})
		n := 0
		if err == nil {
			var c cloud
			c, err = drain(r, 4)
			n = len(c.x)
		}
		if !errors.Is(err, failure) {
			t.Fatalf("failure at byte %d: got %v", at, err)
		}
		want := 0
		if at >= headerSize14 { // the header is read at the size of the newest version
			want = int(at-227) / 20
		}
		if n != want {
			t.Errorf("failure at byte %d: got %d points, want %d", at, n, want)
		}
		// A file that shrinks while it is read ends like a truncated one.
		r, err = NewReader(brokenAt{bytes.NewReader(b), at, io.EOF}, int64(len(b)), Options{})
		if err == nil {
			_, err = drain(r, 4)
		}
		if fe := (*terrain.FormatError)(nil); !errors.As(err, &fe) {
			t.Fatalf("end at byte %d: got %v", at, err)
		}
	}
}

func TestReadAllocatesNothing(t *testing.T) {
	b, _ := build(spec{minor: 4, format: 7, points: 50000})
	r := open(t, b, Options{})
	batch := terrain.NewBatch(100, allColumns)
	if err := r.Read(batch); err != nil { // allocates the buffer
		t.Fatal(err)
	}
	if n := testing.AllocsPerRun(100, func() {
		if err := r.Read(batch); err != nil {
			t.Fatal(err)
		}
	}); n != 0 {
		t.Errorf("%v allocations per batch", n)
	}
}

func FuzzReader(f *testing.F) {
	for _, s := range []spec{
		{minor: 0, format: 0, points: 3}, {minor: 2, format: 3, points: 3}, {minor: 4, format: 7, points: 3, extra: 2},
		{minor: 4, format: 6, points: 2, vlrs: []vlr{{projectionUser, recordWKT, []byte("LOCAL_CS[\"x\"]")}}, evlrs: []vlr{{"u", 1, []byte("abc")}}},
		{minor: 2, format: 1, points: 2, vlrs: []vlr{{projectionUser, recordKeys, put(nil, []uint16{1, 1, 0, 1, 1024, 0, 1, 1})}}},
	} {
		b, _ := build(s)
		f.Add(b)
		f.Add(b[:len(b)-7])
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		if len(b) > 1<<16 {
			return
		}
		r, err := NewReader(bytes.NewReader(b), int64(len(b)), Options{Tolerant: true})
		if err != nil {
			checkError(t, err)
			return
		}
		a, err := drain(r, 1000)
		if err != nil {
			t.Fatalf("tolerant: %v", err)
		}
		n := int64(len(a.x))
		if n*20 > int64(len(b)) {
			t.Fatalf("%d points from %d bytes", n, len(b))
		}
		if h := r.Header(); n > h.Points {
			t.Fatalf("%d points, %d promised", n, h.Points)
		}
		var sections cloud
		for first := int64(0); first < n; first += n/3 + 1 {
			s, err := r.Section(first, min(n/3+1, n-first))
			if err != nil {
				t.Fatal(err)
			}
			c, err := drain(s, 3)
			if err != nil {
				t.Fatal(err)
			}
			sections = sections.append(c)
		}
		if !sections.equal(a) {
			t.Fatal("sections in small batches differ from the whole")
		}
		strict, err := drain(open(t, b, Options{}), 7)
		if !strict.equal(a) || (err == nil) != (r.Defects() == nil) {
			t.Fatalf("strict reading differs: %v", err)
		}
	})
}

func checkError(t *testing.T, err error) {
	t.Helper()
	var fe *terrain.FormatError
	var ue *terrain.UnsupportedError
	if !errors.As(err, &fe) && !errors.As(err, &ue) {
		t.Fatalf("got an error of type %T: %v", err, err)
	}
}

func BenchmarkReadXYZ(b *testing.B)     { benchmarkRead(b, 0) }
func BenchmarkReadColumns(b *testing.B) { benchmarkRead(b, allColumns) }

func benchmarkRead(b *testing.B, cols terrain.Columns) {
	const points = 200000
	data, _ := build(spec{minor: 4, format: 7, points: points})
	whole := open(b, data, Options{})
	batch := terrain.NewBatch(terrain.BatchPoints, cols)
	b.SetBytes(int64(len(data)))
	b.ReportAllocs()
	for b.Loop() {
		r, err := whole.Section(0, points)
		if err != nil {
			b.Fatal(err)
		}
		for err == nil {
			err = r.Read(batch)
		}
		if !errors.Is(err, io.EOF) {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/points, "ns/point")
}
