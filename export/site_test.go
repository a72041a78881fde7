package export

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/hazards"
	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// A gdalProjector projects by PROJ.
type gdalProjector struct{ t *gdal.Transform }

func (p gdalProjector) ToWGS84(x, y, z []float64) error { return p.t.Apply(x, y, z) }

// newProjector projects from the CRS to OGC:CRS84.
func newProjector(t testing.TB, crs string) Projector {
	t.Helper()
	src, err := gdal.ParseCRS(crs)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { src.Close() })
	dst, err := gdal.ParseCRS("OGC:CRS84")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { dst.Close() })
	tr, err := gdal.NewTransform(src, dst)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { tr.Close() })
	return gdalProjector{tr}
}

// voxelsAt makes voxels of edge g with a few points in each of the cells, which
// may repeat and have any order.
func voxelsAt(t testing.TB, g float64, cells []terrain.Cell) *terrain.Voxels {
	t.Helper()
	l, err := terrain.NewLattice(g)
	if err != nil {
		t.Fatal(err)
	}
	cells = slices.Clone(cells)
	slices.SortFunc(cells, terrain.Cell.Compare)
	v := &terrain.Voxels{Lattice: l, Cells: slices.Compact(cells)}
	v.Moments = make([]terrain.Moments, len(v.Cells))
	rng := rand.New(rand.NewPCG(1, 1))
	half := l.Quanta() / 2
	for i := range v.Moments {
		for range 1 + rng.IntN(20) {
			v.Moments[i].AddPoint(rng.Int64N(2*half)-half, rng.Int64N(2*half)-half, rng.Int64N(2*half)-half)
		}
	}
	return v
}

// testSite is a site of n × n columns with an obstacle, a patch on a vertical
// face and a zone with a hole, its south-west corner near (e, north) metres.
func testSite(t testing.TB, g, e, north float64, n int32) *Site {
	t.Helper()
	i0, j0 := int32(math.Floor(e/g)), int32(math.Floor(north/g))
	var cells []terrain.Cell
	for j := range n {
		for i := range n {
			cells = append(cells, terrain.Cell{I: i0 + i, J: j0 + j, K: (i + j) / 3})
		}
		cells = append(cells, terrain.Cell{I: i0, J: j0 + n/2, K: 100 + j}) // a pillar
	}
	v := voxelsAt(t, g, cells)
	within := func(keep func(i, j, k int32) bool) []int32 {
		var out []int32
		for at, c := range v.Cells {
			if keep(c.I-i0, c.J-j0, c.K) {
				out = append(out, int32(at))
			}
		}
		return out
	}
	axes := [3]r3.Vec{{X: 0.6, Y: 0.8}, {X: -0.8, Y: 0.6}, {Z: 1}}
	ellipsoid := fit.Ellipsoid{Centre: r3.Vec{X: e + 1.0/3, Y: north + 0.1, Z: 5}, SemiAxes: [3]float64{3, 2, 1}, Axes: axes}
	inflated := ellipsoid
	inflated.SemiAxes = [3]float64{3.5, 2.5, 1.5}
	plane := fit.Plane{Centroid: ellipsoid.Centre, Normal: r3.Vec{X: 0.6, Z: 0.8}, Points: 100, Voxels: 10}
	zone := hazards.Zone{
		ID: "zone-1", AreaM2: 30, PatchCount: 1, BestPatch: "patch-1", BestScore: 0.9, MeanScore: 0.5, InclinationDeg: 30, DipDirectionDeg: 90,
		Voxels: within(func(i, j, k int32) bool { return k < 100 && (i < n/4 || i > n/2 || j < n/4 || j > n/2) }),
	}
	return &Site{
		Name:  "Gull Head",
		CRS:   CRS{Authority: "EPSG", Code: "32633", Name: "WGS 84 / UTM zone 33N", WKT: "PROJCRS[…]"},
		Dates: []string{"2026-05-14"}, Voxels: v, InflatedByM: 0.5,
		Profile: hazards.Profile{Name: "ledge", FootprintRadiusM: 0.4},
		Findings: hazards.Findings{
			Obstacles: []hazards.Obstacle{{
				ID: "bulge-1", Kind: hazards.Bulge, Ellipsoid: ellipsoid, Inflated: inflated, Face: plane, HeightM: 0.5, AreaM2: 4,
				RockVolumeM3: 0.7, RockShare: 0.4, VolumeGap: 5e-7, DipDirectionDeg: 90, SurfaceVariation: math.NaN(),
				Voxels: within(func(i, j, _ int32) bool { return i >= n/4 && i <= n/2 && j >= n/4 && j <= n/2 }),
			}},
			Patches: []hazards.Patch{
				{ID: "patch-1", Voxel: zone.Voxels[0], Voxels: within(func(_, _, k int32) bool { return k >= 100 }), Plane: plane, ClearanceM: math.Inf(1), Score: 0.5, LimitedBy: hazards.Step},
				{ID: "patch-2", Voxel: int32(v.Len() - 1), Voxels: within(func(i, j, _ int32) bool { return i < 3 && j < 3 }), Plane: plane, ClearanceM: 2, Score: 0.9},
			},
			Zones: []hazards.Zone{zone},
		},
	}
}

// Whoever reads only the layer learns what heights are, and on which lattice
// voxels lie, whether or not the survey says what its heights refer to.
func TestSiteFrame(t *testing.T) {
	s := &Site{Voxels: voxelsAt(t, 0.05, []terrain.Cell{{}})}
	for _, want := range []string{"(local coordinates)", "vertical datum: unknown;", "no geoid is applied", "floor(coordinate / 0.05 m)"} {
		if got := s.Frame(); !strings.Contains(got, want) {
			t.Errorf("%q lacks %q", got, want)
		}
	}
	s.CRS = CRS{Name: "ETRS89 / UTM zone 33N", Vertical: "NN2000 height"}
	for _, want := range []string{"(ETRS89 / UTM zone 33N)", "vertical datum: NN2000 height;"} {
		if got := s.Frame(); !strings.Contains(got, want) {
			t.Errorf("%q lacks %q", got, want)
		}
	}
}
