package export

import (
	"bytes"
	"errors"
	"math/rand/v2"
	"os"
	"reflect"
	"testing"

	"github.com/parquet-go/parquet-go"

	"ledgework/terrain"
)

// randomVoxels makes n voxels with every attribute.
func randomVoxels(t testing.TB, n int, withAttributes bool) *terrain.Voxels {
	t.Helper()
	rng := rand.New(rand.NewPCG(1, 1))
	cells := make([]terrain.Cell, n)
	for i := range cells {
		at := int32(i)
		cells[i] = terrain.Cell{I: at%500 - 250, J: at/500%500 + 100000, K: at / 250000}
	}
	v := voxelsAt(t, 0.05, cells)
	if withAttributes {
		column := func() []uint64 {
			c := make([]uint64, n)
			for i := range c {
				c[i] = rng.Uint64N(uint64(v.Moments[i].N)*maxAttribute + 1)
			}
			return c
		}
		v.Intensity, v.Red, v.Green, v.Blue = column(), column(), column(), column()
		v.Classes = []terrain.ClassCount{}
		for i := range v.Cells {
			left := v.Moments[i].N
			for class := 0; class < 256 && left > 0; class += 1 + rng.IntN(100) {
				if rng.IntN(3) == 0 {
					take := 1 + rng.Int64N(left)
					v.Classes = append(v.Classes, terrain.ClassCount{Voxel: int32(i), Class: uint8(class), N: take})
					left -= take
				}
			}
		}
	}
	return v
}

func testMeta() VoxelMeta {
	return VoxelMeta{
		Site: "Gull Head", CRS: CRS{Authority: "EPSG", Code: "32633", WKT: "PROJCRS[…]"}, Dates: []string{"2026-05-14"},
		Sensors: [][3]float64{{1, 2, 3.5}}, AccuracyM: 0.01,
		Sources: []Input{{File: "scan/a.las", SHA256: "00ff", Bytes: 12, Format: "LAS 1.4", Points: 3}},
		Counts:  map[string]int64{"points": 3, "noise": 1},
	}
}

func encode(t testing.TB, v *terrain.Voxels) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := WriteVoxels(&b, v, testMeta()); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func TestVoxelsRoundTrip(t *testing.T) {
	tests := []struct {
		name string
		v    *terrain.Voxels
	}{
		{"one", randomVoxels(t, 1, true)},
		{"plain", randomVoxels(t, 5000, false)},
		{"attributes", randomVoxels(t, 5000, true)},
		{"two row groups", randomVoxels(t, rowGroupRows+7, true)},
		{"intensity only", func() *terrain.Voxels {
			v := randomVoxels(t, 100, true)
			v.Red, v.Green, v.Blue, v.Classes = nil, nil, nil, nil
			return v
		}()},
		{"none, but classes", &terrain.Voxels{Lattice: randomVoxels(t, 1, false).Lattice, Cells: []terrain.Cell{}, Moments: []terrain.Moments{}, Classes: []terrain.ClassCount{}}},
		{"none", &terrain.Voxels{Lattice: randomVoxels(t, 1, false).Lattice, Cells: []terrain.Cell{}, Moments: []terrain.Moments{}}},
	}
	for _, tt := range tests {
		b := encode(t, tt.v)
		if again := encode(t, tt.v); !bytes.Equal(b, again) {
			t.Errorf("%s: a second run wrote other bytes", tt.name)
		}
		got, meta, err := ReadVoxels(bytes.NewReader(b), int64(len(b)))
		if err != nil {
			t.Errorf("%s: %v", tt.name, err)
			continue
		}
		if !reflect.DeepEqual(got, tt.v) {
			t.Errorf("%s: voxels came back changed", tt.name)
		}
		if want := testMeta(); !reflect.DeepEqual(meta, want) {
			t.Errorf("%s: meta %+v, want %+v", tt.name, meta, want)
		}
	}
}

// Another reader of Parquet, by reflection on a struct, sees the same rows.
func TestVoxelsAsRows(t *testing.T) {
	v := randomVoxels(t, 1000, true)
	b := encode(t, v)
	type row struct {
		I       int32 `parquet:"i"`
		J       int32 `parquet:"j"`
		K       int32 `parquet:"k"`
		N       int64 `parquet:"n"`
		XX      int64 `parquet:"sum_xx"`
		Red     int64 `parquet:"sum_red"`
		Classes []struct {
			Class int32 `parquet:"class"`
			N     int64 `parquet:"n"`
		} `parquet:"classes"`
	}
	rows, err := parquet.Read[row](bytes.NewReader(b), int64(len(b)))
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != v.Len() {
		t.Fatalf("%d rows, want %d", len(rows), v.Len())
	}
	at := 0
	for i, r := range rows {
		if (terrain.Cell{I: r.I, J: r.J, K: r.K}) != v.Cells[i] || r.N != v.Moments[i].N || r.XX != v.Moments[i].XX || uint64(r.Red) != v.Red[i] {
			t.Fatalf("row %d: %+v", i, r)
		}
		for _, c := range r.Classes {
			if got := (terrain.ClassCount{Voxel: int32(i), Class: uint8(c.Class), N: c.N}); got != v.Classes[at] {
				t.Fatalf("row %d: class %+v, want %+v", i, got, v.Classes[at])
			}
			at++
		}
	}
	if at != len(v.Classes) {
		t.Errorf("%d class counts, want %d", at, len(v.Classes))
	}
}

func TestWriteVoxelsFails(t *testing.T) {
	if err := WriteVoxels(failingWriter{}, randomVoxels(t, 100, false), testMeta()); !errors.Is(err, errFull) {
		t.Errorf("error %v, want the writer's", err)
	}
}

// How many voxels the benchmarks take: LEDGEWORK_BENCH_VOXELS, or 300 000.
func benchVoxels(b *testing.B) *terrain.Voxels {
	n := 300000
	if os.Getenv("LEDGEWORK_BENCH_VOXELS") == "3M" {
		n = 3000000
	}
	return randomVoxels(b, n, false)
}

func BenchmarkWriteVoxels(b *testing.B) {
	v := benchVoxels(b)
	b.ReportAllocs()
	var out bytes.Buffer
	for b.Loop() {
		out.Reset()
		if err := WriteVoxels(&out, v, testMeta()); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(v.Len()), "ns/voxel")
	b.ReportMetric(float64(out.Len())/float64(v.Len()), "bytes/voxel")
}

func BenchmarkReadVoxels(b *testing.B) {
	v := benchVoxels(b)
	data := encode(b, v)
	b.ReportAllocs()
	for b.Loop() {
		if _, _, err := ReadVoxels(bytes.NewReader(data), int64(len(data))); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(v.Len()), "ns/voxel")
}
