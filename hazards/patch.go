package hazards

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// FindPatches judges the footprint disc of profile p at every voxel of s, picks
// landing patches best first and joins the ground that scores above 0 to zones.
// Both results are sorted by id.
//
// Planes are the local planes of the voxels of s at p's footprint radius, with
// outward normals; FindPatches panics if their radius is another. Obstacles
// limit the clearance and may be nil. The profile must be valid. Arguments are
// read only. The result does not depend on how the work is shared; progress
// counts the voxels whose plane and clearance leave hope. The only error is
// ctx's.
//
// The disc at a voxel is centred on the foot of its mean on its plane and lies
// in that plane. Voxels belong to it if their mean lies within the radius of
// the centre, measured in the plane, and no more than one radius outward or
// the greatest allowed step, roughness or spacing inward of the plane: what
// stands within reach above the footprint is in its way, what lies deeper than
// a forbidden step does not carry it. The measures and their standard
// uncertainties:
//
//   - inclination of the plane, ± the 1σ angle of its normal;
//   - roughness of the plane, ± roughness/√(2(m−3)), the large-sample error of
//     a standard deviation, for m voxels, since raw points of one voxel are not
//     independent (at least 1 for m−3);
//   - step, the largest height of a mean of the disc above the plane, at least
//     0, ± the root of the squares of the plane's position error roughness/√m,
//     of its tilt error at that mean, and of the mean's own error,
//     roughness/√n for its n points. As the largest of many noisy heights it
//     errs upward: a stray point can have a voxel to itself, so the step of a
//     plane is that of its outermost points, some 4 roughnesses. That is on the
//     safe side;
//   - coverage: see coverageGrid;
//   - clearance, the distance from the centre to the nearest obstacle ellipsoid
//     less the radius, ± half a spacing, since both the ellipsoid's extent and
//     the place of the disc go in steps of a voxel. It is never more than the
//     distance from the rim: a disc lies within the ball of its radius. It is
//     as low as minus the radius inside an obstacle, +Inf without obstacles.
func FindPatches(ctx context.Context, s *Surface, planes *fit.LocalPlanes, obstacles []Obstacle, p *Profile, work fit.Work) ([]Patch, []Zone, error) {
	if planes.RadiusM != p.FootprintRadiusM {
		panic(fmt.Sprintf("hazards: planes of radius %g m for a footprint of %g m", planes.RadiusM, p.FootprintRadiusM))
	}
	j := newJudge(s, planes, obstacles, p)
	scores, err := j.scores(ctx, work)
	if err != nil {
		return nil, nil, err
	}
	picked, err := j.pick(ctx, scores)
	if err != nil {
		return nil, nil, err
	}
	patches, err := j.patches(ctx, picked)
	if err != nil {
		return nil, nil, err
	}
	zones, err := j.zones(ctx, scores, patches)
	if err != nil {
		return nil, nil, err
	}
	return patches, zones, nil
}

// A judge measures and scores footprints. It is read-only once built.
type judge struct {
	voxels   *terrain.Voxels
	index    *terrain.Index
	planes   *fit.LocalPlanes
	criteria criteria
	near     *nearness
	grid     coverageGrid
	radius   float64 // of the footprint, m
	depth    float64 // how far inward of the plane ground belongs to it, m

	tileCells int32 // edge of a tile
}

func newJudge(s *Surface, planes *fit.LocalPlanes, obstacles []Obstacle, p *Profile) *judge {
	r, g := p.FootprintRadiusM, s.Voxels.Lattice.SpacingM()
	return &judge{
		voxels:   s.Voxels,
		index:    s.Index,
		planes:   planes,
		criteria: newCriteria(p),
		near:     newNearness(obstacles),
		grid:     newCoverageGrid(r, g),
		radius:   r,
		depth:    min(r, max(p.StepM.Allowed, p.RoughnessM.Allowed, g)),

		tileCells: int32(min(max(1, math.Ceil(tileRadii*r/g)), maxTileCells)),
	}
}

// chunkVoxels is how many voxels are judged, or looked at, between two looks at
// the context.
const chunkVoxels = 4096

// scores returns the score of the footprint at every voxel.
func (j *judge) scores(ctx context.Context, work fit.Work) ([]float64, error) {
	scores := make([]float64, j.voxels.Len())
	var hopeful []int32
	for v := range scores {
		if v%chunkVoxels == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		if _, ok := j.measurePlane(v); ok {
			hopeful = append(hopeful, int32(v))
		}
	}
	tiles := j.tiles(hopeful)
	size := func(i int) int { return len(tiles[i]) }
	err := work.Each(ctx, len(tiles), size, func() func(int) error {
		g := &gathering{j: j}
		return func(i int) error {
			j.scoreTile(ctx, scores, tiles[i], g)
			return ctx.Err()
		}
	})
	return scores, err
}

// scoreTile fills in the scores of the given voxels of one tile, unless ctx
// ends. It overwrites voxels.
func (j *judge) scoreTile(ctx context.Context, scores []float64, voxels []int32, g *gathering) {
	near := voxels[:0]
	for _, v := range voxels {
		if c := j.clearance(j.centre(int(v)), false); j.criteria[clearance].limit.allows(c.value) {
			near = append(near, v)
		}
	}
	if len(near) == 0 {
		return
	}
	g.load(near)
	for _, v := range near {
		if ctx.Err() != nil {
			return
		}
		m, _ := j.measurePlane(int(v))
		m[clearance] = j.clearance(j.centre(int(v)), false)
		f := g.footprint(int(v), nil)
		j.measureFootprint(int(v), &f, &m)
		scores[v] = j.criteria.score(&m)
	}
}

// centre is the foot of voxel v's mean on its plane.
func (j *judge) centre(v int) r3.Vec {
	return r3.Sub(j.index.Mean(v), r3.Scale(j.planes.Offset[v], j.planes.Normal[v]))
}

// measurePlane returns the measures that the local plane of voxel v gives:
// inclination and roughness. It is not ok if there is no plane or one is
// outside its allowed limits.
func (j *judge) measurePlane(v int) (m measured, ok bool) {
	if !j.planes.Fitted(v) {
		return m, false
	}
	m[inclination] = estimate{fit.InclinationDeg(j.planes.Normal[v]), float64(j.planes.SigmaDeg[v])}
	rough, count := float64(j.planes.Roughness[v]), float64(j.planes.Voxels[v])
	m[roughness] = estimate{rough, rough / math.Sqrt(2*max(1, count-3))}
	return m, j.criteria[inclination].limit.allows(m[inclination].value) &&
		j.criteria[roughness].limit.allows(m[roughness].value)
}

// measureFootprint adds the measures that the voxels of the disc give, coverage
// and step, to those of the plane.
func (j *judge) measureFootprint(v int, f *footprint, m *measured) {
	m[coverage] = j.grid.share(&f.data)
	rough := m[roughness].value
	position := rough / math.Sqrt(float64(j.planes.Voxels[v]))
	tilt, own := 0.0, 0.0
	if f.highest >= 0 {
		tilt = f.lateral * math.Tan(m[inclination].sigma*math.Pi/180)
		own = rough / math.Sqrt(float64(j.voxels.Moments[f.highest].N))
	}
	m[step] = estimate{f.stepM, math.Sqrt(position*position + tilt*tilt + own*own)}
}

// clearance measures that of the disc at c; if exact is false, only up to the
// best limit.
func (j *judge) clearance(c r3.Vec, exact bool) estimate {
	limit := math.Inf(1)
	if !exact {
		limit = j.radius + j.criteria[clearance].limit.BestMin
	}
	e := estimate{sigma: j.voxels.Lattice.SpacingM() / 2}
	if d := j.near.distance(c, limit); exact || d < limit {
		e.value = d - j.radius
	} else {
		e.value = j.criteria[clearance].limit.BestMin // not limit − radius, which rounding may put below it
	}
	return e
}

// frame returns unit vectors in the plane of unit normal n: u along its strike,
// or east where it is level, and w up its dip.
func frame(n r3.Vec) (u, w r3.Vec) {
	u = r3.Vec{X: 1}
	if h := math.Hypot(n.X, n.Y); h > 0 {
		u = r3.Vec{X: -n.Y / h, Y: n.X / h}
	}
	return u, r3.Cross(n, u)
}

// patches returns the landing patches at the picked voxels, sorted by id.
func (j *judge) patches(ctx context.Context, picked []int32) ([]Patch, error) {
	cells := make([]terrain.Cell, len(picked))
	for i, v := range picked {
		cells[i] = j.voxels.Cells[v]
	}
	ids := IDs(patchPrefix, j.voxels.Lattice, cells)
	patches := make([]Patch, len(picked))
	g := &gathering{j: j}
	for i, v := range picked {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		patches[i] = j.patch(v, g)
		patches[i].ID = ids[i]
	}
	slices.SortFunc(patches, func(a, b Patch) int { return strings.Compare(a.ID, b.ID) })
	return patches, nil
}

// patch returns the landing patch at voxel v, but for its id.
func (j *judge) patch(v int32, g *gathering) Patch {
	m, voxels := j.measure(v, g)
	slices.Sort(voxels)
	plane := j.plane(int(v))
	dip, _ := fit.DipDirectionDeg(plane.Normal)
	return Patch{
		Voxel:               v,
		Voxels:              voxels,
		Centre:              j.centre(int(v)),
		Plane:               plane,
		InclinationDeg:      m[inclination].value,
		InclinationSigmaDeg: m[inclination].sigma,
		DipDirectionDeg:     dip,
		RoughnessM:          m[roughness].value,
		RoughnessSigmaM:     m[roughness].sigma,
		StepM:               m[step].value,
		StepSigmaM:          m[step].sigma,
		Coverage:            m[coverage].value,
		CoverageSigma:       m[coverage].sigma,
		ClearanceM:          m[clearance].value,
		ClearanceSigmaM:     m[clearance].sigma,
		Score:               j.criteria.score(&m),
		Confidence:          j.criteria.confidence(&m),
		LimitedBy:           j.criteria.limitedBy(&m),
	}
}

// measure returns all measures at voxel v and the voxels of its disc.
func (j *judge) measure(v int32, g *gathering) (m measured, voxels []int32) {
	m, _ = j.measurePlane(int(v))
	m[clearance] = j.clearance(j.centre(int(v)), true)
	g.load([]int32{v})
	f := g.footprint(int(v), &voxels)
	j.measureFootprint(int(v), &f, &m)
	return m, voxels
}

// plane returns the local plane of voxel v with its eigenvalues, from the sums
// of its voxels. Its normal is that of j.planes, which is oriented and may come
// from a coarser level.
func (j *judge) plane(v int) fit.Plane {
	members := j.index.Within(nil, j.index.Mean(v), j.radius)
	edge, home := j.voxels.Lattice.Quanta(), j.voxels.Cells[v]
	var sum terrain.Moments
	for _, i := range members {
		c := j.voxels.Cells[i]
		shifted := j.voxels.Moments[i].Shifted(
			int64(c.I-home.I)*edge, int64(c.J-home.J)*edge, int64(c.K-home.K)*edge)
		sum.Add(&shifted)
	}
	plane, _ := fit.PlaneFromMoments(&sum, j.voxels.Lattice.Centre(home), len(members))
	plane.Normal = j.planes.Normal[v]
	return plane
}
