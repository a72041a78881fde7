package las

import (
	"bytes"
	"errors"
	"io"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"ledgework/terrain"
)

// memory is a file in memory.
type memory struct {
	b  []byte
	at int
}

func (m *memory) Write(p []byte) (int, error) {
	m.b = append(m.b[:m.at], append(p[:len(p):len(p)], m.b[min(len(m.b), m.at+len(p)):]...)...)
	m.at += len(p)
	return len(p), nil
}

func (m *memory) Seek(off int64, whence int) (int64, error) {
	switch whence {
	case io.SeekStart:
		m.at = int(off)
	case io.SeekEnd:
		m.at = len(m.b) + int(off)
	}
	return int64(m.at), nil
}

func randomBatch(n int, cols terrain.Columns, legacy bool) *terrain.Batch {
	rnd := rand.New(rand.NewPCG(1, 1))
	b := terrain.NewBatch(n, cols)
	b.Resize(n)
	for i := range n {
		b.X[i], b.Y[i], b.Z[i] = 500000+rnd.Float64()*100, 4e6+rnd.Float64()*100, rnd.Float64()*50
		if cols.Has(terrain.Intensity) {
			b.Intensity[i] = uint16(rnd.Uint32())
		}
		if cols.Has(terrain.Color) {
			b.Red[i], b.Green[i], b.Blue[i] = uint16(rnd.Uint32()), uint16(rnd.Uint32()), uint16(rnd.Uint32())
		}
		if cols.Has(terrain.Class) {
			b.Class[i], b.Flags[i] = uint8(rnd.IntN(12)), terrain.Flags(rnd.IntN(8))
			if !legacy {
				b.Class[i], b.Flags[i] = uint8(rnd.Uint32()), terrain.Flags(rnd.IntN(16))
			}
		}
		if cols.Has(terrain.Returns) {
			b.Returns[i] = uint8(1 + rnd.IntN(7))
			b.Return[i] = uint8(1 + rnd.IntN(int(b.Returns[i])))
		}
	}
	return b
}

func writeAll(t *testing.T, opts WriterOptions, batches ...*terrain.Batch) []byte {
	t.Helper()
	m := &memory{}
	w, err := NewWriter(m, opts)
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range batches {
		if err := w.Write(b); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return m.b
}

func TestRoundTrip(t *testing.T) {
	const n = 500
	for _, format := range []uint8{0, 1, 6, 7} {
		for _, cols := range []terrain.Columns{0, terrain.Intensity, terrain.Class, allColumns} {
			opts := WriterOptions{PointFormat: format, Scale: [3]float64{0.001, 0.001, 0.0005}, Offset: [3]float64{500000, 4e6, 0},
				WKT: `LOCAL_CS["cliff"]`, Producer: "ledgework test", Date: time.Date(2026, 5, 14, 0, 0, 0, 0, time.UTC)}
			in := randomBatch(n, cols, format < 6)
			file := writeAll(t, opts, in)
			if again := writeAll(t, opts, in); !bytes.Equal(file, again) {
				t.Error("the same points make another file")
			}
			r := open(t, file, Options{})
			h := r.Header()
			if h.Points != n || h.CRS != opts.WKT || h.Producer != opts.Producer || h.Date != "2026-05-14" || h.Step != opts.Scale || len(h.Notes) > 0 {
				t.Errorf("format %d: got header %+v", format, h)
			}
			got, err := drain(r, 64)
			if err != nil || len(got.x) != n {
				t.Fatalf("format %d: got %d points and %v", format, len(got.x), err)
			}
			e := terrain.EmptyExtent()
			for i := range n {
				e.Add(got.x[i], got.y[i], got.z[i])
				for k, d := range [3]float64{got.x[i] - in.X[i], got.y[i] - in.Y[i], got.z[i] - in.Z[i]} {
					// Half a step, and the rounding of a double near 4e6.
					if math.Abs(d) > opts.Scale[k]/2+1e-9 {
						t.Fatalf("format %d: point %d is off by %g", format, i, d)
					}
				}
				if cols.Has(terrain.Intensity) && got.intensity[i] != in.Intensity[i] {
					t.Fatalf("format %d: point %d: intensity %d", format, i, got.intensity[i])
				}
				if cols.Has(terrain.Class) && (got.class[i] != in.Class[i] || got.flags[i] != in.Flags[i]) {
					t.Fatalf("format %d: point %d: class %d flags %d, want %d %d", format, i, got.class[i], got.flags[i], in.Class[i], in.Flags[i])
				}
				if cols.Has(terrain.Returns) && (got.ret[i] != in.Return[i] || got.of[i] != in.Returns[i]) {
					t.Fatalf("format %d: point %d: return %d of %d", format, i, got.ret[i], got.of[i])
				}
				if cols.Has(terrain.Color) && format == 7 && got.rgb[0][i] != in.Red[i] {
					t.Fatalf("format %d: point %d: red %d", format, i, got.rgb[0][i])
				}
			}
			if *h.Extent != e {
				t.Errorf("format %d: header extent %v, points %v", format, *h.Extent, e)
			}
		}
	}
}

func TestWriteNothing(t *testing.T) {
	for _, format := range []uint8{0, 7} {
		r := open(t, writeAll(t, WriterOptions{PointFormat: format}), Options{})
		if got, err := drain(r, 5); err != nil || len(got.x) != 0 || r.Header().Points != 0 {
			t.Errorf("format %d: got %d points and %v", format, len(got.x), err)
		}
	}
}

func TestWriterRefuses(t *testing.T) {
	for _, c := range []struct {
		opts WriterOptions
		want string
	}{
		{WriterOptions{PointFormat: 3}, "point format 3"},
		{WriterOptions{Scale: [3]float64{-1, 1, 1}}, "scale -1"},
		{WriterOptions{Scale: [3]float64{1, math.NaN(), 1}}, "scale NaN"},
		{WriterOptions{Offset: [3]float64{0, 0, math.Inf(1)}}, "offset +Inf"},
		{WriterOptions{WKT: strings.Repeat("x", 65535)}, "65535 bytes"},
		{WriterOptions{Producer: strings.Repeat("x", 33)}, "32 characters"},
		{WriterOptions{Date: time.Date(1066, 1, 1, 0, 0, 0, 0, time.UTC)}, "year 1066"},
	} {
		if _, err := NewWriter(&memory{}, c.opts); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("got %v, want %q", err, c.want)
		}
	}
}

func TestWriteRefusesPoints(t *testing.T) {
	good := func() *terrain.Batch { return randomBatch(3, allColumns, true) }
	for _, c := range []struct {
		spoil func(b *terrain.Batch)
		want  string
	}{
		{func(b *terrain.Batch) { b.X[1] = math.NaN() }, "las: point 1: coordinate NaN"},
		{func(b *terrain.Batch) { b.Z[2] = math.Inf(-1) }, "las: point 2: coordinate -Inf"},
		{func(b *terrain.Batch) { b.Y[0] = 1e9 }, "las: point 0: coordinate 1e+09"},
		{func(b *terrain.Batch) { b.Class[1] = 32 }, "las: point 1: class 32"},
		{func(b *terrain.Batch) { b.Return[1] = 8 }, "las: point 1: return 8"},
	} {
		b := good()
		c.spoil(b)
		m := &memory{}
		w, err := NewWriter(m, WriterOptions{Scale: [3]float64{.01, .01, .01}})
		if err != nil {
			t.Fatal(err)
		}
		err = w.Write(b)
		if err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("got %v, want %q", err, c.want)
		}
		if again := w.Close(); !errors.Is(again, err) {
			t.Errorf("Close after an error: got %v", again)
		}
	}
}

func BenchmarkWrite(b *testing.B) {
	batch := randomBatch(terrain.BatchPoints, allColumns, false)
	m := &memory{}
	w, err := NewWriter(m, WriterOptions{PointFormat: 7, Offset: [3]float64{500000, 4e6, 0}})
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		m.b, m.at = m.b[:0], 0
		if err := w.Write(batch); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/terrain.BatchPoints, "ns/point")
}
