package las_test

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"

	"ledgework/terrain"
	"ledgework/terrain/las"
)

// A Writer and a Reader on the same file.
func Example() {
	dir, err := os.MkdirTemp("", "las")
	if err != nil {
		fmt.Println(err)
		return
	}
	defer os.RemoveAll(dir)
	f, err := os.Create(filepath.Join(dir, "cliff.las"))
	if err != nil {
		fmt.Println(err)
		return
	}
	defer f.Close()

	w, err := las.NewWriter(f, las.WriterOptions{PointFormat: 6, Scale: [3]float64{0.01, 0.01, 0.01}})
	if err != nil {
		fmt.Println(err)
		return
	}
	points := terrain.NewBatch(2, terrain.Class)
	points.Resize(2)
	copy(points.X, []float64{10, 11.25})
	copy(points.Y, []float64{20, 21.5})
	copy(points.Z, []float64{30, 31})
	copy(points.Class, []uint8{2, 7})
	if err := errors.Join(w.Write(points), w.Close()); err != nil {
		fmt.Println(err)
		return
	}

	info, err := f.Stat()
	if err != nil {
		fmt.Println(err)
		return
	}
	r, err := las.NewReader(f, info.Size(), las.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(r.Header().Format, r.Header().Points)
	for {
		err := r.Read(points)
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			fmt.Println(err)
			return
		}
		for i := range points.Len() {
			fmt.Println(points.X[i], points.Y[i], points.Z[i], points.Class[i])
		}
	}
	// Output:
	// LAS 1.4, point format 6 2
	// 10 20 30 2
	// 11.25 21.5 31 7
}
