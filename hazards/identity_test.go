package hazards

import (
	"fmt"
	"strings"
	"testing"

	"ledgework/terrain"
)

func lattice(t testing.TB, g float64) terrain.Lattice {
	t.Helper()
	l, err := terrain.NewLattice(g)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func ExampleID() {
	l, _ := terrain.NewLattice(0.05)
	fmt.Println(ID("pa", l, terrain.Cell{I: 8620012, J: -3, K: 2401}))
	// Output: pa-4vvlnwj5hh
}

// Everything that an id is made of changes it.
func TestIDDependsOn(t *testing.T) {
	l := lattice(t, 0.05)
	seen := map[string]bool{}
	add := func(id string) {
		if seen[id] {
			t.Errorf("%s twice", id)
		}
		seen[id] = true
	}
	c := terrain.Cell{I: 1, J: 2, K: 3}
	add(ID(patchPrefix, l, c))
	add(ID(zonePrefix, l, c))
	add(ID(bulgePrefix, l, c))
	add(ID(patchPrefix, lattice(t, 0.1), c))
	for _, d := range []terrain.Cell{{I: 2, J: 1, K: 3}, {I: 1, J: 3, K: 2}, {I: -1, J: 2, K: 3}, {}} {
		add(ID(patchPrefix, l, d))
	}
}

func TestIDsAreDistinctAndStable(t *testing.T) {
	l := lattice(t, 0.05)
	var cells []terrain.Cell
	for i := range int32(30) {
		for j := range int32(30) {
			cells = append(cells, terrain.Cell{I: i * 3, J: -j, K: i ^ j})
		}
	}
	ids := IDs(patchPrefix, l, cells)
	seen := map[string]bool{}
	for i, id := range ids {
		if id != ID(patchPrefix, l, cells[i]) {
			t.Errorf("cell %v: %s, want its own %s", cells[i], id, ID(patchPrefix, l, cells[i]))
		}
		if seen[id] || !strings.HasPrefix(id, "pa-") || len(id) != len("pa-")+idDigits {
			t.Errorf("id %q", id)
		}
		seen[id] = true
	}
	// Another order of the cells, the same names.
	n := len(cells)
	turned := make([]terrain.Cell, n)
	for i := range cells {
		turned[n-1-i] = cells[i]
	}
	for i, id := range IDs(patchPrefix, l, turned) {
		if id != ids[n-1-i] {
			t.Errorf("cell %v: %s in another order, was %s", turned[i], id, ids[n-1-i])
		}
	}
}

// Two things in one cell collide for certain, so they show what a collision
// does: the first keeps the id, the next is drawn again, the same in every run.
func TestIDsOfOneCell(t *testing.T) {
	l := lattice(t, 0.05)
	c := terrain.Cell{I: 7}
	a, b := IDs(patchPrefix, l, []terrain.Cell{c, {}, c}), IDs(patchPrefix, l, []terrain.Cell{c, {}, c})
	if a[0] != ID(patchPrefix, l, c) || a[2] == a[0] || a[1] == a[2] {
		t.Errorf("ids %v", a)
	}
	for i := range a {
		if a[i] != b[i] {
			t.Errorf("%s in one run, %s in another", a[i], b[i])
		}
	}
}
