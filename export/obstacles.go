package export

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

// Digits kept after the point.
const (
	metreDigits  = 4 // the resolution of all sums, 0.1 mm
	degreeDigits = 4 // 2 µm at 1 m
	ratioDigits  = 6
	cubicDigits  = 6
)

func obstacleLayer() Layer {
	return Layer{
		Name:  "obstacles",
		Title: "Obstacles",
		Meaning: "Connected pieces of surface that a rope or a load catches on, or gets trapped in. The geometry is the plan outline of the " +
			"obstacle's voxels; the true shape is the ellipsoid, of which every corner of every voxel is a point inside. " +
			"A point p is inside when |S⁻¹·Rᵀ·(p − c)| ≤ 1, with centre c, S the semi-axes on a diagonal and R the rotation of the quaternion.",
	}
}

// number is a Real column of a row.
func number[T any](name, unit string, decimals int, values, meaning string, get func(*T) float64) column[T] {
	return column[T]{
		Field: Field{Name: name, Type: Real, Unit: unit, Decimals: decimals, Range: values, Meaning: meaning},
		value: func(r *T) any { return get(r) },
	}
}

// text is a Text column of a row.
func text[T any](name, values, meaning string, get func(*T) string) column[T] {
	return column[T]{
		Field: Field{Name: name, Type: Text, Range: values, Meaning: meaning},
		value: func(r *T) any { return get(r) },
	}
}

// count is an Integer column of a row.
func count[T any](name, values, meaning string, get func(*T) int64) column[T] {
	return column[T]{
		Field: Field{Name: name, Type: Integer, Range: values, Meaning: meaning},
		value: func(r *T) any { return get(r) },
	}
}

// null gives a column its meaning of null, which the value takes where the
// number is not finite or the text is empty.
func null[T any](meaning string, c column[T]) column[T] {
	get := c.value
	c.Null = meaning
	c.value = func(r *T) any {
		switch v := get(r).(type) {
		case float64:
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil
			}
			return v
		case string:
			if v == "" {
				return nil
			}
			return v
		default:
			return v
		}
	}
	return c
}

func obstacleColumns() []column[obstacleRow] {
	type row = obstacleRow
	columns := []column[row]{
		text("id", "unique", "stable identity: kind and place", func(r *row) string { return r.ID }),
		text("kind", "bulge, overhang, recess, overhanging bulge", "what it is", func(r *row) string { return string(r.Kind) }),
		number("centre_e_m", "m", FullPrecision, "", "east of the ellipsoid's centre", func(r *row) float64 { return r.Ellipsoid.Centre.X }),
		number("centre_n_m", "m", FullPrecision, "", "north of the ellipsoid's centre", func(r *row) float64 { return r.Ellipsoid.Centre.Y }),
		number("centre_h_m", "m", FullPrecision, "", "height of the ellipsoid's centre", func(r *row) float64 { return r.Ellipsoid.Centre.Z }),
		number("semi_axis_1_m", "m", FullPrecision, "> 0", "longest semi-axis", func(r *row) float64 { return r.Ellipsoid.SemiAxes[0] }),
		number("semi_axis_2_m", "m", FullPrecision, "> 0", "middle semi-axis", func(r *row) float64 { return r.Ellipsoid.SemiAxes[1] }),
		number("semi_axis_3_m", "m", FullPrecision, "> 0", "shortest semi-axis", func(r *row) float64 { return r.Ellipsoid.SemiAxes[2] }),
		number("quat_w", "", FullPrecision, "0 to 1", "rotation of the axes frame into east, north, height: unit quaternion, real part", func(r *row) float64 { return r.quat[0] }),
		number("quat_x", "", FullPrecision, "-1 to 1", "the quaternion's i part", func(r *row) float64 { return r.quat[1] }),
		number("quat_y", "", FullPrecision, "-1 to 1", "the quaternion's j part", func(r *row) float64 { return r.quat[2] }),
		number("quat_z", "", FullPrecision, "-1 to 1", "the quaternion's k part", func(r *row) float64 { return r.quat[3] }),
	}
	columns = append(columns, axisColumns()...)
	return append(columns,
		number("inflated_by_m", "m", metreDigits, "≥ 0", "clearance of the worksite by which the inflated ellipsoid is grown", func(r *row) float64 { return r.inflatedByM }),
		number("inflated_semi_axis_1_m", "m", FullPrecision, "> 0", "longest semi-axis of the inflated ellipsoid, which has the same centre and axes", func(r *row) float64 { return r.Inflated.SemiAxes[0] }),
		number("inflated_semi_axis_2_m", "m", FullPrecision, "> 0", "its middle semi-axis", func(r *row) float64 { return r.Inflated.SemiAxes[1] }),
		number("inflated_semi_axis_3_m", "m", FullPrecision, "> 0", "its shortest semi-axis", func(r *row) float64 { return r.Inflated.SemiAxes[2] }),
		number("height_m", "m", metreDigits, "> 0", "greatest relief of a bulge, depth of a recess, or reach of an overhang from lip to back", func(r *row) float64 { return r.HeightM }),
		number("area_m2", "m²", metreDigits, "> 0", "surface area", func(r *row) float64 { return r.AreaM2 }),
		number("rock_volume_m3", "m³", cubicDigits, "≥ 0", "volume between surface and reference face; of a recess, the missing rock", func(r *row) float64 { return r.RockVolumeM3 }),
		number("ellipsoid_volume_m3", "m³", cubicDigits, "> 0", "volume of the whole ellipsoid, on both sides of the reference face", func(r *row) float64 { return r.Ellipsoid.Volume() }),
		number("ellipsoid_area_m2", "m²", metreDigits, "> 0", "surface area of the whole ellipsoid", func(r *row) float64 { return r.Ellipsoid.SurfaceArea() }),
		number("rock_share", "", ratioDigits, "0 to 1", "rock volume over the part of the ellipsoid on the same side of the reference face", func(r *row) float64 { return r.RockShare }),
		number("volume_gap", "", FullPrecision, "≥ 0", "relative bound on how much larger the ellipsoid is than the smallest one that contains every point", func(r *row) float64 { return r.VolumeGap }),
		number("inclination_deg", "°", degreeDigits, "0 to 180", "95th percentile of the inclination of its local planes: 0 flat, 90 vertical, more overhanging", func(r *row) float64 { return r.InclinationDeg }),
		null(looksNowhere, number("dip_direction_deg", "°", degreeDigits, "0 to 360", "azimuth in which the reference face looks", func(r *row) float64 { return dipDirection(r.Face.Normal) })),
		null("no local plane could be fitted", number("surface_variation", "", ratioDigits, "0 to 1/3", "median share of the smallest eigenvalue of its local planes: 0 smooth, 1/3 no surface at all", func(r *row) float64 { return r.SurfaceVariation })),
		column[row]{
			Field: Field{Name: "scattered", Type: Boolean, Range: "true, false", Meaning: "not a surface: vegetation, wires or stray points"},
			value: func(r *row) any { return r.Scattered },
		},
		number("top_e_m", "m", metreDigits, "", "east of the point furthest from the reference face", func(r *row) float64 { return r.Top.X }),
		number("top_n_m", "m", metreDigits, "", "north of that point", func(r *row) float64 { return r.Top.Y }),
		number("top_h_m", "m", metreDigits, "", "height of that point", func(r *row) float64 { return r.Top.Z }),
		number("face_e_m", "m", metreDigits, "", "east of a point of the reference face", func(r *row) float64 { return r.Face.Centroid.X }),
		number("face_n_m", "m", metreDigits, "", "north of that point", func(r *row) float64 { return r.Face.Centroid.Y }),
		number("face_h_m", "m", metreDigits, "", "height of that point", func(r *row) float64 { return r.Face.Centroid.Z }),
		number("face_normal_e", "", FullPrecision, "-1 to 1", "unit normal of the reference face, pointing into the air: east part", func(r *row) float64 { return r.Face.Normal.X }),
		number("face_normal_n", "", FullPrecision, "-1 to 1", "its north part", func(r *row) float64 { return r.Face.Normal.Y }),
		number("face_normal_h", "", FullPrecision, "-1 to 1", "its upward part", func(r *row) float64 { return r.Face.Normal.Z }),
		number("face_inclination_deg", "°", degreeDigits, "0 to 180", "inclination of the reference face", func(r *row) float64 { return fit.InclinationDeg(r.Face.Normal) }),
		count("voxels", "≥ 1", "occupied voxels", func(r *row) int64 { return int64(len(r.Voxels)) }),
	)
}

// looksNowhere is the meaning of a dip direction that is null. Any number would
// be taken for a direction, 0 for north.
const looksNowhere = "level: it looks nowhere"

// dipDirection is the dip direction of a unit normal in degrees, NaN where it
// has none.
func dipDirection(n r3.Vec) float64 {
	if deg, ok := fit.DipDirectionDeg(n); ok {
		return deg
	}
	return math.NaN()
}

// axisColumns are trend and plunge of the ellipsoid's axes.
func axisColumns() []column[obstacleRow] {
	var out []column[obstacleRow]
	for i, n := range [3]string{"1", "2", "3"} {
		out = append(out,
			number("axis_"+n+"_trend_deg", "°", degreeDigits, "0 to 360", "azimuth of the downward end of semi-axis "+n, func(r *obstacleRow) float64 {
				trend, _ := r.Ellipsoid.TrendPlunge(i)
				return trend
			}),
			number("axis_"+n+"_plunge_deg", "°", degreeDigits, "0 to 90", "angle of that end below the horizontal", func(r *obstacleRow) float64 {
				_, plunge := r.Ellipsoid.TrendPlunge(i)
				return plunge
			}))
	}
	return out
}
