package fit

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

const (
	testRadiusM = 5.0
	testProudM  = 0.3
)

// hood is a neighbourhood of members 0.2 m apart on the sheets, within R of the
// origin.
func hood(rng *rand.Rand, sheets ...sheetOf) *neighbourhood {
	h := &neighbourhood{spacing: 0.2}
	for _, s := range sheets {
		n := s.normal()
		for range int(25 * r3.Norm(r3.Cross(s.u, s.v))) {
			p := r3.Add(s.o, r3.Add(r3.Scale(rng.Float64(), s.u), r3.Scale(rng.Float64(), s.v)))
			p = r3.Add(p, r3.Scale(0.01*rng.NormFloat64(), n))
			if r3.Norm(p) < testRadiusM {
				h.members = append(h.members, hoodMember{p, n, 0.04, -1})
			}
		}
	}
	return h
}

func accepted(faces []face) (n int) {
	for i := range faces {
		if faces[i].accepted {
			n++
		}
	}
	return n
}

// floorOf is a level sheet at height z between x0 and x1.
func floorOf(x0, x1, z float64) sheetOf {
	return sheetOf{r3.Vec{X: x0, Y: -6, Z: z}, r3.Vec{X: x1 - x0}, r3.Vec{Y: 12}}
}

func TestFindFaces(t *testing.T) {
	wall := func(x, z0, z1 float64) sheetOf { // faces −X
		return sheetOf{r3.Vec{X: x, Y: -6, Z: z0}, r3.Vec{Z: z1 - z0}, r3.Vec{Y: 12}}
	}
	block := func(half, high float64) []sheetOf {
		return []sheetOf{
			{r3.Vec{X: -half, Y: -half, Z: high}, r3.Vec{X: 2 * half}, r3.Vec{Y: 2 * half}},
			{r3.Vec{X: -half, Y: -half}, r3.Vec{Z: high}, r3.Vec{Y: 2 * half}},
		}
	}
	for _, c := range []struct {
		name   string
		sheets []sheetOf
		want   int
	}{
		{"nothing", nil, 0},
		{"a plane", []sheetOf{floorOf(-6, 6, 0)}, 1},
		{"a foot", []sheetOf{floorOf(-6, 0, 0), wall(0, 0, 6)}, 2},
		// Between two faces, the tread of a ledge: 1.2 m deep.
		{"a ledge", []sheetOf{wall(0, -6, 0), floorOf(0, 1.2, 0), wall(1.2, 0, 6)}, 3},
		// 1 m square: an object. 4 m square: the ground, since 16 m² > 8.6 m².
		{"a block", append(block(0.5, 0.5), floorOf(-6, 6, 0)), 1},
		{"a plateau", append(block(2, 2)[:1], floorOf(-6, 6, 0)), 2},
	} {
		for seed := range uint64(3) {
			h := hood(rand.New(rand.NewPCG(1, seed)), c.sheets...)
			faces := h.findFaces(nil, testRadiusM, testProudM)
			if got := accepted(faces); got != c.want {
				t.Errorf("%s: %d faces, want %d", c.name, got, c.want)
			}
			for i := range faces {
				f := &faces[i]
				if !f.accepted {
					continue
				}
				var best float64
				for _, s := range c.sheets {
					if math.Abs(f.plane.signed(s.o)) < 0.05 {
						best = max(best, r3.Dot(f.plane.n, s.normal()))
					}
				}
				if best < 0.9995 { // 1.8°
					t.Errorf("%s: face %v is no sheet", c.name, f.plane)
				}
			}
		}
	}
}

// Faces are found again in working space that held others before.
func TestFindFacesReuse(t *testing.T) {
	first := hood(rand.New(rand.NewPCG(1, 1)), floorOf(-6, 6, 0))
	faces := first.findFaces(nil, testRadiusM, testProudM)
	want := faces[0]
	faces = first.findFaces(faces, testRadiusM, testProudM)
	if len(faces) == 0 || faces[0] != want {
		t.Error("another face the second time")
	}
}

// A uniform strip has the length that it has.
func TestPieceLength(t *testing.T) {
	h := hood(rand.New(rand.NewPCG(1, 1)), sheetOf{r3.Vec{X: -2, Y: -0.2}, r3.Vec{X: 4}, r3.Vec{Y: 0.4}})
	for i := range h.members {
		h.pieces[0] = append(h.pieces[0], int32(i))
	}
	near(t, "length", h.length(0), 4, 0.5)
}
