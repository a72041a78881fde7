package ply

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"ledgework/terrain"
)

func TestReadEveryTypeAndOrder(t *testing.T) {
	const n = 2500 // more than one pass of the column loops
	for _, format := range formats() {
		for _, typ := range typeNames() {
			rnd := rand.New(rand.NewPCG(1, 1))
			x, y, z := random(rnd, typ+" x", n), random(rnd, "double y", n), random(rnd, typ+" z", n)
			extra, list := random(rnd, "float nx", n), field{decl: "list uchar short l"}
			faces := part{"face", 7, []field{{decl: "list uint float vertex_indices"}, random(rnd, typ+" flag", 7)}}
			fixed := part{"camera", 3, []field{random(rnd, typ+" a", 3), random(rnd, "double b", 3)}}
			for name, file := range map[string][]byte{
				"xyz":       build(format, part{"vertex", n, []field{x, y, z}}),
				"zyx":       build(format, part{"vertex", n, []field{z, extra, y, x}}, faces),
				"last":      build(format, faces, fixed, part{"nothing", 9, nil}, part{"vertex", n, []field{extra, y, x, z}}),
				"with list": build(format, fixed, part{"vertex", n, []field{x, list, y, z}}, faces),
			} {
				for _, size := range []int{1, 700, 4096} {
					r, err := NewReader(bytes.NewReader(file), int64(len(file)), Options{})
					if err != nil {
						t.Fatalf("%s, %s, %s: %v", format, typ, name, err)
					}
					got, err := drain(r, size)
					if err != nil {
						t.Fatalf("%s, %s, %s: %v", format, typ, name, err)
					}
					if !slices.Equal(got.x, x.values) || !slices.Equal(got.y, y.values) || !slices.Equal(got.z, z.values) {
						t.Errorf("%s, %s, %s: points differ", format, typ, name)
					}
					if c := r.Consumed(); c != int64(len(file)) {
						t.Errorf("%s, %s, %s: consumed %d of %d bytes", format, typ, name, c, len(file))
					}
				}
			}
		}
	}
}

func TestReadColumns(t *testing.T) {
	nan := math.NaN()
	xyz := []field{{"float x", []float64{1, 2, 3}}, {"float y", []float64{4, 5, 6}}, {"float z", []float64{7, 8, 9}}}
	for _, c := range []struct {
		name      string
		fields    []field
		rgb       [3][]uint16 // nil for zeros
		intensity []uint16
		class     []uint8
		notes     int
	}{
		{name: "none"},
		{name: "8 bit", fields: []field{{"uchar red", []float64{0, 1, 255}}, {"uchar green", []float64{2, 3, 4}}, {"uchar blue", []float64{128, 0, 0}}},
			rgb: [3][]uint16{{0, 257, 65535}, {514, 771, 1028}, {32896, 0, 0}}},
		{name: "16 bit", fields: []field{{"ushort b", []float64{0, 1, 65535}}, {"ushort g", []float64{2, 3, 4}}, {"ushort r", []float64{5, 6, 7}}},
			rgb: [3][]uint16{{5, 6, 7}, {2, 3, 4}, {0, 1, 65535}}},
		{name: "float", fields: []field{{"float diffuse_red", []float64{0, 0.5, 1}}, {"float diffuse_green", []float64{-1, 2, nan}}, {"double diffuse_blue", []float64{1, 0, 0}}},
			rgb: [3][]uint16{{0, 32768, 65535}, {0, 65535, 0}, {65535, 0, 0}}, notes: 1},
		{name: "int", fields: []field{{"int red", []float64{-5, 255, 999}}, {"int green", []float64{1, 1, 1}}, {"int blue", []float64{0, 0, 0}}},
			rgb: [3][]uint16{{0, 65535, 65535}, {257, 257, 257}, {0, 0, 0}}, notes: 1},
		{name: "two of three", fields: []field{{"uchar red", []float64{1, 2, 3}}, {"uchar green", []float64{1, 2, 3}}}},
		{name: "intensity", fields: []field{{"ushort intensity", []float64{1, 2, 65535}}}, intensity: []uint16{1, 2, 65535}},
		{name: "float intensity", fields: []field{{"float scalar_Intensity", []float64{1.4, 1.6, 1e9}}}, intensity: []uint16{1, 2, 65535}, notes: 1},
		{name: "class", fields: []field{{"uchar classification", []float64{2, 7, 18}}}, class: []uint8{2, 7, 18}},
		{name: "float class", fields: []field{{"float class", []float64{2, -1, 256}}}, class: []uint8{2, 0, 0}},
	} {
		for _, format := range formats() {
			file := build(format, part{"vertex", 3, append(c.fields[:len(c.fields):len(c.fields)], xyz...)})
			r, err := NewReader(bytes.NewReader(file), int64(len(file)), Options{})
			if err != nil {
				t.Fatal(err)
			}
			got, err := drain(r, 2)
			if err != nil {
				t.Fatal(err)
			}
			want := cloud{x: xyz[0].values, y: xyz[1].values, z: xyz[2].values, rgb: c.rgb, intensity: c.intensity, class: c.class}
			var cols terrain.Columns
			zero := make([]uint16, 3)
			if c.rgb[0] == nil {
				want.rgb = [3][]uint16{zero, zero, zero}
			} else {
				cols |= terrain.Color
			}
			if c.intensity == nil {
				want.intensity = zero
			} else {
				cols |= terrain.Intensity
			}
			if c.class == nil {
				want.class = make([]uint8, 3)
			} else {
				cols |= terrain.Class
			}
			if h := r.Header(); h.Columns != cols || len(h.Notes) != c.notes {
				t.Errorf("%s, %s: got columns %b and notes %q", c.name, format, h.Columns, h.Notes)
			}
			if !got.equal(want) {
				t.Errorf("%s, %s: got %v, want %v", c.name, format, got, want)
			}
		}
	}
}

func TestReadNonFinite(t *testing.T) {
	v := []float64{math.Inf(1), math.Inf(-1), 1}
	for _, format := range formats() {
		file := build(format, part{"vertex", 3, []field{{"double x", v}, {"float y", v}, {"double z", v}}})
		got, err := drain(must(t, file, Options{}), 9)
		if err != nil || !slices.Equal(got.x, v) || !slices.Equal(got.y, v) {
			t.Errorf("%s: got %v and %v", format, got, err)
		}
	}
}

func must(t testing.TB, b []byte, opts Options) *Reader {
	t.Helper()
	r, err := NewReader(bytes.NewReader(b), int64(len(b)), opts)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func TestReadTruncated(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 1))
	v := part{"vertex", 20, []field{random(rnd, "float x", 20), random(rnd, "float y", 20), random(rnd, "float z", 20)}}
	faces := part{"face", 4, []field{{decl: "list uchar int l"}}}
	for _, format := range formats() {
		for _, withList := range []bool{false, true} {
			v := v
			if withList {
				v.fields = append(v.fields[:3:3], field{decl: "list uchar int l"})
			}
			file := build(format, faces, v)
			start := bytes.Index(file, []byte("end_header\n")) + 11
			last := -1
			for cut := start; cut < len(file)-1; cut++ {
				got, err := drain(must(t, file[:cut], Options{}), 3)
				var fe *terrain.FormatError
				if format == "ascii" && err == nil && len(got.x) == 20 {
					continue // only the end of the last line is missing, or digits of it
				}
				if !errors.As(err, &fe) || fe.Place == "" || len(got.x) < last || len(got.x) > 20 {
					t.Fatalf("%s cut at %d: got %d points and %v", format, cut, len(got.x), err)
				}
				last = len(got.x)
				r := must(t, file[:cut], Options{Tolerant: true})
				soft, err := drain(r, 7)
				if err != nil || !soft.equal(got) {
					t.Fatalf("%s cut at %d: tolerant: got %d points and %v", format, cut, len(soft.x), err)
				}
				lost := int64(0)
				for _, d := range r.Defects() {
					lost += d.Count
				}
				if lost != int64(20-len(got.x)) {
					t.Fatalf("%s cut at %d: %d points, defects %v", format, cut, len(got.x), r.Defects())
				}
			}
			if last < 18 {
				t.Errorf("%s: at most %d points before the end", format, last)
			}
		}
	}
}

func TestReadBadLines(t *testing.T) {
	head := strings.Replace(plainHeader, "vertex 1", "vertex 5", 1)
	for bad, want := range map[string]string{"4 5": "ends before the value of z", "4 x 6": `y: "x" is no number`, "4 5 6 7": "more values",
		"4,5,6": `x: "4,5,6" is no number`} {
		text := head + bad + "\n7 8 9\n" + bad + "\n10 11 12\n"
		r, err := newReader(text, Options{})
		if err != nil {
			t.Fatal(err)
		}
		got, err := drain(r, 9)
		if len(got.x) != 1 || err == nil || !strings.HasPrefix(err.Error(), "ply: line 9: ") || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: got %d points and %v", bad, len(got.x), err)
		}
		if r, err = newReader(text, Options{Tolerant: true}); err != nil {
			t.Fatal(err)
		}
		got, err = drain(r, 9)
		if err != nil || !slices.Equal(got.x, []float64{1, 7, 10}) {
			t.Errorf("%q: got %v and %v", bad, got.x, err)
		}
		if d := r.Defects(); len(d) != 1 || d[0] != (terrain.Defect{Reason: reasonLine, Count: 2, First: "line 9"}) {
			t.Errorf("%q: got defects %v", bad, d)
		}
	}
}

func TestReadBadList(t *testing.T) {
	file := build("binary_little_endian", part{"face", 1, []field{{decl: "list char int l"}}},
		part{"vertex", 1, []field{{"float x", []float64{1}}, {"float y", []float64{2}}, {"float z", []float64{3}}}})
	file[bytes.Index(file, []byte("end_header\n"))+11] = 0xff // a length of -1
	_, err := drain(must(t, file, Options{Tolerant: true}), 3)
	if err == nil || !strings.Contains(err.Error(), "a list has the length -1") {
		t.Errorf("got %v", err)
	}
}

func TestReadErrorsOfTheFile(t *testing.T) {
	failure := errors.New("disk on fire")
	for _, format := range formats() {
		file := build(format, part{"vertex", 2, []field{{"float x", []float64{1, 2}}, {"float y", []float64{1, 2}}, {"float z", []float64{1, 2}}}})
		for cut := range len(file) {
			r, err := NewReader(io.MultiReader(bytes.NewReader(file[:cut]), iotest.ErrReader(failure)), int64(len(file)), Options{Tolerant: true})
			if err == nil {
				_, err = drain(r, 3)
			}
			if !errors.Is(err, failure) {
				t.Fatalf("%s, failure at byte %d: got %v", format, cut, err)
			}
		}
	}
}

func TestReadAllocatesNothing(t *testing.T) {
	const n = 20000
	rnd := rand.New(rand.NewPCG(1, 1))
	for _, format := range formats() {
		for _, extra := range []field{random(rnd, "uchar intensity", n), {decl: "list uchar int l"}} {
			r := must(t, build(format, part{"vertex", n, []field{random(rnd, "float x", n), random(rnd, "double y", n), random(rnd, "int z", n),
				random(rnd, "uchar red", n), random(rnd, "uchar green", n), random(rnd, "uchar blue", n), extra}}), Options{})
			b := terrain.NewBatch(64, allColumns)
			if err := r.Read(b); err != nil { // allocates the scratch
				t.Fatal(err)
			}
			if got := testing.AllocsPerRun(100, func() {
				if err := r.Read(b); err != nil {
					t.Fatal(err)
				}
			}); got != 0 {
				t.Errorf("%s, %s: %v allocations per batch", format, extra.decl, got)
			}
		}
	}
}

func FuzzReader(f *testing.F) {
	rnd := rand.New(rand.NewPCG(1, 1))
	v := part{"vertex", 3, []field{random(rnd, "float x", 3), random(rnd, "double y", 3), random(rnd, "short z", 3), random(rnd, "uchar intensity", 3)}}
	for _, format := range formats() {
		f.Add(build(format, v))
		f.Add(build(format, part{"face", 2, []field{{decl: "list uchar int l"}}}, part{"vertex", 3, append(v.fields[:4:4], field{decl: "list uchar int l"})}))
	}
	f.Add([]byte(plainHeader))
	f.Fuzz(func(t *testing.T, b []byte) {
		if len(b) > 1<<16 {
			return
		}
		r, err := NewReader(bytes.NewReader(b), int64(len(b)), Options{Tolerant: true})
		if err != nil {
			checkError(t, err)
			return
		}
		a, errA := drain(r, 1000)
		if errA != nil {
			checkError(t, errA)
		}
		n := int64(len(a.x))
		if n*3 > int64(len(b)) || n > r.Header().Points {
			t.Fatalf("%d points from %d bytes, %d promised", n, len(b), r.Header().Points)
		}
		lost := int64(0)
		for _, d := range r.Defects() {
			lost += d.Count
		}
		if errA == nil && n+lost != r.Header().Points {
			t.Fatalf("%d points and %d lost, %d promised", n, lost, r.Header().Points)
		}
		small, errB := drain(must(t, b, Options{Tolerant: true}), 3)
		if !small.equal(a) || fmt.Sprint(errA) != fmt.Sprint(errB) {
			t.Fatalf("small batches differ: %v and %v", errA, errB)
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

func BenchmarkReadASCII(b *testing.B)  { benchmarkRead(b, "ascii") }
func BenchmarkReadBinary(b *testing.B) { benchmarkRead(b, "binary_little_endian") }

func benchmarkRead(b *testing.B, format string) {
	const n = 100000
	rnd := rand.New(rand.NewPCG(1, 1))
	fields := []field{random(rnd, "float x", n), random(rnd, "float y", n), random(rnd, "float z", n),
		random(rnd, "uchar red", n), random(rnd, "uchar green", n), random(rnd, "uchar blue", n)}
	for _, f := range fields[:3] {
		for i, v := range f.values {
			f.values[i] = math.Round(v*1e4) / 1e4 // digits as surveyors write them
		}
	}
	file := build(format, part{"vertex", n, fields})
	batch := terrain.NewBatch(terrain.BatchPoints, terrain.Color)
	b.SetBytes(int64(len(file)))
	b.ReportAllocs()
	for b.Loop() {
		r := must(b, file, Options{})
		var err error
		for err == nil {
			err = r.Read(batch)
		}
		if !errors.Is(err, io.EOF) {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/n, "ns/point")
}
