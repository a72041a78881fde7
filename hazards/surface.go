package hazards

import (
	"context"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// A Surface is a survey's voxels with what was fitted to them. It must not be
// changed once built.
type Surface struct {
	Voxels *terrain.Voxels
	Index  *terrain.Index
	Planes *fit.LocalPlanes // at the surface radius, outward
	Relief *fit.Relief      // nil until MeasureRelief

	// Work is how the methods share out what they do. Progress counts voxels.
	Work fit.Work

	// GuessedShare is the share of the surface whose outward side nothing
	// tells; scanner positions would.
	GuessedShare float64

	levels  []*terrain.Voxels
	parents [][]int32
	options ObstacleOptions
	sensors []r3.Vec

	// Members of the reference faces, and their planes, outward.
	members       *terrain.Index
	memberPlanes  *fit.LocalPlanes
	memberLevel   int
	centreLevel   int
	centreParents []int32 // of level 0 at the centre level
}

// How coarse the levels of the reference search are, in parts of the reference
// radius: members fine enough to show a ledge's tread, centres as coarse as
// relief may change from one to the next.
const (
	membersPerRadius = 25
	centresPerRadius = 5
)

// NewSurface fits local planes at the surface radius to every voxel of v and
// turns them outward. Sensors are scanner positions in the working CRS, nil if
// unknown. Options must be resolved.
func NewSurface(ctx context.Context, v *terrain.Voxels, sensors []r3.Vec, o ObstacleOptions, work fit.Work) (*Surface, error) {
	s := &Surface{Voxels: v, Index: terrain.NewIndex(v), options: o, sensors: sensors, Work: work}
	if err := s.buildLevels(); err != nil {
		return nil, err
	}
	coarse := terrain.NewIndex(s.levels[s.centreLevel])
	coarsePlanes, err := fit.FitLocal(ctx, coarse.Voxels(), coarse, coarseRadii*coarse.Voxels().Lattice.SpacingM(), fit.Work{Workers: work.Workers})
	if err != nil {
		return nil, err
	}
	if s.GuessedShare, err = fit.OrientCoarse(ctx, coarse, coarsePlanes, sensors); err != nil {
		return nil, err
	}
	if err := s.fitMembers(ctx, coarsePlanes); err != nil {
		return nil, err
	}
	if s.memberLevel == 0 && s.memberPlanes.RadiusM == o.SurfaceRadiusM {
		s.Planes = s.memberPlanes
		return s, nil
	}
	if s.Planes, err = fit.FitLocal(ctx, v, s.Index, o.SurfaceRadiusM, work); err != nil {
		return nil, err
	}
	if err := fit.OrientFrom(ctx, s.Index, s.Planes, s.memberPlanes, s.ancestors(0, s.memberLevel), sensors); err != nil {
		return nil, err
	}
	return s, nil
}

// coarseRadii is the radius of the planes at the centre level, in its
// spacings: room for some thirty voxels of a surface, so that a thin scan line
// does not make a plane by itself.
const coarseRadii = 3

// buildLevels makes the pyramid up to the centre level.
func (s *Surface) buildLevels() error {
	r := s.options.ReferenceRadiusM
	var err error
	if s.levels, s.parents, err = s.Voxels.Pyramid(r / centresPerRadius); err != nil {
		return err
	}
	for n, v := range s.levels {
		if v.Lattice.SpacingM() <= r/membersPerRadius {
			s.memberLevel = n
		}
	}
	s.centreLevel = len(s.levels) - 1
	s.centreParents = s.ancestors(0, s.centreLevel)
	return nil
}

// ancestors gives each voxel of level from its voxel at level to.
func (s *Surface) ancestors(from, to int) []int32 {
	a := make([]int32, s.levels[from].Len())
	for i := range a {
		a[i] = int32(i)
	}
	for l := from; l < to; l++ {
		for i := range a {
			a[i] = s.parents[l][a[i]]
		}
	}
	return a
}

// fitMembers fits and orients the planes of the members of reference faces.
// They are small, for a plane that reaches around an edge belongs to no face.
func (s *Surface) fitMembers(ctx context.Context, coarse *fit.LocalPlanes) error {
	at := s.levels[s.memberLevel]
	s.members = terrain.NewIndex(at)
	from := s.members
	if s.memberLevel > 0 {
		from = terrain.NewIndex(s.levels[s.memberLevel-1])
	}
	radius := max(2*at.Lattice.SpacingM(), s.options.SurfaceRadiusM)
	var err error
	if s.memberPlanes, err = fit.FitLocal(ctx, at, from, radius, fit.Work{Workers: s.Work.Workers}); err != nil {
		return err
	}
	return fit.OrientFrom(ctx, s.members, s.memberPlanes, coarse, s.ancestors(s.memberLevel, s.centreLevel), s.sensors)
}

// MeasureRelief finds the reference faces and fills in Relief.
func (s *Surface) MeasureRelief(ctx context.Context) error {
	relief, err := fit.FindRelief(ctx, &fit.ReliefInput{
		At:      s.Voxels,
		Members: s.members, Planes: s.memberPlanes,
		Centres: s.levels[s.centreLevel], Centre: s.centreParents,
		RadiusM: s.options.ReferenceRadiusM,
		ProudM:  min(s.options.BulgeHeightM, s.options.RecessDepthM),
	}, s.Work)
	s.Relief = relief
	return err
}

// minMembersPerRadius decides how coarse the members of a plane may be: five
// per radius is about 80 voxels of a surface.
const minMembersPerRadius = 5

// PlanesAt fits planes of another radius at every voxel, outward as Planes
// are. Large radii take their members from a coarser level: the sums stay
// exact.
func (s *Surface) PlanesAt(ctx context.Context, radiusM float64) (*fit.LocalPlanes, error) {
	level := 0
	for level+1 < len(s.levels) && s.levels[level+1].Lattice.SpacingM()*minMembersPerRadius <= radiusM {
		level++
	}
	members := s.Index
	if level > 0 {
		members = terrain.NewIndex(s.levels[level])
	}
	p, err := fit.FitLocal(ctx, s.Voxels, members, radiusM, s.Work)
	if err != nil {
		return nil, err
	}
	return p, fit.OrientFrom(ctx, s.Index, p, s.Planes, s.ancestors(0, 0), s.sensors)
}
