package survey

import (
	"context"
	"io"
	"os"
	"path/filepath"
	"testing"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
	"ledgework/terrain/las"
)

// A fakeReader holds its points in memory.
type fakeReader struct {
	header terrain.Header
	points [][3]float64
	class  []uint8
	flags  []terrain.Flags
	at     int
	err    error // after the points, instead of io.EOF
}

func (f *fakeReader) Header() *terrain.Header { return &f.header }

func (f *fakeReader) Read(b *terrain.Batch) error {
	n := min(b.Cap(), len(f.points)-f.at)
	b.Resize(n)
	if n == 0 {
		if f.err != nil {
			return f.err
		}
		return io.EOF
	}
	for i := range n {
		p := f.points[f.at+i]
		b.X[i], b.Y[i], b.Z[i] = p[0], p[1], p[2]
		if len(b.Class) > 0 {
			b.Class[i], b.Flags[i] = 0, 0
			if f.class != nil {
				b.Class[i] = f.class[f.at+i]
			}
			if f.flags != nil {
				b.Flags[i] = f.flags[f.at+i]
			}
		}
	}
	f.at += n
	return nil
}

func (f *fakeReader) Consumed() int64           { return int64(f.at) }
func (f *fakeReader) Defects() []terrain.Defect { return nil }
func (f *fakeReader) Close() error              { return nil }

// boxReader returns a reader of 3 × 3 × 2 points that span a box.
func boxReader(crs string, cell float64, lo, hi [3]float64) *fakeReader {
	f := &fakeReader{header: terrain.Header{Format: "fake", Points: -1, CRS: crs, Cell: cell}}
	at := func(axis, i, n int) float64 { return lo[axis] + (hi[axis]-lo[axis])*float64(i)/float64(n) }
	for i := range 3 {
		for j := range 3 {
			for k := range 2 {
				f.points = append(f.points, [3]float64{at(0, i, 2), at(1, j, 2), at(2, k, 1)})
			}
		}
	}
	return f
}

// wktOf returns the WKT of a CRS.
func wktOf(t *testing.T, crs string) string {
	t.Helper()
	c, err := gdal.ParseCRS(crs)
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	return c.WKT2()
}

// writeLAS writes points to a LAS 1.4 file in dir, with a CRS unless it is "".
func writeLAS(t testing.TB, dir, name, wkt string, points [][3]float64, class []uint8) string {
	t.Helper()
	path := filepath.Join(dir, name)
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	opts := las.WriterOptions{PointFormat: 6, WKT: wkt}
	if len(points) > 0 {
		opts.Offset = points[0]
	}
	w, err := las.NewWriter(f, opts)
	if err != nil {
		t.Fatal(err)
	}
	b := terrain.NewBatch(max(1, len(points)), terrain.Class)
	b.Resize(len(points))
	for i, p := range points {
		b.X[i], b.Y[i], b.Z[i] = p[0], p[1], p[2]
		b.Class[i], b.Flags[i] = 0, 0
		if class != nil {
			b.Class[i] = class[i]
		}
	}
	if err := w.Write(b); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return path
}

// writeFile writes a file into dir.
func writeFile(t testing.TB, dir, name, content string) string {
	t.Helper()
	path := filepath.Join(dir, name)
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(content), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// planFakes plans readers under the given paths.
func planFakes(want string, readers map[string]*fakeReader, order ...string) (*Frame, error) {
	var probes []*probe
	for _, path := range order {
		p, err := examine(context.Background(), Source{Path: path}, readers[path], make(systems))
		if err != nil {
			return nil, err
		}
		probes = append(probes, p)
	}
	return choose(probes, want)
}

// surveys returns the root of the real surveys, or skips the test.
func surveys(t testing.TB) string {
	t.Helper()
	root := os.Getenv("LEDGEWORK_DATA")
	if root == "" {
		t.Skip("LEDGEWORK_DATA is not set: it names the folder of real surveys")
	}
	return root
}
