package demo

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// A Position is E, N, H in metres, or a direction in these axes.
type Position [3]float64

// Vec is the position as a vector.
func (p Position) Vec() r3.Vec { return r3.Vec{X: p[0], Y: p[1], Z: p[2]} }

func position(v r3.Vec) Position { return Position{v.X, v.Y, v.Z} }

// Truth is what there is to find on the site in one season, and what is not to
// be found. All positions are true ground positions: see Transform for the
// coordinates that a season delivers. Heights and depths are relative to the
// face without its features.
type Truth struct {
	Site        string       `json:"site"`
	Statement   string       `json:"statement"`
	CRS         string       `json:"crs"`
	Date        string       `json:"date"`
	NoiseSigmaM float64      `json:"noise_sigma_m"` // of a point on each axis, unless ScanOptions say otherwise
	Obstacles   []Obstacle   `json:"obstacles"`
	Scatter     []Scatter    `json:"scatter"`
	Planes      []Plane      `json:"planes"`
	Ledges      []Ledge      `json:"ledges"`
	Distractors []Distractor `json:"distractors"`
	Changes     []Change     `json:"changes"` // since season 1
	Delivered   Transform    `json:"delivered"`
}

// A Box is a rectangular box in any attitude.
type Box struct {
	Centre Position   `json:"centre"`
	Along  Position   `json:"along"` // unit vectors
	Up     Position   `json:"up"`
	Out    Position   `json:"out"`
	HalfM  [3]float64 `json:"half_m"` // half sizes along, up and out
}

// Contains reports whether p lies in the box grown by margin metres on every
// side.
func (b *Box) Contains(p r3.Vec, margin float64) bool {
	q := r3.Sub(p, b.Centre.Vec())
	return math.Abs(r3.Dot(q, b.Along.Vec())) <= b.HalfM[0]+margin &&
		math.Abs(r3.Dot(q, b.Up.Vec())) <= b.HalfM[1]+margin &&
		math.Abs(r3.Dot(q, b.Out.Vec())) <= b.HalfM[2]+margin
}

// An Obstacle is something that a survey must find. A niche with a roof is two
// obstacles, the recess and the overhang of its roof.
type Obstacle struct {
	Name string `json:"name"`
	Kind string `json:"kind"` // bulge, overhang, recess or overhanging bulge
	Box  Box    `json:"box"`  // encloses what of it lies outside or inside the face

	HeightM float64 `json:"height_m"` // proud of the face, or deep in it; the reach of an overhang
	ReachM  float64 `json:"reach_m"`  // horizontal, from lip to back; 0 where nothing overhangs
	AreaM2  float64 `json:"area_m2"`  // of face that it covers; of an overhang its underside

	// VolumeM3 is the rock proud of the face, or missing from it. It is exact
	// on plane faces. An overhang has none of its own.
	VolumeM3 float64 `json:"volume_m3"`

	FaceInclinationDeg float64 `json:"face_inclination_deg"`
}

// A Scatter is something without a surface, such as a shrub: a finding there
// must be flagged as scattered.
type Scatter struct {
	Name    string   `json:"name"`
	Centre  Position `json:"centre"`
	RadiusM float64  `json:"radius_m"`
}

// A Plane is a part of the site that is a plane and carries nothing else.
type Plane struct {
	Name            string   `json:"name"`
	Point           Position `json:"point"`
	Normal          Position `json:"normal"` // into the air
	InclinationDeg  float64  `json:"inclination_deg"`
	DipDirectionDeg float64  `json:"dip_direction_deg"`
	Box             Box      `json:"box"` // points of the plane alone
}

// A Ledge is a tread between two risers. The face above stands back from the
// face below, up to the crest, so its brow and its back are edges like crest
// and foot; a finding on them is neither right nor wrong.
type Ledge struct {
	Name           string      `json:"name"`
	Corners        [4]Position `json:"corners"` // lip from east to west, back from west to east
	Bay            Box         `json:"bay"`     // the rock that is missing above the tread, up to the crest
	DepthM         float64     `json:"depth_m"` // horizontal, lip to back
	LengthM        float64     `json:"length_m"`
	InclinationDeg float64     `json:"inclination_deg"`

	// FitsPerson tells whether a disc of radius 0.4 m, with 0.2 m to spare for
	// lip and back, fits on the tread and its inclination is at most 25°. It is
	// no statement on safety.
	FitsPerson bool `json:"fits_person"`
}

// A Distractor is something that must not be found: too small, or a shape that
// is no obstacle. It has a box, or a line along an edge.
type Distractor struct {
	Name   string     `json:"name"`
	Reason string     `json:"reason"`
	Box    *Box       `json:"box,omitempty"`
	Line   []Position `json:"line,omitempty"`
}

// A Change is what happened to the site since season 1.
type Change struct {
	Name     string  `json:"name"`
	Kind     string  `json:"kind"`      // loss or gain of rock
	VolumeM3 float64 `json:"volume_m3"` // exact, scar included
	DepthM   float64 `json:"depth_m"`   // greatest distance between old and new surface along the face's normal
	Box      Box     `json:"box"`       // both surfaces
}

// A Transform is the rigid motion from true to delivered coordinates:
// delivered = pivot + shift + rotation·(true − pivot).
type Transform struct {
	Pivot     Position    `json:"pivot"`
	Shift     Position    `json:"shift"`
	Rotation  [3]Position `json:"rotation"` // rows
	AngleDeg  float64     `json:"angle_deg"`
	AxisENH   Position    `json:"axis"`
	ShiftLenM float64     `json:"shift_length_m"` // length of Shift
}

// Apply maps a true position to a delivered one.
func (t *Transform) Apply(p r3.Vec) r3.Vec {
	q := r3.Sub(p, t.Pivot.Vec())
	q = r3.Vec{
		X: r3.Dot(t.Rotation[0].Vec(), q),
		Y: r3.Dot(t.Rotation[1].Vec(), q),
		Z: r3.Dot(t.Rotation[2].Vec(), q),
	}
	return r3.Add(q, r3.Add(t.Pivot.Vec(), t.Shift.Vec()))
}

// Invert maps a delivered position to the true one.
func (t *Transform) Invert(p r3.Vec) r3.Vec {
	q := r3.Sub(r3.Sub(p, t.Shift.Vec()), t.Pivot.Vec())
	o := r3.Scale(q.X, t.Rotation[0].Vec())
	o = r3.Add(o, r3.Scale(q.Y, t.Rotation[1].Vec()))
	return r3.Add(t.Pivot.Vec(), r3.Add(o, r3.Scale(q.Z, t.Rotation[2].Vec())))
}

// newTransform shifts by shift and turns by deg about the axis through pivot,
// by the formula of Rodrigues (1840).
func newTransform(pivot, shift, axis r3.Vec, deg float64) Transform {
	sin, cos := sincosDeg(deg)
	k := r3.Unit(axis)
	column := func(e r3.Vec) r3.Vec {
		v := r3.Add(r3.Scale(cos, e), r3.Scale(sin, r3.Cross(k, e)))
		return r3.Add(v, r3.Scale((1-cos)*r3.Dot(k, e), k))
	}
	x, y, z := column(r3.Vec{X: 1}), column(r3.Vec{Y: 1}), column(r3.Vec{Z: 1})
	return Transform{
		Pivot: position(pivot), Shift: position(shift), AngleDeg: deg, AxisENH: position(k), ShiftLenM: r3.Norm(shift),
		Rotation: [3]Position{{x.X, y.X, z.X}, {x.Y, y.Y, z.Y}, {x.Z, y.Z, z.Z}},
	}
}
