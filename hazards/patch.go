package hazards

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"
	"sync"
	"sync/atomic"

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
// read only; workers goroutines share the work, and the result does not depend
// on their number. The only error is ctx's.
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
func FindPatches(ctx context.Context, s *Surface, planes *fit.LocalPlanes, obstacles []Obstacle, p *Profile, workers int) ([]Patch, []Zone, error) {
	if planes.RadiusM != p.FootprintRadiusM {
		panic(fmt.Sprintf("hazards: planes of radius %g m for a footprint of %g m", planes.RadiusM, p.FootprintRadiusM))
	}
	j := newJudge(s, planes, obstacles, p)
	scores, err := j.scores(ctx, workers)
	if err != nil {
		return nil, nil, err
	}
	picked, err := j.pick(ctx, scores)
	if err != nil {
		return nil, nil, err
	}
	patches := j.patches(picked)
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
	}
}

// A member is a voxel of a footprint, or just beyond its rim, in the frame of
// its disc: a and b in the plane, height outward of it.
type member struct {
	voxel        int32
	a, b, height float64
}

// chunkVoxels is what a worker takes at a time: a few milliseconds of work, so
// that an interrupt is obeyed at once and no worker ends long before another.
const chunkVoxels = 512

// scores returns the score of the footprint at every voxel.
func (j *judge) scores(ctx context.Context, workers int) ([]float64, error) {
	scores := make([]float64, j.voxels.Len())
	var next atomic.Int64
	var wg sync.WaitGroup
	for range max(1, workers) {
		wg.Go(func() {
			var disc []member
			for ctx.Err() == nil {
				end := int(next.Add(chunkVoxels))
				start := end - chunkVoxels
				if start >= len(scores) {
					return
				}
				for v := start; v < min(end, len(scores)); v++ {
					var m measured
					m, disc = j.measure(v, false, disc)
					scores[v] = j.criteria.score(&m)
				}
			}
		})
	}
	wg.Wait()
	return scores, ctx.Err()
}

// centre is the foot of voxel v's mean on its plane.
func (j *judge) centre(v int) r3.Vec {
	return r3.Sub(j.index.Mean(v), r3.Scale(j.planes.Offset[v], j.planes.Normal[v]))
}

// measure returns the measures at voxel v, using disc as working space, which
// it returns for the next call with the members of the disc and its margin.
//
// Unless all are wanted, it stops where a cheaper measure is outside its
// allowed limits and leaves those not taken NaN, which no limit allows; and the
// clearance is taken only up to its best value.
func (j *judge) measure(v int, all bool, disc []member) (measured, []member) {
	var m measured
	for i := range m {
		m[i].value = math.NaN()
	}
	if !j.planes.Fitted(v) {
		return m, disc
	}
	rejects := func(i int) bool { return !all && !j.criteria[i].limit.allows(m[i].value) }

	n := j.planes.Normal[v]
	m[inclination] = estimate{fit.InclinationDeg(n), float64(j.planes.SigmaDeg[v])}
	if rejects(inclination) {
		return m, disc
	}
	rough, count := float64(j.planes.Roughness[v]), float64(j.planes.Voxels[v])
	m[roughness] = estimate{rough, rough / math.Sqrt(2*max(1, count-3))}
	if rejects(roughness) {
		return m, disc
	}
	c := j.centre(v)
	m[clearance] = j.clearance(c, all)
	if rejects(clearance) {
		return m, disc
	}

	disc = j.disc(disc[:0], c, n)
	var o occupancy
	highest, at := 0.0, -1
	for i := range disc {
		d := &disc[i]
		j.grid.mark(&o, d.a, d.b)
		if d.height > highest && d.a*d.a+d.b*d.b <= j.radius*j.radius {
			highest, at = d.height, i
		}
	}
	m[coverage] = j.grid.share(&o)
	position := rough / math.Sqrt(count)
	tilt, own := 0.0, 0.0
	if at >= 0 {
		tilt = math.Hypot(disc[at].a, disc[at].b) * math.Tan(m[inclination].sigma*math.Pi/180)
		own = rough / math.Sqrt(float64(j.voxels.Moments[disc[at].voxel].N))
	}
	m[step] = estimate{highest, math.Sqrt(position*position + tilt*tilt + own*own)}
	return m, disc
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

// disc appends the voxels whose means lie in the slab of the footprint at c
// with normal n, out to the coverage grid's reach.
//
// It walks the rows of cells that meet the box around that cylinder and looks,
// in each, only at the stretch that the cylinder can hold.
func (j *judge) disc(dst []member, c, n r3.Vec) []member {
	u, w := frame(n)
	l := j.voxels.Lattice
	g, depth, radius, reach := l.SpacingM(), j.depth, j.radius, j.grid.reach
	reach2 := reach * reach
	row := newRowSolver(n, -depth, radius, reach, g)
	box := func(n float64) (lo, hi float64) {
		side := reach * math.Sqrt(max(0, 1-n*n))
		return min(-depth*n, radius*n) - side, max(-depth*n, radius*n) + side
	}
	xlo, xhi := box(n.X)
	ylo, yhi := box(n.Y)
	zlo, zhi := box(n.Z)
	low := l.CellOf(r3.Vec{X: c.X + xlo, Y: c.Y + ylo, Z: c.Z + zlo})
	high := l.CellOf(r3.Vec{X: c.X + xhi, Y: c.Y + yhi, Z: c.Z + zhi})
	// Cells from low.I on, so that a conversion to integer rounds down.
	origin, perCell := c.X-float64(low.I)*g, 1/g
	width := float64(high.I - low.I)
	for k := low.K; k <= high.K; k++ {
		z := (float64(k)+0.5)*g - c.Z
		for jj := low.J; jj <= high.J; jj++ {
			y := (float64(jj)+0.5)*g - c.Y
			lo, hi, ok := row.stretch(y, z)
			if !ok {
				continue
			}
			lo = (origin+lo)*perCell - cellSlack
			hi = (origin+hi)*perCell + cellSlack
			if hi < 0 || lo > width+1 {
				continue
			}
			start, end := j.index.Row(jj, k, low.I+int32(max(lo, 0)), low.I+int32(min(hi, width)))
			for v := start; v < end; v++ {
				d := r3.Sub(j.index.Mean(v), c)
				h := r3.Dot(n, d)
				if h < -depth || h > radius {
					continue
				}
				a, b := r3.Dot(u, d), r3.Dot(w, d)
				if a*a+b*b <= reach2 {
					dst = append(dst, member{int32(v), a, b, h})
				}
			}
		}
	}
	return dst
}

// cellSlack, in cells, is far more than the rounding of a coordinate divided by
// the spacing: 1e9 cells, about as many as an index can count, have a last bit
// of 1e-7 cells. It can only widen the search.
const cellSlack = 1e-3

// A rowSolver intersects rows of cells, which run along x, with a cylinder
// about the origin: within reach of an axis along the unit normal n, and from
// low to high along it. The cylinder is grown by what a mean can be off its
// row's axis, so no member is missed.
type rowSolver struct {
	n            r3.Vec
	a, perA      float64 // 1 − nx² and its inverse, 0 where n lies along the row
	reach2       float64
	low, high    float64 // of the slab, grown
	perX         float64 // 1/nx, 0 where the row lies in the plane
	first, final float64 // low/nx and high/nx in order
}

// A row is cut only by what it meets at an angle: |nx| and 1 − nx² at least
// these. Below, dividing would bring in little but rounding, and what is left
// out hardly narrows the stretch: to neglect a 1 − nx² of 1e-9 moves the distance
// from the axis by less than the growth of the cylinder for any radius below
// 10 000 spacings.
const (
	minSlant = 1e-6
	minSkew  = 1e-9
)

func newRowSolver(n r3.Vec, low, high, reach, spacing float64) rowSolver {
	half := spacing / 2
	off := half * (math.Abs(n.Y) + math.Abs(n.Z))
	reach += half * math.Sqrt2
	s := rowSolver{n: n, a: 1 - n.X*n.X, reach2: reach * reach, low: low - off, high: high + off}
	if s.a > minSkew {
		s.perA = 1 / s.a
	}
	if math.Abs(n.X) > minSlant {
		s.perX = 1 / n.X
		s.first, s.final = s.low*s.perX, s.high*s.perX
		if s.first > s.final {
			s.first, s.final = s.final, s.first
		}
	}
	return s
}

// stretch returns the x between which the row at (y, z) can meet the cylinder.
// It is not ok if it meets it nowhere.
func (s *rowSolver) stretch(y, z float64) (lo, hi float64, ok bool) {
	// Heights along the row are t + nx·x. Distances from the axis are within
	// reach where a·x² − 2·nx·t·x + y² + z² − t² ≤ reach².
	t := s.n.Y*y + s.n.Z*z
	beyond := y*y + z*z - t*t - s.reach2
	lo, hi = math.Inf(-1), math.Inf(1)
	if s.perA != 0 {
		b := s.n.X * t
		e := b*b - s.a*beyond
		if e < 0 {
			return 0, 0, false
		}
		e = math.Sqrt(e) * s.perA
		lo, hi = b*s.perA-e, b*s.perA+e
	} else if beyond > 0 {
		return 0, 0, false
	}
	if s.perX != 0 {
		foot := t * s.perX
		if first := s.first - foot; first > lo {
			lo = first
		}
		if final := s.final - foot; final < hi {
			hi = final
		}
	} else if t < s.low || t > s.high {
		return 0, 0, false
	}
	return lo, hi, lo <= hi
}

// patches returns the landing patches at the picked voxels, sorted by id.
func (j *judge) patches(picked []int32) []Patch {
	cells := make([]terrain.Cell, len(picked))
	for i, v := range picked {
		cells[i] = j.voxels.Cells[v]
	}
	ids := IDs(patchPrefix, j.voxels.Lattice, cells)
	patches := make([]Patch, len(picked))
	var disc []member
	for i, v := range picked {
		patches[i], disc = j.patch(int(v), disc)
		patches[i].ID = ids[i]
	}
	slices.SortFunc(patches, func(a, b Patch) int { return strings.Compare(a.ID, b.ID) })
	return patches
}

// patch returns the landing patch at voxel v, but for its id.
func (j *judge) patch(v int, disc []member) (Patch, []member) {
	m, disc := j.measure(v, true, disc)
	var voxels []int32
	for i := range disc {
		if d := &disc[i]; d.a*d.a+d.b*d.b <= j.radius*j.radius {
			voxels = append(voxels, d.voxel)
		}
	}
	slices.Sort(voxels)
	plane := j.plane(v)
	dip, _ := fit.DipDirectionDeg(plane.Normal)
	return Patch{
		Voxel:               int32(v),
		Voxels:              voxels,
		Centre:              j.centre(v),
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
	}, disc
}

// plane returns the local plane of voxel v with its eigenvalues, from the sums
// of its voxels. Its normal is that of j.planes, which is oriented.
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
