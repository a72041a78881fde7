package survey

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"ledgework/terrain"
)

// Limits of what Plan accepts.
const (
	// A site is not wider than this; a wider extent is a stray point or a
	// wrong CRS.
	maxSpanM = 1e6

	// Two surveys are in different places when the gap between them exceeds
	// both this and minApart times the larger one's size. Tiles of one site,
	// with some missing between them, are nearer.
	minGapM  = 5e3
	minApart = 20

	// A map projection whose scale is off by more than this at the site is not
	// worked in: at 2 % a face of 45° comes out 0.6° wrong.
	maxScaleError = 0.02

	// Two definitions of one CRS differ by rounding; below a tenth of the
	// 0.1 mm that voxels resolve they are the same, and points stay as they are.
	sameM = 1e-5
)

// Plan chooses the working CRS of the sources and how each gets there. want is
// "auto" (or empty), or the CRS to work in as EPSG:n, WKT or PROJJSON. It must
// be projected, its axes east and north; one in feet is taken with its axes in metres.
//
// The automatic choice is the CRS of the first source that has one, if it is
// projected, in metres once its axes are converted, points east and north, and
// is true to scale at the site. Longitude and latitude, geocentric coordinates, and projections whose
// scale is off, such as Web Mercator, or whose axes point elsewhere, go to the UTM zone (or UPS) of the
// middle of all sources. Without any CRS the coordinates are local, unless
// they can only be degrees: then WGS 84 is assumed, and a note says so. A
// source without a CRS among others that have one is taken to be in the
// working CRS.
//
// Headers are read, and the points of a file whose header has no usable
// extent. Plan fails when the sources lie in different places or spread over
// more than 1000 km, or make no sense in their CRS, with a terrain.FormatError
// after the path; with terrain.ErrNoPoints for a file without points; and with
// neither where want, or the CRS given with a source, is at fault.
func Plan(ctx context.Context, sources []Source, want string) (*Frame, error) {
	probes := make([]*probe, 0, len(sources))
	known := make(systems)
	for _, src := range sources {
		p, err := look(ctx, src, known)
		if err != nil {
			return nil, err
		}
		probes = append(probes, p)
	}
	return choose(probes, want)
}

// choose is Plan after the files were looked at.
func choose(probes []*probe, want string) (*Frame, error) {
	if len(probes) == 0 {
		return nil, errors.New("survey: no survey file; name at least one")
	}
	f := &Frame{Extent: terrain.EmptyExtent(), plans: make(map[Source]plan)}
	for _, p := range probes {
		if err := p.settle(); err != nil {
			return nil, err
		}
	}
	work, err := f.workingSystem(probes, want)
	if err != nil {
		return nil, err
	}
	f.work = work
	f.CRS, f.Name, f.AuthorityCode = work.wkt, work.name, work.code
	f.Local = work.kind == local
	if f.Local {
		f.CRS, f.AuthorityCode = "", ""
		if f.Name == "" {
			f.Name = "local coordinates"
		}
	}
	for _, p := range probes {
		if err := f.add(p, work); err != nil {
			return nil, err
		}
	}
	f.checkHeights(probes)
	f.Notes = append(f.Notes, gatherNotes(probes)...)
	if err := f.checkPlaces(probes); err != nil {
		return nil, err
	}
	return f, nil
}

// settle decides what the coordinates of a source are, where its CRS and its
// extent contradict each other or nothing is said.
func (p *probe) settle() error {
	degrees := looksLikeDegrees(p.extent, p.header.Cell > 0)
	switch {
	case p.system.kind == geographic && !fitsDegrees(p.extent):
		return placeError(p.src.Path, fmt.Sprintf("the CRS %q is in degrees but the coordinates aren't (%s)", p.system.name, describeExtent(p.extent)),
			"give crs: EPSG:n of the projection they are in")
	case p.system.kind == projected && degrees:
		return placeError(p.src.Path, fmt.Sprintf("the coordinates look like degrees (%s) but the CRS %q is in %s", describeExtent(p.extent), p.system.name, p.system.unitName),
			"give crs: EPSG:4326, or the geographic CRS they are in")
	case p.system.kind == local && degrees:
		s, err := parseSystem(wgs84)
		if err != nil {
			return err
		}
		p.system = s
		p.note("there is no CRS, but the coordinates can only be degrees: longitude and latitude on WGS 84 (EPSG:4326) are assumed; give crs: EPSG:n if they are on another datum")
	}
	return nil
}

// placeError says that the coordinates of a file are impossible.
func placeError(path, reason, remedy string) error {
	return fmt.Errorf("%s: %w", path, &terrain.FormatError{Format: "survey", Reason: reason, Remedy: remedy})
}

// workingSystem chooses the working CRS.
func (f *Frame) workingSystem(probes []*probe, want string) (system, error) {
	if want != "" && want != "auto" {
		s, err := parseSystem(want)
		if err != nil {
			return system{}, fmt.Errorf("survey: the working CRS %q can't be understood: %s; give auto, EPSG:n, WKT or PROJJSON", want, err.Error())
		}
		if s.kind != projected {
			return system{}, fmt.Errorf("survey: the working CRS %q is not a projected one; leave crs: auto, and give the CRS of the coordinates with the surveys", s.name)
		}
		if s.turned {
			return system{}, fmt.Errorf("survey: the working CRS %q has axes that point west or south; leave crs: auto, or give one with axes east and north", s.name)
		}
		return f.inMetres(s)
	}

	var first *probe
	for _, p := range probes {
		if p.system.kind != local {
			first = p
			break
		}
	}
	if first == nil {
		return f.inMetres(probes[0].system)
	}
	s := first.system
	if s.kind == projected {
		off, err := scaleError(s, first.extent)
		switch {
		case err != nil:
			return system{}, fmt.Errorf("%s: survey: %w; check its CRS", first.src.Path, err)
		case s.turned:
			f.note("%q has axes that point west or south, with which azimuths would be wrong", s.name)
		case !s.special && off <= maxScaleError:
			return f.inMetres(s)
		default:
			f.note("%q is not true to scale here (off by %.1f %%)", s.name, 100*off)
		}
	}
	lon, lat, err := middle(probes)
	if err != nil {
		return system{}, err
	}
	code := utmFor(lon, lat, s.code)
	utm, err := parseSystem(code)
	if err != nil {
		return system{}, err
	}
	f.note("worked in %s (%s), the zone of the middle of the survey, instead of %s", utm.name, code, s.name)
	return utm, nil
}

func (f *Frame) note(format string, args ...any) {
	f.Notes = append(f.Notes, fmt.Sprintf(format, args...))
}

// inMetres returns the projected or local system s with axes in metres.
func (f *Frame) inMetres(s system) (system, error) {
	m, err := s.metric()
	if err == nil && m.unit != s.unit && s.unit > 0 {
		f.note("the axes of %q were converted from %s to metres (1 %s = %.12g m)", s.name, s.unitName, s.unitName, s.unit)
	}
	return m, err
}

// add plans the way of one source into the working CRS.
func (f *Frame) add(p *probe, work system) error {
	pl := plan{from: p.system, xy: 1, z: p.heightUnit(), points: p.points}
	s := p.system
	if s.kind == local && s.unit > 0 {
		pl.xy = s.unit
	}
	switch {
	case s.kind == local && s.wkt == "":
		if work.kind != local || work.wkt != "" {
			p.note("there is no CRS: its coordinates are taken to be in the working CRS %q", work.name)
		}
	case s.kind == local && work.kind != local:
		return placeError(p.src.Path, fmt.Sprintf("its coordinate system %q is tied to no place on earth, but other surveys are", s.name),
			"give crs: EPSG:n of its coordinates, or leave it out")
	case s.kind == local:
	case work.kind == local:
		return placeError(p.src.Path, "it has a CRS and the first survey's is tied to no place on earth", "give that one's crs: EPSG:n")
	case s.kind == geocentric:
		pl.how, pl.z = geocentre, 1
	default:
		pl.how = reproject
		if m, err := s.metric(); err == nil && m.wkt == work.wkt {
			pl.how, pl.xy = scaled, s.unit
		}
	}
	f.plans[p.src] = pl
	t, err := f.Transformer(p.src)
	if err != nil {
		return err
	}
	defer t.Close()
	if pl.how == reproject {
		if same, err := t.moves(p.extent, p.system.unit); err == nil && same {
			pl.how, pl.xy = scaled, p.system.unit
			t.plan = pl
		}
	}
	if pl.extent, err = t.extent(p.extent); err != nil {
		return fmt.Errorf("%s: survey: its coordinates have no place in %q: %w; check its CRS", p.src.Path, f.Name, err)
	}
	if side := t.cell(p.extent, p.header.Cell); side > 0 {
		f.GridCell = max(f.GridCell, side)
		if pl.how != scaled {
			p.note("a grid's cell of %.6g in its own CRS is up to %g m wide in the working CRS, the finest spacing without holes; each cell is a point at its middle", p.header.Cell, side)
		}
	}
	if pl.how != scaled {
		p.noteAccuracy(t.through.Accuracy())
	}
	f.plans[p.src] = pl
	f.Extent.Union(pl.extent)
	f.Points += p.points
	return nil
}

// noteAccuracy says what changing the datum on the way into the working CRS
// may cost, where it is more than a good survey is off by itself.
func (p *probe) noteAccuracy(metres float64, ballpark bool) {
	const worthSayingM = 0.05
	switch {
	case ballpark:
		p.note("PROJ knows no way between the datum of %q and that of the working CRS here, and takes them for one: positions may be off by metres, in some countries by hundreds", p.system.name)
	case metres > worthSayingM:
		p.note("positions were moved to the datum of the working CRS, which is good to %g m", metres)
	}
}

// heightUnit is the metres per unit of height of a source.
func (p *probe) heightUnit() float64 {
	s := p.system
	switch {
	case s.vertical > 0:
		if s.vertical != 1 {
			p.note("heights were converted to metres (1 unit of %q = %.12g m)", s.heights, s.vertical)
		}
		return s.vertical
	case s.kind == projected && s.unit != 1:
		p.note("nothing says the unit of its heights: it is taken to be that of the plan, %s; give a compound crs: EPSG:n+m if it isn't", s.unitName)
		return s.unit
	case s.kind == local && s.unit > 0:
		return s.unit
	}
	return 1
}

// checkHeights notes what heights refer to, and warns of surveys that refer to
// different things.
func (f *Frame) checkHeights(probes []*probe) {
	var from *probe
	for _, p := range probes {
		switch {
		case p.system.heights == "":
		case from == nil:
			from = p
			f.VerticalName = p.system.heights
		case p.system.heights != f.VerticalName:
			f.note("%s refers its heights to %q, %s to %q: they were not moved to a common datum", p.src.Path, p.system.heights, from.src.Path, f.VerticalName)
		}
	}
}

// checkPlaces refuses extents that can't be a site.
func (f *Frame) checkPlaces(probes []*probe) error {
	for _, p := range probes {
		e := f.plans[p.src].extent
		for a, axis := range [3]string{"east", "north", "up"} {
			if w := e.Max[a] - e.Min[a]; !(w <= maxSpanM) {
				return placeError(p.src.Path, fmt.Sprintf("its points spread over %.4g km %s, which is no site", w/1000, axis),
					"remove stray points, or give its right crs: EPSG:n")
			}
		}
	}

	// Tiles of a long corridor hang together though its ends are far apart:
	// what counts is whether every file can be reached from the first.
	reached := []*probe{probes[0]}
	rest := slices.Clone(probes[1:])
	for i := 0; i < len(reached); i++ {
		rest = slices.DeleteFunc(rest, func(p *probe) bool {
			if f.apart(reached[i], p) > 0 {
				return false
			}
			reached = append(reached, p)
			return true
		})
	}
	if len(rest) == 0 {
		return nil
	}
	lost, near := rest[0], reached[0]
	for _, p := range reached {
		if f.apart(p, lost) < f.apart(near, lost) {
			near = p
		}
	}
	return placeError(lost.src.Path, fmt.Sprintf("it lies %.4g km away from %s", f.apart(near, lost)/1000, near.src.Path),
		"surveys of one worksite must be of one place: check the crs of both")
}

// apart is the distance between two sources in different places, 0 if they
// may be of one site.
func (f *Frame) apart(p, q *probe) float64 {
	e, o := f.plans[p.src].extent, f.plans[q.src].extent
	gap := math.Hypot(gapOf(e, o, 0), gapOf(e, o, 1))
	if gap > minGapM && gap > minApart*max(sizeOf(e), sizeOf(o)) {
		return gap
	}
	return 0
}

// gapOf is the distance between two boxes along an axis, 0 where they overlap.
func gapOf(a, b terrain.Extent, axis int) float64 {
	return max(0, a.Min[axis]-b.Max[axis], b.Min[axis]-a.Max[axis])
}

func sizeOf(e terrain.Extent) float64 {
	return math.Hypot(e.Max[0]-e.Min[0], e.Max[1]-e.Min[1])
}
