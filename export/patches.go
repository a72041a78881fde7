package export

import "math"

func patchLayer() Layer {
	return Layer{
		Name:  "patches",
		Title: "Landing patches",
		Meaning: "Footprint discs that the platform's profile allows, chosen best first and never overlapping. The geometry is the plan outline of " +
			"the disc's voxels, so that the patch on a vertical face is a valid polygon too; the true patch is the disc of radius " +
			"`footprint_radius_m` around `e_m, n_m, h_m` in the plane with the given normal. Sigma columns are standard uncertainties (1 σ).",
	}
}

func patchColumns() []column[patchRow] {
	type row = patchRow
	return []column[row]{
		text("id", "unique", "stable identity: kind and place", func(r *row) string { return r.ID }),
		count("rank", "≥ 1", "place in the order of scores, 1 the best", func(r *row) int64 { return int64(r.rank) }),
		number("e_m", "m", metreDigits, "", "east of the centre, on the plane", func(r *row) float64 { return r.Centre.X }),
		number("n_m", "m", metreDigits, "", "north of the centre", func(r *row) float64 { return r.Centre.Y }),
		number("h_m", "m", metreDigits, "", "height of the centre", func(r *row) float64 { return r.Centre.Z }),
		number("normal_e", "", FullPrecision, "-1 to 1", "unit normal of the plane, pointing into the air: east part", func(r *row) float64 { return r.Plane.Normal.X }),
		number("normal_n", "", FullPrecision, "-1 to 1", "its north part", func(r *row) float64 { return r.Plane.Normal.Y }),
		number("normal_h", "", FullPrecision, "-1 to 1", "its upward part", func(r *row) float64 { return r.Plane.Normal.Z }),
		number("inclination_deg", "°", degreeDigits, "0 to 180", "inclination: 0 flat, 90 vertical, more overhanging", func(r *row) float64 { return r.InclinationDeg }),
		null("unknown", number("inclination_sigma_deg", "°", degreeDigits, "≥ 0", "its uncertainty", func(r *row) float64 { return r.InclinationSigmaDeg })),
		null(looksNowhere, number("dip_direction_deg", "°", degreeDigits, "0 to 360", "azimuth in which the patch looks", func(r *row) float64 { return dipDirection(r.Plane.Normal) })),
		number("roughness_m", "m", metreDigits, "≥ 0", "RMS distance of the raw points to the plane, with its degrees of freedom", func(r *row) float64 { return r.RoughnessM }),
		null("unknown", number("roughness_sigma_m", "m", metreDigits, "≥ 0", "its uncertainty", func(r *row) float64 { return r.RoughnessSigmaM })),
		number("step_m", "m", metreDigits, "≥ 0", "largest distance of a voxel's mean outward of the plane", func(r *row) float64 { return r.StepM }),
		null("unknown", number("step_sigma_m", "m", metreDigits, "≥ 0", "its uncertainty", func(r *row) float64 { return r.StepSigmaM })),
		number("coverage", "", ratioDigits, "0 to 1", "share of the disc's cells that hold data", func(r *row) float64 { return r.Coverage }),
		null("unknown", number("coverage_sigma", "", ratioDigits, "≥ 0", "its uncertainty", func(r *row) float64 { return r.CoverageSigma })),
		null("no obstacle on the site", number("clearance_m", "m", metreDigits, "", "distance from the centre to the nearest obstacle's ellipsoid, less the footprint's radius: negative where they may overlap", func(r *row) float64 { return r.ClearanceM })),
		null("unknown, or no obstacle on the site", number("clearance_sigma_m", "m", metreDigits, "≥ 0", "its uncertainty", func(r *row) float64 {
			if math.IsInf(r.ClearanceM, 0) {
				return math.NaN()
			}
			return r.ClearanceSigmaM
		})),
		number("score", "", ratioDigits, "0 to 1", "desirability by the profile: 1 all measures at their best, 0 one beyond its allowed limit", func(r *row) float64 { return r.Score }),
		number("confidence", "", ratioDigits, "0 to 1", "probability, from the uncertainties, that all allowed limits hold; an error common to the whole survey is not in it", func(r *row) float64 { return r.Confidence }),
		null("none does", text("limited_by", "inclination, roughness, step, coverage, clearance", "the measure that limits the score", func(r *row) string { return string(r.LimitedBy) })),
		number("footprint_radius_m", "m", metreDigits, "> 0", "radius of the disc", func(r *row) float64 { return r.radiusM }),
		null("it lies in no zone", text("zone", "an id of layer zones", "zone that holds its centre", func(r *row) string { return r.zone })),
		count("points", "≥ 3", "raw points of the plane", func(r *row) int64 { return r.Plane.Points }),
		count("voxels", "≥ 1", "occupied voxels of the disc", func(r *row) int64 { return int64(len(r.Voxels)) }),
	}
}

func zoneLayer() Layer {
	return Layer{
		Name:  "zones",
		Title: "Zones",
		Meaning: "Connected ground on which the footprint scores above 0 wherever its centre is set. The geometry is the plan outline of the zone's voxels; " +
			"the mean plane goes through `e_m, n_m, h_m` with the given normal.",
	}
}

func zoneColumns() []column[zoneRow] {
	type row = zoneRow
	return []column[row]{
		text("id", "unique", "stable identity: kind and place", func(r *row) string { return r.ID }),
		number("area_m2", "m²", metreDigits, "> 0", "surface area", func(r *row) float64 { return r.AreaM2 }),
		count("patch_count", "≥ 0", "landing patches with their centre in it", func(r *row) int64 { return int64(r.PatchCount) }),
		null("no patch lies in it", text("best_patch", "an id of layer patches", "its best patch", func(r *row) string { return r.BestPatch })),
		number("best_score", "", ratioDigits, "0 to 1", "score of its best patch, or of its best voxel where no patch lies in it", func(r *row) float64 { return r.BestScore }),
		number("mean_score", "", ratioDigits, "0 to 1", "mean score over its voxels", func(r *row) float64 { return r.MeanScore }),
		number("inclination_deg", "°", degreeDigits, "0 to 180", "inclination of its mean normal", func(r *row) float64 { return r.InclinationDeg }),
		null(looksNowhere, number("dip_direction_deg", "°", degreeDigits, "0 to 360", "azimuth of its mean normal", func(r *row) float64 { return dipDirection(r.normal) })),
		number("normal_spread_deg", "°", degreeDigits, "0 to 90", "angular dispersion of its local normals, arccos(R/N): 0 on a plane", func(r *row) float64 { return r.SpreadDeg }),
		null("one voxel, or all normals are the same", number("normal_concentration", "", FullPrecision, "> 0", "Fisher's concentration k = (N-1)/(N-R) of its N local normals of resultant length R: large on a plane", func(r *row) float64 { return r.Concentration })),
		null(looksNowhere, number("dip_direction_mean_deg", "°", degreeDigits, "0 to 360", "circular mean of its voxels' dip directions, each counting alike however steep", func(r *row) float64 { return r.DipDirectionMeanDeg })),
		null(looksNowhere, number("dip_direction_spread_deg", "°", degreeDigits, "≥ 0", "circular standard deviation of those dip directions", func(r *row) float64 { return r.DipDirectionSpreadDeg })),
		number("e_m", "m", metreDigits, "", "east of the mean of its voxels", func(r *row) float64 { return r.centre.X }),
		number("n_m", "m", metreDigits, "", "north of that mean", func(r *row) float64 { return r.centre.Y }),
		number("h_m", "m", metreDigits, "", "height of that mean", func(r *row) float64 { return r.centre.Z }),
		number("h_min_m", "m", metreDigits, "", "height of its lowest voxel mean", func(r *row) float64 { return r.hMin }),
		number("h_max_m", "m", metreDigits, "", "height of its highest voxel mean", func(r *row) float64 { return r.hMax }),
		number("normal_e", "", ratioDigits, "-1 to 1", "unit mean normal, pointing into the air: east part", func(r *row) float64 { return r.normal.X }),
		number("normal_n", "", ratioDigits, "-1 to 1", "its north part", func(r *row) float64 { return r.normal.Y }),
		number("normal_h", "", ratioDigits, "-1 to 1", "its upward part", func(r *row) float64 { return r.normal.Z }),
		count("voxels", "≥ 1", "occupied voxels", func(r *row) int64 { return int64(len(r.Voxels)) }),
	}
}
