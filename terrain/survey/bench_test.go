package survey_test

import (
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"testing"

	"ledgework/terrain"
	"ledgework/terrain/demo"
	"ledgework/terrain/las"
	"ledgework/terrain/survey"
)

// The face of the benchmarks: 5 million points in the order of a scan, about
// eight in a voxel of 5 cm, as of a scan from 30 m.
const (
	facePoints  = 5_000_000
	faceSpacing = 0.05
)

func newFace(b *testing.B) *demo.Face {
	b.Helper()
	f, err := demo.NewFace(demo.FaceOptions{
		Points: facePoints, WidthM: 50, HeightM: 30, InclinationDeg: 70, RoughM: 0.3, NoiseM: 0.01, Seed: 1,
	})
	if err != nil {
		b.Fatal(err)
	}
	return f
}

// writeFace writes the face as LAS and returns its path.
func writeFace(b *testing.B, format uint8) string {
	b.Helper()
	path := filepath.Join(b.TempDir(), "face.las")
	out, err := os.Create(path)
	if err != nil {
		b.Fatal(err)
	}
	defer out.Close()
	face := newFace(b)
	w, err := las.NewWriter(out, las.WriterOptions{
		PointFormat: format, Scale: [3]float64{1e-4, 1e-4, 1e-4}, Offset: [3]float64{412000, 6543000, 0},
	})
	if err != nil {
		b.Fatal(err)
	}
	batch := terrain.NewBatch(terrain.BatchPoints, terrain.Intensity|terrain.Class)
	for {
		err := face.Read(batch)
		if err == io.EOF {
			break
		}
		if err == nil {
			err = w.Write(batch)
		}
		if err != nil {
			b.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		b.Fatal(err)
	}
	return path
}

func lattice(b *testing.B) terrain.Lattice {
	b.Helper()
	l, err := terrain.NewLattice(faceSpacing)
	if err != nil {
		b.Fatal(err)
	}
	return l
}

// perPoint reports the time for a point of the face.
func perPoint(b *testing.B) {
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/facePoints, "ns/point")
}

// From a LAS file in the system's cache to sorted voxels, by the way that a
// build takes: sections of the file, filter, sums, order. A build also sums
// what else the file has: intensity and classes of nearly every scan.
func BenchmarkPointsToVoxels(b *testing.B) {
	for _, format := range []uint8{0, 6} {
		sources := []survey.Source{{Path: writeFace(b, format), CRS: "EPSG:32633"}}
		for _, workers := range []int{1, 2} {
			b.Run(fmt.Sprintf("format=%d/xyz/workers=%d", format, workers), func(b *testing.B) {
				benchmarkVoxels(b, sources, 0, workers)
			})
			b.Run(fmt.Sprintf("format=%d/attributes/workers=%d", format, workers), func(b *testing.B) {
				benchmarkVoxels(b, sources, terrain.Intensity|terrain.Class, workers)
			})
		}
	}
}

func benchmarkVoxels(b *testing.B, sources []survey.Source, columns terrain.Columns, workers int) {
	ctx := context.Background()
	frame, err := survey.Plan(ctx, sources, "auto")
	if err != nil {
		b.Fatal(err)
	}
	opts := survey.StreamOptions{
		Workers: workers, Columns: columns,
		Filter: survey.Filter{ExcludeClasses: []uint8{7, 18}, DropWithheld: true},
	}
	b.ReportAllocs()
	for b.Loop() {
		sums := terrain.NewAccumulator(lattice(b), columns)
		adders := make([]*terrain.Adder, workers)
		for i := range adders {
			adders[i] = sums.NewAdder()
		}
		counts, err := survey.Stream(ctx, frame, sources, opts, func(worker int, batch *terrain.Batch) error {
			return adders[worker].Add(batch)
		}, nil)
		if err != nil {
			b.Fatal(err)
		}
		if v := sums.Voxels(); counts.Kept != facePoints || v.Len() == 0 {
			b.Fatalf("%d points in %d voxels", counts.Kept, v.Len())
		}
	}
	perPoint(b)
}

// The sums alone, of batches that are decoded already, and their order.
func BenchmarkAccumulate(b *testing.B) {
	var batches []*terrain.Batch
	for face := newFace(b); ; {
		batch := terrain.NewBatch(terrain.BatchPoints, 0)
		err := face.Read(batch)
		if err == io.EOF {
			break
		}
		if err != nil {
			b.Fatal(err)
		}
		batches = append(batches, batch)
	}
	b.ReportAllocs()
	for b.Loop() {
		sums := terrain.NewAccumulator(lattice(b), 0)
		adder := sums.NewAdder()
		for _, batch := range batches {
			if err := adder.Add(batch); err != nil {
				b.Fatal(err)
			}
		}
		if sums.Voxels().Points() != facePoints {
			b.Fatal("points are missing")
		}
	}
	perPoint(b)
}
