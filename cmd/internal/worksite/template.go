package worksite

import (
	"bytes"
	"fmt"
	"math"
	"strconv"
	"strings"
	"text/template"
)

// Text is a worksite file to start from, with every key and every default in
// sight and a comment on each. What it takes from w are the site, CRS, spacing,
// crop, surveys and the name of the profile; the rest is what Default says.
func (w *Worksite) Text() ([]byte, error) {
	t, err := template.New("worksite").Funcs(template.FuncMap{
		"quote":    strconv.Quote,
		"number":   number,
		"length":   AutoLength.String,
		"list":     list,
		"profiles": exampleNames,
	}).Parse(fileTemplate)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	if err := t.Execute(&b, w); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// number writes v with at least two digits after a decimal point that it has.
func number(v float64) string {
	s := strconv.FormatFloat(v, 'f', -1, 64)
	if i := strings.IndexByte(s, '.'); i >= 0 && len(s)-i == 2 {
		s += "0"
	}
	return s
}

// list writes values as a YAML flow sequence.
func list(values any) string {
	switch v := values.(type) {
	case []string:
		quoted := make([]string, len(v))
		for i, s := range v {
			quoted[i] = strconv.Quote(s)
		}
		return "[" + strings.Join(quoted, ", ") + "]"
	case Classes:
		return v.String()
	case [4]float64:
		return fmt.Sprintf("[%.2f, %.2f, %.2f, %.2f]", v[0], v[1], v[2], v[3])
	case []Point:
		parts := make([]string, len(v))
		for i, p := range v {
			parts[i] = fmt.Sprintf("[%.3f, %.3f, %.3f]", p[0], p[1], p[2])
		}
		return "[" + strings.Join(parts, ", ") + "]"
	}
	panic(fmt.Sprintf("worksite: list of %T", values))
}

// BoxAround is a crop box in whole metres, or centimetres where the survey is
// small, that encloses the given east and north bounds.
func BoxAround(minE, minN, maxE, maxN float64) *Crop {
	const small = 20 // m
	perMetre := 1.0
	if max(maxE-minE, maxN-minN) < small {
		perMetre = 100
	}
	down := func(x float64) float64 { return math.Floor(x*perMetre) / perMetre }
	up := func(x float64) float64 { return (math.Floor(x*perMetre) + 1) / perMetre } // never a box of no width
	return &Crop{Box: [4]float64{down(minE), down(minN), up(maxE), up(maxN)}}
}

const fileTemplate = `# A ledgework worksite. Check it with 'ledgework check', build it with 'ledgework build'.
# Every key is optional but surveys. Lengths are metres, angles degrees.
# Results are a screening aid: a competent person on site, local codes and licensed
# practice decide. No value here is a safety limit.

site: {{quote .Site}}
crs: {{if eq .CRS "auto"}}auto{{else}}{{quote .CRS}}{{end}}   # working CRS, projected and metric: auto, EPSG:n, WKT or PROJJSON
spacing_m: {{length .SpacingM}}   # voxel edge; auto suits the footprint and the density of the survey
{{- if .Crop}}
crop: {{if .Crop.File}}{{quote .Crop.File}}{{else}}{{list .Crop.Box}}{{end}}   # Emin, Nmin, Emax, Nmax in the working CRS, or a polygon file; nothing outside is read
{{- else}}
# crop: [Emin, Nmin, Emax, Nmax]   # or a polygon file; nothing outside is read
{{- end}}
surveys:
{{- range .Surveys}}
  - {{if .Date}}date: {{.Date}}   # of the survey, year-month-day{{else}}# date: 2026-05-14   # of the survey, year-month-day{{end}}
    files: {{list .Files}}   # relative to this file; folders and globs too
    {{if .CRS}}crs: {{quote .CRS}}{{else}}# crs: EPSG:n{{end}}   # only when the files carry none
    {{if .Sensors}}sensors: {{list .Sensors}}{{else}}# sensors: [[E, N, H]]{{end}}   # scanner positions in the working CRS, when known
    {{if .AccuracyM}}accuracy_m: {{number .AccuracyM}}{{else}}# accuracy_m: 0.01{{end}}   # 1 sigma of a point, when known: checkpoints are held against it
    {{if .Band}}band: {{.Band}}{{else}}# band: 1{{end}}   # elevation band of a grid; found by itself where it can be
    {{if .Checkpoints}}checkpoints: {{list .Checkpoints}}{{else}}# checkpoints: [[E, N, H]]{{end}}   # surveyed positions that the heights are compared with
    {{if .CheckpointSigmaM}}checkpoint_sigma_m: {{number .CheckpointSigmaM}}{{else}}# checkpoint_sigma_m: 0.01{{end}}   # 1 sigma of their heights, when known
    tolerate_defects: {{.TolerateDefects}}   # true passes over damaged points and a cut-off end, and counts them
{{- end}}
exclude_classes: {{list .Exclude}}   # LAS classes left out; 7 and 18 are noise
platform: { profile: {{.Platform.Name}} }   # {{profiles}}: examples, not safety limits
{{with .Platform -}}
# Any limit may be put into platform, or all of them without a profile. The example's are:
#   footprint_radius_m: {{number .FootprintRadiusM}}   # radius of the disc that is set down
#   inclination_deg: { allowed_min: {{number .InclinationDeg.AllowedMin}}, best_min: {{number .InclinationDeg.BestMin}}, best_max: {{number .InclinationDeg.BestMax}}, allowed_max: {{number .InclinationDeg.AllowedMax}} }   # 0 flat, 90 vertical, more overhangs
#   roughness_m: { best: {{number .RoughnessM.Best}}, allowed: {{number .RoughnessM.Allowed}} }   # RMS distance from the plane
#   step_m: { best: {{number .StepM.Best}}, allowed: {{number .StepM.Allowed}} }   # largest distance out of the plane
#   clearance_m: { best: {{number .ClearanceM.Best}}, allowed: {{number .ClearanceM.Allowed}} }   # to the nearest obstacle
#   coverage: { best: {{number .Coverage.Best}}, allowed: {{number .Coverage.Allowed}} }   # share of the footprint that the survey saw
#   weights: { inclination: {{number .Weights.Inclination}}, roughness: {{number .Weights.Roughness}}, step: {{number .Weights.Step}}, clearance: {{number .Weights.Clearance}}, coverage: {{number .Weights.Coverage}} }
{{end -}}
{{with .Obstacles -}}
obstacles: { bulge_height_m: {{number .BulgeHeightM}}, overhang_depth_m: {{number .OverhangDepthM}}, recess_depth_m: {{number .RecessDepthM}}, min_area_m2: {{number .MinAreaM2}} }
# May be put into obstacles too; these are the defaults:
#   overhang_tolerance_deg: {{number .OverhangToleranceDeg}}   # beyond vertical before it counts as overhanging
#   reference_radius_m: {{length .ReferenceRadiusM}}   # of the reference face that relief is measured from
#   surface_radius_m: {{length .SurfaceRadiusM}}   # of the planes that overhangs are found on
{{end -}}
outputs: {{range $i, $o := .Outputs}}{{if $i}}, {{else}}[{{end}}{{$o}}{{end}}]   # layers to write: geojson
# voxels: run/voxels.parquet   # start from an earlier run's voxels instead of the surveys
`
