package survey

import (
	"errors"
	"fmt"

	"ledgework/terrain"
	"ledgework/terrain/gdal"
)

// A Source is one survey file of a worksite.
type Source struct {
	Path     string
	CRS      string // takes the place of the file's own CRS; empty: the file's own
	Tolerant bool   // see Options
	Band     int    // see Options
}

func (s Source) options() Options {
	return Options{CRS: s.CRS, Tolerant: s.Tolerant, Band: s.Band}
}

// A Frame is the working CRS of a run: what its coordinates mean, and how each
// source is brought into it. Plan makes it; it doesn't change afterwards and
// may be shared by goroutines.
type Frame struct {
	CRS           string // horizontal CRS, WKT (ISO 19162), axes in metres; empty when Local
	Name          string // of CRS, or "local coordinates"
	AuthorityCode string // of CRS: "EPSG:32633"; empty if it has none

	// Local says that no source has a CRS: metres in a frame nobody knows, or
	// one that is tied to no place on earth. Layers that need longitude and
	// latitude can't be made.
	Local bool

	// VerticalName names what heights refer to, in the first source that says
	// so; empty if none does. Heights are converted to metres but not moved
	// from one datum to another.
	VerticalName string

	// GridCell is the largest cell of the elevation grids among the sources,
	// in metres of the working CRS, 0 if there are none. A cell that isn't
	// square there, as one of degrees, counts with its longer side, since a
	// lattice finer than that would have holes; it is rounded up to 0.2 mm.
	GridCell float64

	Extent terrain.Extent // of all sources, metres, as far as their headers tell the truth
	Points int64          // of all sources, as promised or counted

	// Notes say, one sentence each, what was assumed, converted or left
	// undone. They belong in front of the user.
	Notes []string

	work  system // as CRS has it
	plans map[Source]plan
}

// A plan says how the coordinates of one source become those of the frame.
type plan struct {
	from   system
	how    means
	xy, z  float64        // metres per unit of the source
	extent terrain.Extent // working, as the header tells or as counted
	points int64
}

// means are the ways to get into the working CRS.
type means uint8

const (
	scaled    means = iota // multiplied by xy and z; both 1 is no work at all
	reproject              // plan positions by PROJ, heights by z
	geocentre              // all three by PROJ
)

// errNoCRS says why there is no longitude and latitude.
var errNoCRS = errors.New("survey: local coordinates have no place on earth; give crs: EPSG:n for the surveys in the worksite")

// ToWGS84 returns a transform from the working CRS to longitude and latitude
// in degrees on WGS 84 (EPSG:4326, longitude first). It is for one goroutine,
// who closes it. It fails when f is Local.
func (f *Frame) ToWGS84() (*gdal.Transform, error) {
	if f.Local {
		return nil, errNoCRS
	}
	return f.work.toWGS84()
}

// wgs84 is the CRS of longitude and latitude.
const wgs84 = "EPSG:4326"

// A Transformer brings batches of one source into the working CRS. It is for
// one goroutine at a time.
type Transformer struct {
	plan    plan
	through *gdal.Transform // nil when plan.how is scaled
}

// Transformer returns a new transformer for a source that f was planned with;
// any other source is an error.
func (f *Frame) Transformer(src Source) (*Transformer, error) {
	p, ok := f.plans[src]
	if !ok {
		return nil, fmt.Errorf("%s: survey: the frame was not planned with this file", src.Path)
	}
	t := &Transformer{plan: p}
	if p.how == scaled {
		return t, nil
	}
	var err error
	t.through, err = p.from.transformTo(f.work)
	if err != nil {
		return nil, fmt.Errorf("%s: survey: no way from %q to %q: %w", src.Path, p.from.name, f.Name, err)
	}
	return t, nil
}

// Identity reports whether Apply does nothing.
func (t *Transformer) Identity() bool {
	return t.plan.how == scaled && t.plan.xy == 1 && t.plan.z == 1
}

// Apply brings the coordinates of b into the working CRS, in place. A point
// that has no place there gets coordinates that are not finite.
func (t *Transformer) Apply(b *terrain.Batch) error {
	return t.apply(b.X, b.Y, b.Z)
}

func (t *Transformer) apply(x, y, z []float64) error {
	p := &t.plan
	switch p.how {
	case scaled:
		scale(x, p.xy)
		scale(y, p.xy)
	case reproject:
		// PROJ never sees heights: it would move them between vertical datums
		// where it knows how, and leave them where it doesn't.
		if err := passed(t.through.Apply(x, y, nil)); err != nil {
			return err
		}
	case geocentre:
		return passed(t.through.Apply(x, y, z))
	}
	scale(z, p.z)
	return nil
}

// passed drops the error of a transform that failed for some of the points:
// they have infinite coordinates and are counted by the filter.
func passed(err error) error {
	var some *gdal.TransformError
	if errors.As(err, &some) {
		return nil
	}
	return err
}

func scale(v []float64, by float64) {
	if by == 1 {
		return
	}
	for i := range v {
		v[i] *= by
	}
}

// Close releases the transformer.
func (t *Transformer) Close() error {
	if t.through == nil {
		return nil
	}
	return t.through.Close()
}
