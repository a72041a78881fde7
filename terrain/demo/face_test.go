package demo

import (
	"errors"
	"io"
	"math"
	"testing"

	"ledgework/terrain"
)

func TestFace(t *testing.T) {
	var _ terrain.Reader = (*Face)(nil)
	o := FaceOptions{Points: 100_003, WidthM: 40, HeightM: 25, InclinationDeg: 70, RoughM: 0.05, NoiseM: 0.01, Seed: 3}
	read := func(batch int) (x, y, z []float64) {
		f, err := NewFace(o)
		if err != nil {
			t.Fatal(err)
		}
		b := terrain.NewBatch(batch, terrain.Intensity|terrain.Color)
		for {
			err := f.Read(b)
			if errors.Is(err, io.EOF) {
				break
			}
			if err != nil {
				t.Fatal(err)
			}
			x, y, z = append(x, b.X...), append(y, b.Y...), append(z, b.Z...)
		}
		if f.Consumed() != o.Points {
			t.Errorf("consumed %d", f.Consumed())
		}
		return x, y, z
	}
	x, y, z := read(4096)
	if int64(len(x)) != o.Points {
		t.Fatalf("%d points, want %d", len(x), o.Points)
	}
	sin, cos := sincosDeg(70)
	for i := range x {
		// Across the plane through the lower corner that faces south.
		across := -(y[i]-originN)*sin + z[i]*cos
		if math.Abs(across) > 1.5*o.RoughM+o.NoiseM {
			t.Fatalf("point %d lies %g m off the face", i, across)
		}
		if e := x[i] - originE; e < 0 || e > o.WidthM {
			t.Fatalf("point %d at %g m along the face", i, e)
		}
		if up := (y[i]-originN)*cos + z[i]*sin; up < -1e-9 || up > o.HeightM+1e-9 {
			t.Fatalf("point %d at %g m up the face", i, up)
		}
	}
	x2, y2, z2 := read(777)
	for i := range x {
		if x[i] != x2[i] || y[i] != y2[i] || z[i] != z2[i] {
			t.Fatalf("point %d depends on the size of batches", i)
		}
	}
}

func TestFaceDoesNotAllocate(t *testing.T) {
	f, err := NewFace(FaceOptions{Points: 1 << 30, WidthM: 100, HeightM: 50, InclinationDeg: 80})
	if err != nil {
		t.Fatal(err)
	}
	b := terrain.NewBatch(terrain.BatchPoints, terrain.Intensity)
	if got := testing.AllocsPerRun(20, func() {
		if err := f.Read(b); err != nil {
			t.Error(err)
		}
	}); got != 0 {
		t.Errorf("%g allocations a batch", got)
	}
}

func TestNewFaceErrors(t *testing.T) {
	for _, o := range []FaceOptions{
		{}, {Points: 5}, {Points: 5, WidthM: 1}, {Points: -1, WidthM: 1, HeightM: 1}, {Points: 5, WidthM: math.NaN(), HeightM: 1},
	} {
		if _, err := NewFace(o); err == nil {
			t.Errorf("%+v is accepted", o)
		}
	}
}

func BenchmarkFace(b *testing.B) {
	f, err := NewFace(FaceOptions{Points: 1 << 40, WidthM: 1e5, HeightM: 50, InclinationDeg: 80, RoughM: 0.05, NoiseM: 0.005})
	if err != nil {
		b.Fatal(err)
	}
	batch := terrain.NewBatch(terrain.BatchPoints, terrain.Intensity)
	b.ReportAllocs()
	for b.Loop() {
		if err := f.Read(batch); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/terrain.BatchPoints, "ns/point")
}
