package hazards

import (
	"context"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// Choices of the obstacle search that are no user's business.
const (
	growShare     = 0.5  // hysteresis: a region grows down to this share of its threshold
	scatteredFrom = 0.15 // median surface variation from which it is no surface; an isotropic cloud has 1/3
	steepShare    = 0.95 // quantile of the local inclinations that stands for the steepest: one noisy plane does not
	volumeGap     = 1e-6 // relative, of the enclosing ellipsoid
)

// FindObstacles finds the bulges, overhangs and recesses of s, whose relief
// must have been measured, sorted by id. Each is a connected set of voxels
// (26-neighbourhood, gaps of two spacings bridged) that holds at least one
// voxel beyond the threshold and grows to those beyond half of it, or for an
// overhang to those beyond vertical within the surface radius. A bulge and an
// overhang that share voxels are one obstacle.
func FindObstacles(ctx context.Context, s *Surface) ([]Obstacle, error) {
	regions, err := s.findRegions(ctx)
	if err != nil {
		return nil, err
	}
	var found []Obstacle
	for i := range regions {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		o, err := s.obstacle(&regions[i])
		if err != nil {
			return nil, err
		}
		found = append(found, o)
	}
	s.name(found)
	slices.SortFunc(found, func(a, b Obstacle) int { return strings.Compare(a.ID, b.ID) })
	return found, nil
}

// name gives each obstacle an id made of its kind and the cell of its top.
func (s *Surface) name(found []Obstacle) {
	for prefix, kinds := range map[string][]Kind{
		bulgePrefix: {Bulge, OverhangingBulge}, overhangPrefix: {Overhang}, recessPrefix: {Recess},
	} {
		var which []int
		var cells []terrain.Cell
		for i := range found {
			if slices.Contains(kinds, found[i].Kind) {
				which = append(which, i)
				cells = append(cells, s.Voxels.Lattice.CellOf(found[i].Top))
			}
		}
		for n, id := range IDs(prefix, s.Voxels.Lattice, cells) {
			found[which[n]].ID = id
		}
	}
}

// A region is a connected set of voxels of one kind.
type region struct {
	kind   Kind
	voxels []int32 // ascending
	reachM float64 // of its overhanging part
}

// findRegions segments the surface and merges what shares voxels.
func (s *Surface) findRegions(ctx context.Context) ([]region, error) {
	o, relief := &s.options, s.Relief.Height
	steep := math.Cos((90 + o.OverhangToleranceDeg) * math.Pi / 180)
	bulges, err := s.segment(ctx,
		func(i int) bool { return relief[i] >= growShare*o.BulgeHeightM },
		func(i int) bool { return relief[i] >= o.BulgeHeightM })
	if err != nil {
		return nil, err
	}
	recesses, err := s.segment(ctx,
		func(i int) bool { return relief[i] <= -growShare*o.RecessDepthM },
		func(i int) bool { return relief[i] <= -o.RecessDepthM })
	if err != nil {
		return nil, err
	}
	overhanging := func(i int) bool { return s.Planes.Normal[i].Z < steep }
	rim, err := s.overhangRim(ctx, overhanging)
	if err != nil {
		return nil, err
	}
	overhangs, err := s.segment(ctx,
		func(i int) bool { return rim[i] },
		func(i int) bool {
			// Not where the plane itself is unsure by as much.
			return overhanging(i) && float64(s.Planes.SigmaDeg[i]) < o.OverhangToleranceDeg
		})
	if err != nil {
		return nil, err
	}
	var roofs []region
	for _, voxels := range overhangs {
		if reach := s.reach(voxels); reach >= o.OverhangDepthM {
			roofs = append(roofs, region{Overhang, voxels, reach})
		}
	}
	regions := mergeShared(bulges, roofs)
	for _, voxels := range recesses {
		regions = append(regions, region{Recess, voxels, 0})
	}
	return regions, nil
}

// overhangRim marks the overhanging voxels and those beyond vertical around
// them. Across an edge local planes turn within their radius; growing any
// further would take in half of a sheer wall, where noise decides what is
// beyond.
func (s *Surface) overhangRim(ctx context.Context, overhanging func(i int) bool) ([]bool, error) {
	rim := make([]bool, s.Voxels.Len())
	var near []int32
	for i := range rim {
		if i%chunkVoxels == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		if !overhanging(i) {
			continue
		}
		near = s.Index.Within(near[:0], s.Index.Mean(i), s.Planes.RadiusM)
		for _, n := range near {
			rim[n] = rim[n] || s.Planes.Normal[n].Z < 0
		}
	}
	return rim, nil
}

// segment returns the connected sets of voxels for which grow holds, of at
// least the least area, that hold a voxel for which seed holds.
func (s *Surface) segment(ctx context.Context, grow, seed func(i int) bool) ([][]int32, error) {
	var list []int32
	for i := range s.Voxels.Cells {
		if grow(i) {
			list = append(list, int32(i))
		}
	}
	labels, err := connected(ctx, s.Voxels.Cells, list, bridgeCells)
	if err != nil {
		return nil, err
	}
	at := map[int32]int{}
	var sets [][]int32
	for n, i := range list {
		k, ok := at[labels[n]]
		if !ok {
			k = len(sets)
			at[labels[n]] = k
			sets = append(sets, nil)
		}
		sets[k] = append(sets[k], i)
	}
	kept := sets[:0]
	for _, set := range sets {
		if slices.ContainsFunc(set, func(i int32) bool { return seed(int(i)) }) && s.area(set) >= s.options.MinAreaM2 {
			kept = append(kept, set)
		}
	}
	return kept, nil
}

// area is the surface area of a set of voxels.
func (s *Surface) area(set []int32) float64 {
	in := func(i int) bool {
		_, ok := slices.BinarySearch(set, int32(i))
		return ok
	}
	var sum float64
	for _, i := range set {
		sum += columnArea(s.Index, s.Planes.Normal[i], int(i), in)
	}
	return sum
}

// mergeShared makes one region of the bulges and overhangs that share voxels,
// directly or through others.
func mergeShared(bulges [][]int32, overhangs []region) []region {
	owner := map[int32]int{}
	var out []region
	for n, set := range bulges {
		for _, i := range set {
			owner[i] = n
		}
		out = append(out, region{Bulge, set, 0})
	}
	joined := make([]int, len(out)) // union-find over bulges
	for i := range joined {
		joined[i] = i
	}
	root := func(i int) int {
		for joined[i] != i {
			i = joined[i]
		}
		return i
	}
	var alone []region
	for _, o := range overhangs {
		into := -1
		for _, i := range o.voxels {
			n, ok := owner[i]
			if !ok {
				continue
			}
			n = root(n)
			switch {
			case into < 0:
				into = n
			case into != n:
				joined[max(n, into)] = min(n, into)
				into = min(n, into)
			}
		}
		if into < 0 {
			alone = append(alone, o)
			continue
		}
		b := &out[into]
		b.kind = OverhangingBulge
		b.voxels = append(b.voxels, o.voxels...)
		b.reachM = max(b.reachM, o.reachM)
	}
	for i := len(out) - 1; i > 0; i-- {
		if r := root(i); r != i {
			out[r].voxels = append(out[r].voxels, out[i].voxels...)
			out[r].kind = OverhangingBulge
			out[r].reachM = max(out[r].reachM, out[i].reachM)
			out[i].voxels = nil
		}
	}
	merged := alone
	for _, r := range out {
		if r.voxels == nil {
			continue
		}
		slices.Sort(r.voxels)
		r.voxels = slices.Compact(r.voxels)
		merged = append(merged, r)
	}
	return merged
}

// obstacle measures one region and encloses it.
func (s *Surface) obstacle(r *region) (Obstacle, error) {
	o := Obstacle{Kind: r.kind, Voxels: r.voxels}
	normal, base := s.baseOf(r.voxels)
	o.Face = fit.Plane{Centroid: base, Normal: normal, Voxels: len(r.voxels)}
	for _, i := range r.voxels {
		o.Face.Points += s.Voxels.Moments[i].N
	}
	s.measure(&o, r)

	// Cubes are never flat, so no least semi-axis is asked for: half a spacing
	// would be exactly the half thickness of one layer, and rounding would
	// decide whether that is thickened.
	corners := s.corners(r.voxels)
	const least = 0
	var gap fit.Gap
	var err error
	if r.kind == Bulge || r.kind == OverhangingBulge {
		o.Ellipsoid, gap, err = fit.EncloseOnFace(corners, base, normal, least, volumeGap)
	} else {
		o.Ellipsoid, gap, err = fit.Enclose(corners, least, volumeGap)
	}
	if err != nil {
		return o, err
	}
	o.VolumeGap = gap.Volume
	o.Inflated = o.Ellipsoid.Inflate(s.options.ClearanceM)
	if o.RockVolumeM3 > 0 {
		share := outwardShare(&o.Ellipsoid, &o.Face)
		if r.kind == Recess {
			share = 1 - share
		}
		o.RockShare = min(1, o.RockVolumeM3/(share*o.Ellipsoid.Volume()))
	}
	return o, nil
}

// outwardShare is the share of an ellipsoid's volume on the side of a plane that
// the normal points to: that of a cap of the unit ball.
func outwardShare(e *fit.Ellipsoid, face *fit.Plane) float64 {
	var squares float64
	for i, a := range e.Axes {
		t := e.SemiAxes[i] * r3.Dot(a, face.Normal)
		squares += t * t
	}
	t := max(-1, min(face.Signed(e.Centre)/math.Sqrt(squares), 1))
	return (2 + 3*t - t*t*t) / 4
}

// baseOf is the plane that stands for the reference face of a set: the mean
// normal of the faces of its voxels through the mean of their feet. Where no
// face is known it is the mean local plane.
func (s *Surface) baseOf(set []int32) (normal, base r3.Vec) {
	// Sums of whole coordinates would lose digits.
	origin := s.Index.Mean(int(set[0]))
	var known float64
	for _, i := range set {
		if n := s.Relief.Normal[i]; n != (r3.Vec{}) {
			normal = r3.Add(normal, n)
			base = r3.Add(base, r3.Sub(r3.Sub(s.Index.Mean(int(i)), origin), r3.Scale(s.Relief.Height[i], n)))
			known++
		}
	}
	if known > 0 && r3.Norm(normal) > 0 {
		return r3.Unit(normal), r3.Add(origin, r3.Scale(1/known, base))
	}
	normal, base = r3.Vec{}, r3.Vec{}
	for _, i := range set {
		normal = r3.Add(normal, s.Planes.Normal[i])
		base = r3.Add(base, r3.Sub(s.Index.Mean(int(i)), origin))
	}
	if r3.Norm(normal) == 0 {
		normal = r3.Vec{Z: 1}
	}
	return r3.Unit(normal), r3.Add(origin, r3.Scale(1/float64(len(set)), base))
}

// measure fills in heights, area, volume and what the surface is like.
func (s *Surface) measure(o *Obstacle, r *region) {
	in := func(i int) bool {
		_, ok := slices.BinarySearch(r.voxels, int32(i))
		return ok
	}
	furthest := math.Inf(-1)
	var variation []float32
	var inclination []float64
	for _, i := range r.voxels {
		n := s.Planes.Normal[i]
		area := columnArea(s.Index, n, int(i), in)
		o.AreaM2 += area
		d := o.Face.Signed(s.Index.Mean(int(i)))
		if relief := s.Relief.Height[i]; !math.IsNaN(relief) {
			d = relief
		}
		out := d
		if r.kind == Recess {
			out = -d
		}
		if out > furthest {
			furthest, o.Top = out, s.Index.Mean(int(i))
		}
		face := s.Relief.Normal[i]
		if face == (r3.Vec{}) {
			face = o.Face.Normal
		}
		// The divergence theorem over a surface that closes against the face;
		// undersides count against what they hide.
		o.RockVolumeM3 += out * area * r3.Dot(n, face)
		if s.Planes.Fitted(int(i)) {
			inclination = append(inclination, fit.InclinationDeg(n))
			variation = append(variation, s.Planes.Variation[i])
		}
	}
	o.RockVolumeM3 = max(0, o.RockVolumeM3)
	o.HeightM = max(0, furthest)
	if r.kind == Overhang {
		o.HeightM = r.reachM
	}
	o.DipDirectionDeg, _ = fit.DipDirectionDeg(o.Face.Normal)
	if len(variation) > 0 {
		slices.Sort(inclination)
		o.InclinationDeg = inclination[int(steepShare*float64(len(inclination)-1))]
		slices.Sort(variation)
		o.SurfaceVariation = float64(variation[len(variation)/2])
		o.Scattered = o.SurfaceVariation >= scatteredFrom
	} else {
		o.Scattered = true
	}
}

// corners are the eight corners of the first and the last voxel of each row of a
// set. What contains them contains all: those of the others lie between.
func (s *Surface) corners(set []int32) []r3.Vec {
	l, cells := s.Voxels.Lattice, s.Voxels.Cells
	sameRow := func(m, n int) bool {
		a, b := cells[set[m]], cells[set[n]]
		return a.J == b.J && a.K == b.K
	}
	var out []r3.Vec
	for m, i := range set {
		if m > 0 && m+1 < len(set) && sameRow(m-1, m) && sameRow(m, m+1) {
			continue
		}
		c := cells[i]
		for n := range int32(8) {
			out = append(out, l.Corner(terrain.Cell{I: c.I + n&1, J: c.J + n>>1&1, K: c.K + n>>2}))
		}
	}
	return out
}
