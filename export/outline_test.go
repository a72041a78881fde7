package export

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/wkb"
	"github.com/paulmach/orb/planar"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// planar turns a shape into orb's type.
func (s shape) planar() orb.MultiPolygon {
	var out orb.MultiPolygon
	for _, polygon := range s {
		var p orb.Polygon
		for _, r := range polygon {
			var o orb.Ring
			for _, v := range r {
				o = append(o, orb.Point{v.E, v.N})
			}
			p = append(p, o)
		}
		out = append(out, p)
	}
	return out
}

// checkShape tests a shape against the cells it outlines: area, orientation,
// cells inside and outside by ray casting, components and holes by flood fill,
// validity by GEOS.
func checkShape(t *testing.T, name string, s shape, v *terrain.Voxels) {
	t.Helper()
	g := v.Lattice.SpacingM()
	filled := make(map[[2]int32]bool)
	for _, c := range v.Cells {
		filled[[2]int32{c.I, c.J}] = true
	}
	mp := s.planar()
	if got, want := planar.Area(mp), float64(len(filled))*g*g; math.Abs(got-want) > 1e-6*want {
		t.Errorf("%s: area %v, want %v", name, got, want)
	}
	for _, p := range mp {
		for i, r := range p {
			want := orb.CW
			if i == 0 {
				want = orb.CCW
			}
			if r.Orientation() != want || r[0] != r[len(r)-1] {
				t.Errorf("%s: ring %d has orientation %v, closed %v", name, i, r.Orientation(), r[0] == r[len(r)-1])
			}
			seen := make(map[orb.Point]bool)
			for _, p := range r[1:] {
				if seen[p] {
					t.Errorf("%s: ring %d visits %v twice", name, i, p)
				}
				seen[p] = true
			}
		}
	}
	lo, hi := [2]int32{math.MaxInt32, math.MaxInt32}, [2]int32{math.MinInt32, math.MinInt32}
	for c := range filled {
		for d := range 2 {
			lo[d], hi[d] = min(lo[d], c[d]-1), max(hi[d], c[d]+1)
		}
	}
	for j := lo[1]; j <= hi[1]; j++ {
		for i := lo[0]; i <= hi[0]; i++ {
			p := orb.Point{(float64(i) + 0.5) * g, (float64(j) + 0.5) * g}
			if got, want := planar.MultiPolygonContains(mp, p), filled[[2]int32{i, j}]; got != want {
				t.Errorf("%s: cell %d %d inside: %v, want %v", name, i, j, got, want)
			}
		}
	}
	// Ground is 4-connected, so components of it are polygons. A hole ring is a
	// 4-connected component of the rest, without the outside.
	components := func(value bool) int {
		seen, n := make(map[[2]int32]bool), 0
		for j := lo[1]; j <= hi[1]; j++ {
			for i := lo[0]; i <= hi[0]; i++ {
				if start := [2]int32{i, j}; filled[start] == value && !seen[start] {
					n++
					stack := [][2]int32{start}
					seen[start] = true
					for len(stack) > 0 {
						c := stack[len(stack)-1]
						stack = stack[:len(stack)-1]
						for _, d := range [4][2]int32{{1, 0}, {-1, 0}, {0, 1}, {0, -1}} {
							next := [2]int32{c[0] + d[0], c[1] + d[1]}
							inside := next[0] >= lo[0] && next[0] <= hi[0] && next[1] >= lo[1] && next[1] <= hi[1]
							if inside && filled[next] == value && !seen[next] {
								seen[next] = true
								stack = append(stack, next)
							}
						}
					}
				}
			}
		}
		return n
	}
	if got, want := len(s), components(true); got != want {
		t.Errorf("%s: %d polygons, want %d", name, got, want)
	}
	holes := 0
	for _, p := range s {
		holes += len(p) - 1
	}
	// Rest that touches the outside only by corners is bounded either by a
	// hole or, between two polygons, by both outlines; so this is a bound.
	if most := components(false) - 1; holes > most {
		t.Errorf("%s: %d holes, want at most %d", name, holes, most)
	}
	b, err := wkb.Marshal(mp)
	if err != nil {
		t.Fatal(err)
	}
	if ok, reason, err := gdal.ValidWKB(b); err != nil || !ok {
		t.Errorf("%s: valid %v, %s, %v", name, ok, reason, err)
	}
}

func all(v *terrain.Voxels) []int32 {
	out := make([]int32, v.Len())
	for i := range out {
		out[i] = int32(i)
	}
	return out
}

func TestOutlineOfPictures(t *testing.T) {
	tests := []struct {
		name            string
		rows            []string // north first
		polygons, holes int
	}{
		{"one cell", []string{"#"}, 1, 0},
		{"bar", []string{"####"}, 1, 0},
		{"diagonal pair", []string{".#", "#."}, 2, 0},
		{"frame", []string{"###", "#.#", "###"}, 1, 1},
		{"frame open at a corner", []string{"##.", "#.#", "###"}, 1, 1},
		{"two holes that touch", []string{"####", "##.#", "#.##", "####"}, 1, 2},
		{"island in a hole", []string{"#####", "#...#", "#.#.#", "#...#", "#####"}, 2, 1},
		{"island touches the frame", []string{"#####", "##..#", "#.#.#", "#...#", "#####"}, 2, 1},
		{"chessboard", []string{"#.#.", ".#.#", "#.#.", ".#.#"}, 8, 0},
		{"three holes in a ring", []string{"######", "#.##.#", "##..##", "######"}, 1, 3},
	}
	for _, tt := range tests {
		var cells []terrain.Cell
		for r, row := range tt.rows {
			for c, x := range row {
				if x == '#' {
					cells = append(cells, terrain.Cell{I: int32(c) - 1, J: int32(-r), K: 7})
				}
			}
		}
		v := voxelsAt(t, 0.5, cells)
		o := &outliner{voxels: v}
		for _, dense := range []bool{false, true} {
			s := o.outline(all(v), dense)
			checkShape(t, tt.name, s, v)
			holes := 0
			for _, p := range s {
				holes += len(p) - 1
			}
			if len(s) != tt.polygons || holes != tt.holes {
				t.Errorf("%s: %d polygons and %d holes, want %d and %d", tt.name, len(s), holes, tt.polygons, tt.holes)
			}
		}
	}
}

func TestOutlineOfRandomCells(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for round := range 150 {
		share, size := rng.Float64(), 1+rng.Int32N(20)
		i0, j0 := rng.Int32N(40)-20, rng.Int32N(40)-20
		cells := []terrain.Cell{{I: i0, J: j0}}
		for j := range size {
			for i := range size {
				if rng.Float64() < share {
					cells = append(cells, terrain.Cell{I: i0 + i, J: j0 + j, K: rng.Int32N(5)})
				}
			}
		}
		v := voxelsAt(t, 0.2, cells)
		o := &outliner{voxels: v}
		checkShape(t, fmt.Sprint("round ", round), o.outline(all(v), round%4 == 0), v)
	}
}

func TestOutlineVertices(t *testing.T) {
	v := voxelsAt(t, 30, []terrain.Cell{{I: 0}, {I: 1}, {I: 2}, {I: 2, J: 1, K: 4}})
	o := &outliner{voxels: v}
	s := o.outline(all(v), false)
	if got := len(s[0][0]); got != 7 {
		t.Errorf("%d positions, want the 6 corners and the first again", got)
	}
	if got := len(o.outline(all(v), true)[0][0]); got != 11 {
		t.Errorf("dense: %d positions, want one at each of 10 cell corners and the first again", got)
	}
	// The height at a corner is the mean of the cells that meet there.
	for _, p := range s[0][0] {
		if p.E == 60 && p.N == 30 {
			want := (v.Mean(1).Z + v.Mean(2).Z + v.Mean(3).Z) / 3
			if math.Abs(p.H-want) > 1e-4 {
				t.Errorf("height %v, want %v", p.H, want)
			}
		}
	}
	// sqrt(0.8·6.371e6·30/6) = 5048 m = 168 cells.
	if got := maxRun(300000); got != 168 {
		t.Errorf("longest run %d cells, want 168", got)
	}
	long := make([]terrain.Cell, 1000)
	for i := range long {
		long[i].I = int32(i)
	}
	v = voxelsAt(t, 30, long)
	o = &outliner{voxels: v}
	if got, want := len(o.outline(all(v), false)[0][0]), 5+2*(1000/168); got != want {
		t.Errorf("long bar: %d positions, want %d", got, want)
	}
}

func TestOutlineOfSurvey(t *testing.T) {
	var cells []terrain.Cell
	for j := range int32(300) {
		for i := range int32(200) {
			cells = append(cells, terrain.Cell{I: i + 100, J: j + 100, K: i / 10})
		}
	}
	v := voxelsAt(t, 0.5, cells)
	s := (&outliner{voxels: v}).survey(false)
	if got, want := planar.Area(s.planar()), 200*300*0.25; got != want {
		t.Errorf("area %v, want %v", got, want)
	}
	if len(s) != 1 || len(s[0]) != 1 || len(s[0][0]) != 5 {
		t.Errorf("outline %v, want one rectangle", s)
	}
}

func BenchmarkOutline(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, bm := range []struct {
		name  string
		size  int32
		share float64
	}{{"patch", 10, 0.9}, {"zone", 1000, 0.98}, {"noise", 1000, 0.6}} {
		var cells []terrain.Cell
		for j := range bm.size {
			for i := range bm.size {
				if rng.Float64() < bm.share {
					cells = append(cells, terrain.Cell{I: i, J: j})
				}
			}
		}
		v := voxelsAt(b, 0.05, cells)
		voxels := all(v)
		o := &outliner{voxels: v}
		b.Run(bm.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				o.outline(voxels, false)
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(voxels)), "ns/cell")
		})
	}
}
