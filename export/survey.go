package export

import "strings"

func siteLayer() Layer {
	return Layer{
		Name:  "site",
		Title: "Site",
		Meaning: "The survey as a whole, one feature. The geometry is the plan outline of its coarse voxels. The allowed limits are those of the " +
			"platform's profile that the user's competent person set.",
	}
}

func siteColumns() []column[siteRow] {
	type row = siteRow
	return []column[row]{
		text("name", "", "name of the site", func(r *row) string { return r.Name }),
		null("none defines it", text("crs", "authority:code", "working CRS", func(r *row) string {
			if r.CRS.Authority == "" || r.CRS.Code == "" {
				return ""
			}
			return r.CRS.Authority + ":" + r.CRS.Code
		})),
		null("local coordinates", text("crs_name", "", "name of the working CRS", func(r *row) string { return r.CRS.Name })),
		null("local coordinates", text("crs_wkt", "", "definition of the working CRS", func(r *row) string { return r.CRS.WKT })),
		text("vertical_datum", "a name, or unknown", "what heights refer to: they are as in the survey, and no geoid is applied", func(r *row) string { return r.CRS.verticalDatum() }),
		text("frame", "", "what coordinates mean: axes, units, heights, lattice of the voxels", func(r *row) string { return r.Frame() }),
		null("nothing", text("conversions", "", "what was assumed, converted or left undone on the way into the working CRS", func(r *row) string { return r.Conversions })),
		null("unknown", text("dates", "YYYY-MM-DD, comma-separated", "dates of the surveys", func(r *row) string { return strings.Join(r.Dates, ", ") })),
		number("spacing_m", "m", metreDigits, "> 0", "edge of a voxel", func(r *row) float64 { return r.Voxels.Lattice.SpacingM() }),
		count("points", "≥ 1", "raw points summed", func(r *row) int64 { return r.points }),
		count("voxels", "≥ 1", "occupied voxels", func(r *row) int64 { return int64(r.voxels) }),
		number("e_min_m", "m", metreDigits, "", "least east of the voxel means", func(r *row) float64 { return r.eMin }),
		number("e_max_m", "m", metreDigits, "", "greatest east", func(r *row) float64 { return r.eMax }),
		number("n_min_m", "m", metreDigits, "", "least north", func(r *row) float64 { return r.nMin }),
		number("n_max_m", "m", metreDigits, "", "greatest north", func(r *row) float64 { return r.nMax }),
		number("h_min_m", "m", metreDigits, "", "least height", func(r *row) float64 { return r.hMin }),
		number("h_max_m", "m", metreDigits, "", "greatest height", func(r *row) float64 { return r.hMax }),
		count("obstacles", "≥ 0", "features of layer obstacles", func(r *row) int64 { return int64(r.obstacles) }),
		count("patches", "≥ 0", "features of layer patches", func(r *row) int64 { return int64(r.patches) }),
		count("zones", "≥ 0", "features of layer zones", func(r *row) int64 { return int64(r.zones) }),
		null("none", text("profile", "", "platform profile that patches are scored by", func(r *row) string { return r.Profile.Name })),
		number("footprint_radius_m", "m", metreDigits, "> 0", "radius of the footprint", func(r *row) float64 { return r.Profile.FootprintRadiusM }),
		number("allowed_inclination_min_deg", "°", degreeDigits, "0 to 180", "least inclination allowed", func(r *row) float64 { return r.Profile.InclinationDeg.AllowedMin }),
		number("allowed_inclination_max_deg", "°", degreeDigits, "0 to 180", "greatest inclination allowed", func(r *row) float64 { return r.Profile.InclinationDeg.AllowedMax }),
		number("allowed_roughness_m", "m", metreDigits, "≥ 0", "greatest roughness allowed", func(r *row) float64 { return r.Profile.RoughnessM.Allowed }),
		number("allowed_step_m", "m", metreDigits, "≥ 0", "greatest step allowed", func(r *row) float64 { return r.Profile.StepM.Allowed }),
		number("allowed_clearance_m", "m", metreDigits, "", "least clearance allowed; negative lets a footprint overlap an obstacle", func(r *row) float64 { return r.Profile.ClearanceM.Allowed }),
		number("allowed_coverage", "", ratioDigits, "0 to 1", "least coverage allowed", func(r *row) float64 { return r.Profile.Coverage.Allowed }),
		text("caution", "", "what this may be used for", func(*row) string { return Caution }),
	}
}
