package survey

import (
	"slices"
	"testing"

	"ledgework/terrain"
)

func TestSieveKeepsColumnsTogether(t *testing.T) {
	b := terrain.NewBatch(4, terrain.Class|terrain.Intensity)
	b.Resize(4)
	for i := range 4 {
		b.X[i], b.Y[i], b.Z[i] = float64(i), 10+float64(i), 20+float64(i)
		b.Class[i], b.Flags[i], b.Intensity[i] = uint8(i), 0, uint16(100+i)
	}
	s := newSieve(Filter{ExcludeClasses: []uint8{1}})
	s.raw(b)
	if !slices.Equal(b.X, []float64{0, 2, 3}) || !slices.Equal(b.Intensity, []uint16{100, 102, 103}) || !slices.Equal(b.Class, []uint8{0, 2, 3}) {
		t.Errorf("got %v %v %v", b.X, b.Intensity, b.Class)
	}
	if got := s.dropped.list(); len(got) != 1 || got[0] != (Drop{"class 1", 1}) {
		t.Errorf("dropped %v", got)
	}
}

func TestAddDefects(t *testing.T) {
	a := []terrain.Defect{{Reason: "x", Count: 1, First: "point 1"}}
	got := addDefects(addDefects(nil, a), []terrain.Defect{{Reason: "y", Count: 2}, {Reason: "x", Count: 3, First: "point 9"}})
	if len(got) != 2 || got[0] != (terrain.Defect{Reason: "x", Count: 4, First: "point 1"}) || a[0].Count != 1 {
		t.Errorf("got %v, the argument is %v", got, a)
	}
}
