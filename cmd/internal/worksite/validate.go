package worksite

import (
	"fmt"
	"strings"
	"time"

	"github.com/goccy/go-yaml"

	"ledgework/terrain"
)

// validate checks what the types do not.
func (w *Worksite) validate() error {
	if len(w.Surveys) == 0 && w.Voxels == "" {
		return w.at("$", "no surveys are given", "add surveys, each with its files")
	}
	if w.CRS == "" {
		return w.at("$.crs", "the working CRS is empty", "write auto, EPSG:n, WKT or PROJJSON")
	}
	if g := float64(w.SpacingM); g != 0 && !(g >= terrain.MinSpacingM && g <= terrain.MaxSpacingM) {
		return w.at("$.spacing_m", fmt.Sprintf("%g m is outside %g to %g m", g, terrain.MinSpacingM, terrain.MaxSpacingM), "write auto to have it chosen")
	}
	for i := range w.Surveys {
		if err := w.validateSurvey(i); err != nil {
			return err
		}
	}
	for i, name := range w.Outputs {
		if name != outputGeoJSON {
			return w.at(fmt.Sprintf("$.outputs[%d]", i), fmt.Sprintf("output %q is not written yet", name), "only geojson is")
		}
	}
	if err := w.validateObstacles(); err != nil {
		return err
	}
	if err := w.Platform.Validate(); err != nil {
		what := strings.TrimPrefix(err.Error(), "hazards: ")
		key, _, _ := strings.Cut(what, " ")
		return w.at("$.platform."+key, what, "")
	}
	return nil
}

func (w *Worksite) validateSurvey(i int) error {
	s := &w.Surveys[i]
	at := fmt.Sprintf("$.surveys[%d]", i)
	if s.Date != "" {
		if _, err := time.Parse(time.DateOnly, s.Date); err != nil {
			return w.at(at+".date", fmt.Sprintf("%q is not a date", s.Date), "write it as 2026-05-14")
		}
	}
	if len(s.Files) == 0 {
		return w.at(at, "the survey has no files", "add files, relative to the worksite file")
	}
	for j, name := range s.Files {
		if strings.TrimSpace(name) == "" {
			return w.at(fmt.Sprintf("%s.files[%d]", at, j), "a file name is empty", "")
		}
	}
	const roughest = 1000 // m; far beyond any survey method, so a wrong unit
	if !(s.AccuracyM >= 0 && s.AccuracyM <= roughest) {
		return w.at(at+".accuracy_m", fmt.Sprintf("%g m is no accuracy", s.AccuracyM), "write one standard deviation of a point, in metres")
	}
	if !(s.CheckpointSigmaM >= 0 && s.CheckpointSigmaM <= roughest) {
		return w.at(at+".checkpoint_sigma_m", fmt.Sprintf("%g m is no accuracy", s.CheckpointSigmaM), "write one standard deviation of a checkpoint's height, in metres")
	}
	if s.Band < 0 {
		return w.at(at+".band", fmt.Sprintf("there is no band %d", s.Band), "bands count from 1")
	}
	return nil
}

func (w *Worksite) validateObstacles() error {
	o := w.Obstacles
	for _, c := range []struct {
		key    string
		value  float64
		lo, hi float64
	}{
		{"bulge_height_m", o.BulgeHeightM, 0.001, 1e4},
		{"overhang_depth_m", o.OverhangDepthM, 0.001, 1e4},
		{"overhang_tolerance_deg", o.OverhangToleranceDeg, 0.001, 89},
		{"recess_depth_m", o.RecessDepthM, 0.001, 1e4},
		{"min_area_m2", o.MinAreaM2, 1e-6, 1e8},
	} {
		if !(c.value >= c.lo && c.value <= c.hi) {
			return w.at("$.obstacles."+c.key, fmt.Sprintf("%g is outside %g to %g", c.value, c.lo, c.hi), "'ledgework init' shows the defaults")
		}
	}
	return nil
}

// at is an Error at the value that a YAML path names, or at what is nearest
// above it when the file leaves it to its default.
func (w *Worksite) at(path, reason, remedy string) *Error {
	e := &Error{File: w.path, Reason: reason, Remedy: remedy}
	for w.tree != nil && strings.HasPrefix(path, "$") {
		if p, err := yaml.PathString(path); err == nil {
			if n, err := p.FilterFile(w.tree); err == nil && n != nil {
				at := errorAt(n, reason, remedy)
				at.File = w.path
				return at
			}
		}
		path = path[:max(0, strings.LastIndexAny(path, ".["))]
	}
	return e
}
