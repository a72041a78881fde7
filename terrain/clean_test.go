package terrain

import (
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// A wall with many points a voxel, a bird beside it, and a thin wire of as many
// points a voxel as the wall, all in one survey.
func TestCleanDropsStraysOnly(t *testing.T) {
	var points []r3.Vec
	for i := range 200 {
		for k := range 200 {
			points = append(points, r3.Vec{X: float64(i) * 0.02, Z: float64(k) * 0.02})
		}
	}
	bird := r3.Vec{X: 1, Y: -2, Z: 2}
	points = append(points, bird, r3.Add(bird, r3.Vec{X: 0.03}))
	for i := range 200 {
		points = append(points, r3.Vec{X: 1, Y: -4 - float64(i)*0.01, Z: 3})
	}
	l := mustLattice(t, 0.1)
	v, err := SumPoints(l, points)
	if err != nil {
		t.Fatal(err)
	}
	cleaned, dropped := Clean(v)
	if dropped.Points != 2 || cleaned.Points() != int64(len(points)-2) {
		t.Errorf("dropped %+v, want the bird's 2 points", dropped)
	}
	if cleaned.Find(l.CellOf(bird)) >= 0 {
		t.Error("the bird is still there")
	}
	if v.Find(l.CellOf(bird)) < 0 {
		t.Error("Clean changed its argument")
	}
}

// Where the surface has a point or two a voxel, a stray has as many.
func TestCleanOfThinScan(t *testing.T) {
	var points []r3.Vec
	for i := range 60 {
		for k := range 60 {
			points = append(points, r3.Vec{X: float64(i) * 0.11, Z: float64(k) * 0.11})
		}
	}
	// The face thins out towards one edge, which is no reason to drop it.
	for i := range 20 {
		points = append(points, r3.Vec{X: -0.25 * float64(1+i/10), Z: 0.25 * float64(i%10)})
	}
	surface := len(points)
	points = append(points, r3.Vec{X: 3, Y: -1, Z: 3}, r3.Vec{X: 3, Y: -30, Z: 3})
	v, err := SumPoints(mustLattice(t, 0.1), points)
	if err != nil {
		t.Fatal(err)
	}
	if cleaned, dropped := Clean(v); dropped != (Cleaned{2, 2}) || cleaned.Points() != int64(surface) {
		t.Errorf("dropped %+v, want the two strays", dropped)
	}
}

func TestCleanKeepsAttributesInStep(t *testing.T) {
	b := NewBatch(100, Intensity|Color|Class)
	b.Resize(100)
	for i := range b.X {
		b.X[i], b.Y[i], b.Z[i] = float64(i%8)*0.5, float64(i/8)*0.5, 0
		b.Intensity[i], b.Red[i], b.Class[i] = uint16(i), uint16(i), uint8(i%3)
	}
	b.X[99], b.Y[99] = 500, 0
	l := mustLattice(t, 2)
	a := NewAccumulator(l, b.Columns())
	if err := a.NewAdder().Add(b); err != nil {
		t.Fatal(err)
	}
	v := a.Voxels()
	cleaned, dropped := Clean(v)
	if dropped != (Cleaned{1, 1}) {
		t.Fatalf("dropped %+v, want one voxel of one point", dropped)
	}
	var classes int64
	for _, c := range cleaned.Classes {
		classes += c.N
	}
	var intensity uint64
	for _, s := range cleaned.Intensity {
		intensity += s
	}
	if classes != 99 || intensity != 99*98/2 || len(cleaned.Red) != cleaned.Len() {
		t.Errorf("classes of %d points, intensities of %d; want 99, %d", classes, intensity, 99*98/2)
	}
}

// Every voxel of a survey is looked at: none may cost memory of its own.
func TestCleanAllocatesNothingPerVoxel(t *testing.T) {
	count := func(n int) float64 {
		var points []r3.Vec
		for i := range n {
			for j := range n {
				points = append(points, r3.Vec{X: float64(i) + 0.5, Y: float64(j) + 0.5})
			}
		}
		l, err := NewLattice(1)
		if err != nil {
			t.Fatal(err)
		}
		v, err := SumPoints(l, points)
		if err != nil {
			t.Fatal(err)
		}
		return testing.AllocsPerRun(1, func() { Clean(v) })
	}
	// Lists that grow with the survey do so a few times more for 16 times as
	// many voxels.
	if small, large := count(50), count(200); large > small+50 {
		t.Errorf("%g allocations for 2500 voxels, %g for 40000", small, large)
	}
}
