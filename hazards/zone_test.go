package hazards

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// Two level ledges on a wall: two zones, each with its own patches, and nothing
// of the wall.
func TestZonesOnTwoLedges(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const spacing = 0.05
	var points []r3.Vec
	ledge := func(x, z, length, depth float64) {
		points = append(points, sheet(rng, r3.Vec{X: x, Y: depth / 2, Z: z}, r3.Vec{Z: 1}, length/2, depth/2, spacing/4, flat)...)
		// The wall below the ledge's lip and above its back.
		for _, w := range []struct{ y, z float64 }{{0, z - 1.5}, {depth, z + 1.5}} {
			points = append(points, sheet(rng, r3.Vec{X: x, Y: w.y, Z: w.z}, r3.Vec{Y: -1}, length/2, 1.5, spacing/4, flat)...)
		}
	}
	ledge(0, 0, 4, 1.5)
	ledge(20, 7, 2, 1.4)
	g := newGround(t, spacing, 0.4, r3.Vec{Y: -0.3, Z: 1}, points)
	p, _ := Example("ledge")
	patches, zones, err := FindPatches(context.Background(), g.surface, g.planes, nil, &p, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	if len(zones) != 2 {
		t.Fatalf("%d zones, want 2", len(zones))
	}
	lies := map[int32]int{}
	total := 0
	for i := range zones {
		z := &zones[i]
		length, depth := 4.0, 1.5
		if g.surface.Voxels.Mean(int(z.Voxels[0])).X > 10 {
			length, depth = 2.0, 1.4
		}
		if !slices.IsSorted(z.Voxels) {
			t.Errorf("%s: voxels out of order", z.ID)
		}
		for _, v := range z.Voxels {
			lies[v]++
		}
		// Centres stay about a radius, less what coverage and step allow, away
		// from lip, back and ends.
		if z.AreaM2 < (length-0.8)*(depth-0.8) || z.AreaM2 > length*depth {
			t.Errorf("%s: area %g of a ledge %g by %g", z.ID, z.AreaM2, length, depth)
		}
		// Planes at the back bend up with the wall, those at the lip down.
		near(t, "inclination", z.InclinationDeg, 0, 5)
		if z.PatchCount < 2 || z.MeanScore <= 0 || z.MeanScore > z.BestScore || z.BestScore > 1 {
			t.Errorf("%s: %d patches, mean %g, best %g", z.ID, z.PatchCount, z.MeanScore, z.BestScore)
		}
		total += z.PatchCount
		at := slices.IndexFunc(patches, func(q Patch) bool { return q.ID == z.BestPatch })
		if at < 0 || patches[at].Score != z.BestScore {
			t.Errorf("%s: best patch %q", z.ID, z.BestPatch)
		}
	}
	if total != len(patches) {
		t.Errorf("%d patches in zones, %d in all", total, len(patches))
	}
	for _, q := range patches {
		if lies[q.Voxel] != 1 {
			t.Errorf("%s lies in %d zones", q.ID, lies[q.Voxel])
		}
		if q.InclinationDeg > 5 {
			t.Errorf("%s at %g°", q.ID, q.InclinationDeg)
		}
	}
	if !slices.IsSortedFunc(zones, func(a, b Zone) int { return compareIDs(a.ID, b.ID) }) ||
		!slices.IsSortedFunc(patches, func(a, b Patch) int { return compareIDs(a.ID, b.ID) }) {
		t.Error("not sorted by id")
	}
}

func compareIDs(a, b string) int {
	if a < b {
		return -1
	}
	return 1
}

// The area of a zone is that of the plane it lies on, whatever its direction,
// and for an elevation grid too.
func TestZoneAreaOfPlanes(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	p := lenient(0.3)
	const half = 1.0
	for range 12 {
		n := randomDirection(rng)
		for _, noise := range []float64{0, 0.01} {
			points := sheet(rng, r3.Vec{X: 0.013, Y: 0.021, Z: 0.017}, n, half, half, 0.008, func(a, b float64) (float64, bool) { return noise * rng.NormFloat64(), true })
			g := newGround(t, 0.05, 0.3, n, points)
			_, zones, err := FindPatches(context.Background(), g.surface, g.planes, nil, p, fit.Work{Workers: 2})
			if err != nil || len(zones) != 1 {
				t.Fatalf("%d zones, %v", len(zones), err)
			}
			// Columns that the rim cuts count in full: on average as many more as
			// a border of half a cell holds, of cells that the normal slants.
			const extra = 0.05 * 8 * half / 2
			near(t, "area", zones[0].AreaM2, 4*half*half+1.3*extra, 0.5*extra)
			near(t, "inclination", zones[0].InclinationDeg, math.Acos(n.Z)*180/math.Pi, 0.3)
			near(t, "spread", zones[0].SpreadDeg, 0, 3)
		}
	}
	for _, lean := range []float64{0, 20, 45} {
		n := leaning(lean, 30)
		var points []r3.Vec
		for i := range 40 {
			for j := range 40 {
				x, y := float64(i)+0.5, float64(j)+0.5
				points = append(points, r3.Vec{X: x, Y: y, Z: -(n.X*x + n.Y*y) / n.Z})
			}
		}
		g := newGround(t, 1, 4, r3.Vec{Z: 1}, points)
		_, zones, err := FindPatches(context.Background(), g.surface, g.planes, nil, lenient(4), fit.Work{Workers: 2})
		if err != nil || len(zones) != 1 {
			t.Fatalf("%d zones, %v", len(zones), err)
		}
		near(t, "area of a grid", zones[0].AreaM2, 1600/n.Z, 0.01*1600/n.Z)
	}
}

// connected against the definition on all pairs.
func TestConnectedAgainstBruteForce(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, reach := range []int32{1, 3} {
		for _, side := range []int32{6, 12, 30} {
			set := map[terrain.Cell]bool{}
			for range 150 {
				set[terrain.Cell{I: rng.Int32N(side) - 3, J: rng.Int32N(side), K: rng.Int32N(side) - side}] = true
			}
			var cells []terrain.Cell
			for c := range set {
				cells = append(cells, c)
			}
			slices.SortFunc(cells, terrain.Cell.Compare)
			var list []int32
			for i := range cells {
				if rng.IntN(5) > 0 {
					list = append(list, int32(i))
				}
			}
			// Flood: repeat until no label changes.
			want := slices.Clone(list)
			for changed := true; changed; {
				changed = false
				for a := range list {
					for b := range list {
						x, y := cells[list[a]], cells[list[b]]
						if max(abs(x.I-y.I), abs(x.J-y.J), abs(x.K-y.K)) <= reach && want[a] > want[b] {
							want[a], changed = want[b], true
						}
					}
				}
			}
			got, err := connected(context.Background(), cells, list, reach)
			if err != nil {
				t.Fatal(err)
			}
			if !slices.Equal(got, want) {
				t.Errorf("reach %d, side %d: labels %v, want %v", reach, side, got, want)
			}
		}
	}
}

func abs(v int32) int32 { return max(v, -v) }

// Normals spread evenly over an arc of ±α have the resultant sin α/α.
func TestZoneSpreadOfArc(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	const radius, half = 4.0, math.Pi / 6
	var points []r3.Vec
	for range 40000 {
		sin, cos := math.Sincos(half * (2*rng.Float64() - 1))
		points = append(points, r3.Vec{X: 5 * rng.Float64(), Y: radius * sin, Z: radius * cos})
	}
	g := newGround(t, 0.1, 0.4, r3.Vec{Z: 1}, points)
	_, zones, err := FindPatches(context.Background(), g.surface, g.planes, nil, lenient(0.4), fit.Work{Workers: 2})
	if err != nil || len(zones) != 1 {
		t.Fatalf("%d zones, %v", len(zones), err)
	}
	near(t, "spread", zones[0].SpreadDeg, math.Acos(math.Sin(half)/half)*180/math.Pi, 0.5)

	// The same arc about an upright axis: its azimuths have that resultant too.
	for i, p := range points {
		points[i] = r3.Vec{X: p.Y, Y: p.Z, Z: p.X}
	}
	g = newGround(t, 0.1, 0.4, r3.Vec{Y: 1}, points)
	_, zones, err = FindPatches(context.Background(), g.surface, g.planes, nil, lenient(0.4), fit.Work{Workers: 2})
	if err != nil || len(zones) != 1 {
		t.Fatalf("%d zones, %v", len(zones), err)
	}
	z, r := &zones[0], math.Sin(half)/half
	near(t, "concentration", z.Concentration, 1/(1-r), 0.05/(1-r))
	near(t, "mean dip direction off north", math.Remainder(z.DipDirectionMeanDeg, 360), 0, 0.5)
	near(t, "spread of dip directions", z.DipDirectionSpreadDeg, math.Sqrt(-2*math.Log(r))*180/math.Pi, 0.5)
}
