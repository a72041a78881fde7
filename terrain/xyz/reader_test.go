package xyz

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"

	"ledgework/terrain"
)

const allColumns = terrain.Intensity | terrain.Color | terrain.Class | terrain.Returns

type cloud struct {
	x, y, z   []float64
	intensity []uint16
	rgb       [3][]uint16
	class     []uint8
}

func drain(r terrain.Reader, n int) (cloud, error) {
	var c cloud
	b := terrain.NewBatch(n, allColumns)
	for {
		if err := r.Read(b); err != nil {
			if errors.Is(err, io.EOF) {
				return c, nil
			}
			return c, err
		}
		c.x, c.y, c.z = append(c.x, b.X...), append(c.y, b.Y...), append(c.z, b.Z...)
		c.intensity, c.class = append(c.intensity, b.Intensity...), append(c.class, b.Class...)
		for i, v := range [3][]uint16{b.Red, b.Green, b.Blue} {
			c.rgb[i] = append(c.rgb[i], v...)
		}
	}
}

func (c cloud) equal(o cloud) bool {
	same := func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }
	return slices.EqualFunc(c.x, o.x, same) && slices.EqualFunc(c.y, o.y, same) && slices.EqualFunc(c.z, o.z, same) &&
		slices.Equal(c.intensity, o.intensity) && slices.Equal(c.class, o.class) && slices.Equal(c.rgb[0], o.rgb[0]) &&
		slices.Equal(c.rgb[1], o.rgb[1]) && slices.Equal(c.rgb[2], o.rgb[2])
}

// build writes n points with every separator the same way, and returns them.
func build(sep string, n int) ([]byte, cloud) {
	rnd := rand.New(rand.NewPCG(1, 1))
	var b []byte
	var c cloud
	for range n {
		x, y, z := rnd.NormFloat64()*1e6, rnd.NormFloat64()*1e6, rnd.NormFloat64()*100
		x, y = math.Round(x*1000)/1000, math.Round(y*1000)/1000
		i, r, g, bl := uint16(rnd.IntN(3000)), uint16(rnd.IntN(256)), uint16(rnd.IntN(256)), uint16(rnd.IntN(256))
		c.x, c.y, c.z = append(c.x, x), append(c.y, y), append(c.z, z)
		c.intensity, c.class = append(c.intensity, i), append(c.class, 0)
		for k, v := range [3]uint16{r, g, bl} {
			c.rgb[k] = append(c.rgb[k], v*257)
		}
		b = strconv.AppendFloat(b, x, 'f', -1, 64)
		b = append(b, sep...)
		b = strconv.AppendFloat(b, y, 'f', -1, 64)
		b = append(b, sep...)
		b = strconv.AppendFloat(b, z, 'g', -1, 64)
		for _, v := range [4]uint16{i, r, g, bl} {
			b = append(b, sep...)
			b = strconv.AppendUint(b, uint64(v), 10)
		}
		b = append(b, '\n')
	}
	return b, c
}

func TestRoundTrip(t *testing.T) {
	for _, sep := range []string{" ", "\t", ",", ";", ", ", "   "} {
		b, want := build(sep, 3000)
		for _, size := range []int{1, 1000, 4096} {
			r, err := newReader(string(b), Options{})
			if err != nil {
				t.Fatal(err)
			}
			got, err := drain(r, size)
			if err != nil || !got.equal(want) {
				t.Errorf("separator %q, batches of %d: points differ, %v", sep, size, err)
			}
		}
	}
}

func TestReadNonFinite(t *testing.T) {
	r, err := newReader("nan 1 2\n1 -inf 1e999\n", Options{})
	if err != nil {
		t.Fatal(err)
	}
	got, err := drain(r, 5)
	if err != nil || fmt.Sprint(got.x, got.y, got.z) != "[NaN 1] [1 -Inf] [2 +Inf]" {
		t.Errorf("got %v and %v", got, err)
	}
}

func TestReadBadLines(t *testing.T) {
	for bad, want := range map[string]string{"4 5": "the line has 2 columns, the points need 3", "4 x 6": `"x" is no number; write one point`,
		"4 5,5 6": `"5,5" is no number; write the numbers with decimal points`, "7": "the line has 1 columns", "END": `"END" is no number`} {
		text := "# head\n1 2 3\n\n" + bad + "\n7 8 9 10\n" + bad + "\n"
		r, err := newReader(text, Options{})
		if err != nil {
			t.Fatal(err)
		}
		got, err := drain(r, 9)
		if len(got.x) != 1 || err == nil || !strings.HasPrefix(err.Error(), "xyz: line 4: ") || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: got %d points and %v", bad, len(got.x), err)
		}
		if r, err = newReader(text, Options{Tolerant: true}); err != nil {
			t.Fatal(err)
		}
		got, err = drain(r, 9)
		if err != nil || !slices.Equal(got.x, []float64{1, 7}) {
			t.Errorf("%q: got %v and %v", bad, got.x, err)
		}
		if d := r.Defects(); len(d) != 1 || d[0] != (terrain.Defect{Reason: reasonLine, Count: 2, First: "line 4"}) {
			t.Errorf("%q: got defects %v", bad, d)
		}
	}
}

func TestReadPromises(t *testing.T) {
	for _, c := range []struct {
		text    string
		points  int
		strict  string // error, if any
		defects string
	}{
		{"0\n", 0, "", "[]"},
		{"2\n1 2 3\n4 5 6\n", 2, "", "[]"},
		{"3\n1 2 3\n4 5 6\n", 2, "xyz: line 3: the file ends after 2 points, its first line promises 3", "[{point is missing, the file ends before it 1 line 3}]"},
		{"9223372036854775807\n1 2 3\n", 1, "promises 9223372036854775807", "[{point is missing, the file ends before it 9223372036854775806 line 2}]"},
		{"1\n1 2 3\n4 5 6\n7 8 9\n", 3, "", "[{point is beyond the promised number 2 line 3}]"},
		{"1\n1 2 3\n2\n4 5 6\n7 8 9\n", 3, "", "[]"},
		{"2\n1 2 3\n2\n4 5 6\n7 8 9\n", 3, "xyz: line 3: the line has 1 columns", "[{line is no point 1 line 3} {point is beyond the promised number 1 line 5}]"},
		{"4\n", 0, "xyz: line 1: the file ends after 0 points", "[{point is missing, the file ends before it 4 line 1}]"},
	} {
		r, err := newReader(c.text, Options{Tolerant: true})
		if err != nil {
			t.Fatal(err)
		}
		got, err := drain(r, 2)
		if err != nil || len(got.x) != c.points || fmt.Sprint(r.Defects()) != c.defects && len(r.Defects())+len(c.defects) != 2 {
			t.Errorf("%q: got %d points, %v, defects %v", c.text, len(got.x), err, r.Defects())
		}
		if r, err = newReader(c.text, Options{}); err != nil {
			t.Fatal(err)
		}
		_, err = drain(r, 2)
		if (err != nil) != (c.strict != "") || err != nil && !strings.Contains(err.Error(), c.strict) {
			t.Errorf("%q: got %v, want %q", c.text, err, c.strict)
		}
	}
}

func TestReadLongLine(t *testing.T) {
	r, err := newReader("1 2 3\n4 5 "+strings.Repeat("6", maxLine)+"\n", Options{Tolerant: true})
	if err != nil {
		t.Fatal(err)
	}
	got, err := drain(r, 2)
	if len(got.x) != 1 || err == nil || !strings.HasPrefix(err.Error(), "xyz: line 2: the line has more than 65536 bytes") {
		t.Errorf("got %d points and %v", len(got.x), err)
	}
}

func TestReadErrorsOfTheFile(t *testing.T) {
	failure := errors.New("disk on fire")
	for _, n := range []int{0, 5, 100000} {
		text := strings.Repeat("1 2 3\n", n)
		r, err := NewReader(io.MultiReader(strings.NewReader(text), iotest.ErrReader(failure)), 0, Options{Tolerant: true})
		if err == nil {
			_, err = drain(r, 100)
		}
		if !errors.Is(err, failure) {
			t.Errorf("after %d lines: got %v", n, err)
		}
	}
}

func TestReadAllocatesNothing(t *testing.T) {
	for _, sep := range []string{" ", ","} {
		text, _ := build(sep, 20000)
		r, err := newReader(string(text), Options{})
		if err != nil {
			t.Fatal(err)
		}
		b := terrain.NewBatch(64, allColumns)
		if n := testing.AllocsPerRun(100, func() {
			if err := r.Read(b); err != nil {
				t.Fatal(err)
			}
		}); n != 0 {
			t.Errorf("separator %q: %v allocations per batch", sep, n)
		}
	}
}

func FuzzReader(f *testing.F) {
	for _, s := range []string{"1 2 3\n4 5 6\n", "2\n1 2 3 -5\n4 5 6 7\n", "x;y;z;i\n1;2;3;\n", "# y, x, z\n2,1,3\n", ptxScan, "1,5 2,5 3,5\n",
		"\xef\xbb\xbfe\tn\th\tr\tg\tb\n1\t2\t3\t255\t0\t0\n", "1 2 3 4 5 6 7\r\n1 2 3 4 5 6 7\r", "1\n1 2 3\n1\n1 2 3\n",
		"0,0\r,0\n"} { // a carriage return inside a line
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		if len(b) > 1<<16 {
			return
		}
		r, err := newReader(string(b), Options{Tolerant: true})
		if err != nil {
			checkError(t, err)
			return
		}
		a, errA := drain(r, 1000)
		if errA != nil {
			checkError(t, errA)
		}
		if n := len(a.x); n*5 > len(b)+1 {
			t.Fatalf("%d points from %d bytes", n, len(b))
		}
		if len(a.x) > 0 && !Looks(b) && r.layout.at[toX] == 0 && !bytes.ContainsAny(b, "#/") {
			t.Fatal("points from what does not look like text with points")
		}
		again, err := newReader(string(b), Options{Tolerant: true})
		if err != nil {
			t.Fatal(err)
		}
		small, errB := drain(again, 3)
		if !small.equal(a) || fmt.Sprint(errA) != fmt.Sprint(errB) || fmt.Sprint(r.Defects()) != fmt.Sprint(again.Defects()) {
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

func BenchmarkRead(b *testing.B) {
	const n = 100000
	text := bytes.Repeat([]byte("636110.300 849345.050 512.140 -1613 52 70 64\n"), n)
	batch := terrain.NewBatch(terrain.BatchPoints, allColumns)
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		r, err := NewReader(bytes.NewReader(text), int64(len(text)), Options{})
		for err == nil {
			err = r.Read(batch)
		}
		if !errors.Is(err, io.EOF) {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/n, "ns/point")
}
