package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Seasons is the number of seasons that the site was surveyed.
const Seasons = 2

// Where the invented site lies.
const (
	crs       = "EPSG:32633"
	originE   = 412000.0
	originN   = 6543000.0
	originH   = 6.0
	seawardAz = 200.0 // azimuth of the site frame's Y axis
)

// A Site is Gull Head. It is immutable and may be used by many goroutines.
type Site struct {
	seed       uint64
	along, sea r3.Vec // site frame's X and Y axes in E, N, H
	origin     r3.Vec
}

// NewSite returns the site. The seed decides noise, strays and the shrub's
// twigs, not the shapes.
func NewSite(seed uint64) *Site {
	s, c := sincosDeg(seawardAz)
	return &Site{
		seed:   seed,
		along:  r3.Vec{X: c, Y: -s},
		sea:    r3.Vec{X: s, Y: c},
		origin: r3.Vec{X: originE, Y: originN, Z: originH},
	}
}

// CRS is the working CRS of all coordinates, as an EPSG code. Heights are above
// an invented sea level.
func (s *Site) CRS() string { return crs }

// Name is the name of the site.
func (s *Site) Name() string { return "Gull Head" }

// toWorld maps a point from the site frame to E, N, H.
func (s *Site) toWorld(p r3.Vec) r3.Vec { return r3.Add(s.origin, s.turn(p)) }

// turn maps a direction from the site frame to E, N, H.
func (s *Site) turn(d r3.Vec) r3.Vec {
	v := r3.Add(r3.Scale(d.X, s.along), r3.Scale(d.Y, s.sea))
	v.Z = d.Z
	return v
}

// toSite maps E, N, H to the site frame.
func (s *Site) toSite(p r3.Vec) r3.Vec {
	q := r3.Sub(p, s.origin)
	return r3.Vec{X: r3.Dot(q, s.along), Y: r3.Dot(q, s.sea), Z: q.Z}
}

// A Season is the site on one day, and how it was scanned. It is immutable and
// may be used by many goroutines.
type Season struct {
	site   *Site
	number int
	solid  solid
	truth  Truth
	shrub  frame
	setups []setup
}

// Season returns season n, 1 or 2. It panics on any other number.
func (s *Site) Season(n int) *Season {
	if n < 1 || n > Seasons {
		panic("demo: no such season")
	}
	b := newBuilder(s, n)
	b.build()
	t := &Season{
		site: s, number: n,
		solid: b.solid(), truth: b.truth, shrub: b.shrub,
		setups: setups(n),
	}
	t.truth.Site = s.Name()
	t.truth.Statement = "Gull Head and the Skerrow branch railway are invented. The coordinates are in the form of EPSG:32633, but nothing of this lies there."
	t.truth.CRS = crs
	t.truth.Date = t.Date()
	t.truth.NoiseSigmaM = DefaultNoiseM
	t.truth.Delivered = s.registration(n)
	return t
}

// registration is the error with which a season's coordinates are delivered.
func (s *Site) registration(n int) Transform {
	pivot := s.toWorld(r3.Vec{X: 28, Z: 10})
	if n == 1 {
		return newTransform(pivot, r3.Vec{}, r3.Vec{Z: 1}, 0)
	}
	// 0.15 m in all.
	shift := r3.Vec{X: 0.10, Y: -0.10, Z: 0.05}
	return newTransform(pivot, shift, r3.Vec{X: 0.2, Y: -0.3, Z: 1}, 0.3)
}

// A setup is a scanner's position in the site frame and its angular step
// relative to the other setups'.
type setup struct {
	at   r3.Vec
	step float64
}

// setups are three on the skerries off the foot, one of them close enough to
// look up under the Slot's roof, and two on masts from which
// treads and the slope above the crest can be seen, with a finer step because
// they see both at a slant.
func setups(season int) []setup {
	const fine = 0.8
	if season == 1 {
		return []setup{
			{r3.Vec{X: 2, Y: 30, Z: 3}, 1.1}, {r3.Vec{X: 30, Y: 34, Z: 3.5}, 1.1}, {r3.Vec{X: 66, Y: 14, Z: 2.5}, 0.95},
			{r3.Vec{X: 2, Y: 25, Z: 42}, fine}, {r3.Vec{X: 50, Y: 22, Z: 42}, 0.7},
		}
	}
	return []setup{
		{r3.Vec{X: 8, Y: 29, Z: 3.2}, 0.9}, {r3.Vec{X: 36, Y: 34, Z: 3}, 1}, {r3.Vec{X: 64, Y: 15, Z: 2.8}, 1},
		{r3.Vec{X: 6, Y: 25, Z: 43}, fine}, {r3.Vec{X: 52, Y: 24, Z: 44}, 0.7},
	}
}

// Date is the invented day of the survey, YYYY-MM-DD.
func (s *Season) Date() string {
	if s.number == 1 {
		return "2025-04-09"
	}
	return "2026-04-15"
}

// Number is 1 for the first season.
func (s *Season) Number() int { return s.number }

// Stations are the scanner's positions in the season's delivered coordinates.
func (s *Season) Stations() []r3.Vec {
	p := make([]r3.Vec, len(s.setups))
	for i, q := range s.setups {
		p[i] = s.truth.Delivered.Apply(s.site.toWorld(q.at))
	}
	return p
}

// Truth is what there is to find. The caller must not change its slices.
func (s *Season) Truth() Truth { return s.truth }

// ToDelivered maps a true position to the coordinates of the season's files.
func (s *Season) ToDelivered(p r3.Vec) r3.Vec { return s.truth.Delivered.Apply(p) }

// FromDelivered is the inverse of ToDelivered.
func (s *Season) FromDelivered(p r3.Vec) r3.Vec { return s.truth.Delivered.Invert(p) }

// SignedDistance is negative in rock, zero on its surface and positive in air,
// at a true position. Close to a plane part its value is the distance; else it
// is at most 1.13 times that. The shrub does not count.
func (s *Season) SignedDistance(p r3.Vec) float64 {
	d, _ := s.solid.eval(s.site.toSite(p), s.solid.all)
	return d
}

// NormalAt is the unit normal into the air of the surface at, or next to, the
// true position p. On an edge it is that of one of the two sides.
func (s *Season) NormalAt(p r3.Vec) r3.Vec {
	q := s.site.toSite(p)
	_, surface := s.solid.eval(q, s.solid.all)
	return s.site.turn(s.solid.normal(q, surface))
}

// FeatureAt is the name of the feature whose surface is next to the true
// position p, empty on the bare cliff.
func (s *Season) FeatureAt(p r3.Vec) string {
	_, surface := s.solid.eval(s.site.toSite(p), s.solid.all)
	if surface < 0 {
		return ""
	}
	return s.solid.features[surface].name
}

// azimuth is that of a direction's horizontal part, degrees in [0, 360).
func azimuth(d r3.Vec) float64 {
	a := math.Atan2(d.X, d.Y) * 180 / math.Pi
	if a < 0 {
		a += 360
	}
	return a
}
