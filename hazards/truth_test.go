package hazards

import (
	"context"
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
	"ledgework/terrain/demo"
)

// demoSpacingM is the spacing of the demo's run.
const demoSpacingM = 0.05

// A demoRun is everything found on the demo site.
type demoRun struct {
	season  *demo.Season
	truth   demo.Truth
	surface *Surface
	found   []Obstacle
}

func newDemoRun(t *testing.T) *demoRun {
	t.Helper()
	ctx := context.Background()
	season := demo.NewSite(1).Season(1)
	l, err := terrain.NewLattice(demoSpacingM)
	if err != nil {
		t.Fatal(err)
	}
	a := terrain.NewAccumulator(l, 0)
	d := a.NewAdder()
	if err := season.Scan(ctx, demo.ScanOptions{}, 2, func(b *terrain.Batch) error { return d.Add(b) }); err != nil {
		t.Fatal(err)
	}
	v, _ := terrain.Clean(a.Voxels())
	o, _ := ObstacleOptions{}.Resolve(demoSpacingM)
	s, err := NewSurface(ctx, v, season.Stations(), o, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	if err := s.MeasureRelief(ctx); err != nil {
		t.Fatal(err)
	}
	found, err := FindObstacles(ctx, s)
	if err != nil {
		t.Fatal(err)
	}
	return &demoRun{season, season.Truth(), s, found}
}

// The demo's truth, end to end but for files. It takes half a minute on two
// cores.
func TestDemoTruth(t *testing.T) {
	if testing.Short() {
		t.Skip("builds the whole demo site")
	}
	r := newDemoRun(t)
	t.Run("recall", r.testRecall)
	t.Run("precision", r.testPrecision)
	t.Run("distractors", r.testDistractors)
	t.Run("ellipsoids", func(t *testing.T) { checkEnclosed(t, r.surface, r.found) })
	t.Run("planes", r.testPlanes)
	t.Run("ledges", r.testLedges)
}

// mean is the true position of voxel i.
func (r *demoRun) mean(i int32) r3.Vec { return r.season.FromDelivered(r.surface.Index.Mean(int(i))) }

// share is the part of the obstacle's voxels that lies in the box.
func (r *demoRun) share(o *Obstacle, b *demo.Box) float64 {
	const margin = 0.1 // two voxels
	in := 0
	for _, i := range o.Voxels {
		if b.Contains(r.mean(i), margin) {
			in++
		}
	}
	return float64(in) / float64(len(o.Voxels))
}

func (r *demoRun) describe(o *Obstacle) []any {
	p := r.season.FromDelivered(o.Top)
	return []any{o.Kind, o.ID, "on", r.season.FeatureAt(p), "at", p, "height", o.HeightM, "area", o.AreaM2, "variation", o.SurfaceVariation, "scattered", o.Scattered}
}

// Everything at least 0.4 m proud or deep and 0.5 m² large is found with the
// right kind, and about as large as it is.
func (r *demoRun) testRecall(t *testing.T) {
	const proud, large = 0.4, 0.5
	looked := 0
	for i := range r.truth.Obstacles {
		want := &r.truth.Obstacles[i]
		must := want.HeightM >= proud && want.AreaM2 >= large
		if must {
			looked++
		}
		best, most := -1, 0.0
		for n := range r.found {
			// Half of what is found must be the thing: a slab that covers
			// everything finds nothing.
			if s := r.share(&r.found[n], &want.Box); string(r.found[n].Kind) == want.Kind && s >= 0.4 && s > most {
				best, most = n, s
			}
		}
		if best < 0 {
			if must {
				t.Errorf("%s, %s of %.2f m and %.2f m²: not found", want.Name, want.Kind, want.HeightM, want.AreaM2)
			}
			continue
		}
		got := &r.found[best]
		if got.Scattered {
			t.Errorf("%s is flagged as scattered", want.Name)
		}
		t.Logf("%-12s %-17s height %.2f m, want %.2f; volume %.2f m³, want %.2f; %.0f %% inside its box",
			want.Name, got.Kind, got.HeightM, want.HeightM, got.RockVolumeM3, want.VolumeM3, 100*most)
		if got.Kind != Overhang && math.Abs(got.HeightM-want.HeightM) > 0.03 {
			t.Errorf("%s: height %.3f m, want %.3f m", want.Name, got.HeightM, want.HeightM)
		}
	}
	t.Logf("%d obstacles had to be found", looked)
	if looked < 12 {
		t.Errorf("only %d obstacles to find", looked)
	}
}

// isRight reports whether a finding overlaps something that is there: an
// obstacle, whatever its size, or the shrub if the finding is flagged. The edges
// of ledges are neither right nor wrong: judged is false there.
func (r *demoRun) isRight(o *Obstacle) (right, judged bool) {
	for i := range r.truth.Obstacles {
		if r.share(o, &r.truth.Obstacles[i].Box) > 0.3 {
			return true, true
		}
	}
	p := r.season.FromDelivered(o.Ellipsoid.Centre)
	for _, s := range r.truth.Scatter {
		if r3.Norm(r3.Sub(p, s.Centre.Vec())) < 2*s.RadiusM {
			return o.Scattered, true
		}
	}
	for i := range r.truth.Ledges {
		if r.share(o, &r.truth.Ledges[i].Bay) > 0.5 {
			return false, false
		}
	}
	return false, true
}

func (r *demoRun) testPrecision(t *testing.T) {
	right, judged := 0, 0
	for i := range r.found {
		ok, counts := r.isRight(&r.found[i])
		if !counts {
			t.Log(append([]any{"in a ledge's bay:"}, r.describe(&r.found[i])...)...)
			continue
		}
		judged++
		if ok {
			right++
		} else {
			t.Log(append([]any{"not there:"}, r.describe(&r.found[i])...)...)
		}
	}
	t.Logf("%d of %d findings are right", right, judged)
	if !(float64(right) >= 0.9*float64(judged)) || judged == 0 {
		t.Errorf("precision %d of %d", right, judged)
	}
}

// What is too small, and edges, must not be found.
func (r *demoRun) testDistractors(t *testing.T) {
	for i := range r.truth.Distractors {
		d := &r.truth.Distractors[i]
		for n := range r.found {
			o := &r.found[n]
			if ok, judged := r.isRight(o); ok || !judged {
				continue
			}
			near := slices.ContainsFunc(o.Voxels, func(v int32) bool {
				p := r.mean(v)
				return d.Box != nil && d.Box.Contains(p, 0) || lineDistance(d.Line, p) < 0.3
			})
			if near {
				t.Error(append([]any{d.Name, "(" + d.Reason + ") was found:"}, r.describe(o)...)...)
			}
		}
	}
}

// lineDistance is the distance of p from a polyline, +Inf from none.
func lineDistance(line []demo.Position, p r3.Vec) float64 {
	best := math.Inf(1)
	for i := 1; i < len(line); i++ {
		a, b := line[i-1].Vec(), line[i].Vec()
		ab := r3.Sub(b, a)
		s := min(1, max(0, r3.Dot(r3.Sub(p, a), ab)/r3.Norm2(ab)))
		best = min(best, r3.Norm(r3.Sub(p, r3.Add(a, r3.Scale(s, ab)))))
	}
	return best
}

// Inclination and dip direction of known planes within 0.1°, roughness of known
// noise within 3 %, at the radius of a person's footprint.
func (r *demoRun) testPlanes(t *testing.T) {
	const radius = 0.4
	planes, err := r.surface.PlanesAt(context.Background(), radius)
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range r.truth.Planes {
		inner := want.Box
		for k := range 2 { // discs that lie wholly on the plane
			inner.HalfM[k] -= radius
		}
		var inclination, dip []float64
		var squares, weight float64
		var mean r3.Vec
		for i := range planes.Normal {
			if !planes.Fitted(i) || !inner.Contains(r.mean(int32(i)), 0) {
				continue
			}
			n := planes.Normal[i]
			mean = r3.Add(mean, n)
			inclination = append(inclination, fit.InclinationDeg(n))
			d, _ := fit.DipDirectionDeg(n)
			dip = append(dip, math.Remainder(d-want.DipDirectionDeg, 360))
			// Pooled variance, by degrees of freedom.
			dof := float64(planes.Points[i] - 3)
			squares += dof * float64(planes.Roughness[i]) * float64(planes.Roughness[i])
			weight += dof
		}
		if len(inclination) < 1000 {
			t.Errorf("%s: %d voxels", want.Name, len(inclination))
			continue
		}
		t.Logf("%-12s inclination %.3f°, mean %.3f°, want %.3f°; roughness %.5f m, want %.5f; %d voxels",
			want.Name, median(inclination), fit.InclinationDeg(mean), want.InclinationDeg,
			math.Sqrt(squares/weight), r.truth.NoiseSigmaM, len(inclination))
		near(t, want.Name+": median inclination", median(inclination), want.InclinationDeg, 0.1)
		near(t, want.Name+": inclination of the mean normal", fit.InclinationDeg(mean), want.InclinationDeg, 0.1)
		near(t, want.Name+": direction of the mean normal", angle(r3.Unit(mean), want.Normal.Vec()), 0, 0.1)
		// A degree of azimuth on a plane of 3° is 3' of direction.
		near(t, want.Name+": median dip direction off", median(dip), 0, 0.1/math.Sin(want.InclinationDeg*math.Pi/180))
		near(t, want.Name+": roughness", math.Sqrt(squares/weight), r.truth.NoiseSigmaM, 0.03*r.truth.NoiseSigmaM)
	}
}

func median(v []float64) float64 {
	s := slices.Clone(v)
	slices.Sort(s)
	return s[len(s)/2]
}

// Every ledge that fits a person yields a patch, and no patch comes closer to
// an obstacle than its profile allows.
func (r *demoRun) testLedges(t *testing.T) {
	ctx := context.Background()
	p, _ := Example("ledge")
	planes, err := r.surface.PlanesAt(ctx, p.FootprintRadiusM)
	if err != nil {
		t.Fatal(err)
	}
	patches, zones, err := FindPatches(ctx, r.surface, planes, r.found, &p, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range r.truth.Ledges {
		on := 0
		best, steep := 0.0, 0.0
		for i := range patches {
			if r.season.FeatureAt(r.season.FromDelivered(patches[i].Centre)) == l.Name {
				on++
				if patches[i].Score > best {
					best, steep = patches[i].Score, patches[i].InclinationDeg
				}
			}
		}
		t.Logf("%-12s %.2f m deep, %d patches, best score %.2f at %.1f°", l.Name, l.DepthM, on, best, steep)
		if l.FitsPerson && on == 0 {
			t.Errorf("%s fits a person but has no patch", l.Name)
		}
		// Up to 10° score alike, so that the best disc may touch the riser's foot.
		if l.FitsPerson && math.Abs(steep-l.InclinationDeg) > 3 {
			t.Errorf("%s: best patch of %.1f°, want %.1f°", l.Name, steep, l.InclinationDeg)
		}
	}
	for i := range patches {
		q := &patches[i]
		if !(q.ClearanceM >= p.ClearanceM.Allowed) || !(q.Score > 0) {
			t.Errorf("patch %s: clearance %g m, score %g", q.ID, q.ClearanceM, q.Score)
		}
		// By the distance itself, from the centre and from the rim.
		u, w := frame(q.Plane.Normal)
		for k := range 33 {
			c := q.Centre
			if k > 0 {
				sin, cos := math.Sincos(float64(k) * math.Pi / 16)
				c = r3.Add(c, r3.Add(r3.Scale(p.FootprintRadiusM*cos, u), r3.Scale(p.FootprintRadiusM*sin, w)))
			}
			for n := range r.found {
				if d := r.found[n].Ellipsoid.DistanceTo(c); d < p.ClearanceM.Allowed-1e-9 || r.found[n].Ellipsoid.Contains(c) && d < p.ClearanceM.Allowed {
					t.Errorf("patch %s reaches %g m from %s", q.ID, d, r.found[n].ID)
				}
			}
		}
	}
	t.Logf("%d patches, %d zones", len(patches), len(zones))
	if len(zones) == 0 {
		t.Error("no zones")
	}
}
