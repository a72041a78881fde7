package worksite

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"ledgework/export"
	"ledgework/terrain"
	"ledgework/terrain/survey"
)

// ground is the surveyed surface, with where it is and what it came from.
type ground struct {
	voxels *terrain.Voxels // cleaned
	meta   export.VoxelMeta
}

// survey fills r.ground, from the voxels of an earlier run or from the surveys.
func (r *run) survey(ctx context.Context) error {
	from, err := r.voxelFile(r.opts.From)
	if err != nil {
		return err
	}
	if from != "" {
		return r.restore(ctx, from)
	}
	sources, of, err := r.sources()
	if err != nil {
		return err
	}
	var (
		frame   *survey.Frame
		headers []*terrain.Header
	)
	err = r.stages.do(ctx, "headers", 0, Bytes, func() (string, error) {
		for _, s := range sources {
			h, err := header(s)
			if err != nil {
				return "", surveyError(ctx, err)
			}
			headers = append(headers, h)
		}
		frame, err = r.plan(ctx, sources)
		if err != nil {
			return "", err
		}
		return count(len(sources), "file", "files") + ", " + frame.Name, nil
	})
	if err != nil {
		return err
	}
	r.warn(frame.Notes...)
	r.describe(frame)
	if err := r.sum(ctx, sources, of, headers, frame); err != nil {
		return err
	}
	return r.checksums(ctx, r.ground.meta.Sources)
}

// sum streams the surveys into voxels and cleans them.
func (r *run) sum(ctx context.Context, sources []survey.Source, of []*Survey, headers []*terrain.Header, frame *survey.Frame) error {
	crop, err := r.crop(frame)
	if err != nil {
		return err
	}
	opts := survey.StreamOptions{
		Workers: r.opts.Threads,
		Filter:  survey.Filter{ExcludeClasses: r.Exclude, DropWithheld: true, Crop: crop},
	}
	for _, h := range headers {
		opts.Columns |= h.Columns & (terrain.Intensity | terrain.Color | terrain.Class)
	}
	var bytes int64
	for _, h := range headers {
		bytes += h.Bytes
	}
	progress := func(done, _, _ int64) { r.opts.Progress.Set(done) }

	lattice, err := r.lattice(ctx, sources, frame, opts, bytes)
	if err != nil {
		return err
	}
	var voxels *terrain.Voxels
	var counts survey.Counts
	err = r.stages.do(ctx, "read", bytes, Bytes, func() (string, error) {
		sums := terrain.NewAccumulator(lattice, opts.Columns)
		adders := make([]*terrain.Adder, opts.Workers)
		for i := range adders {
			adders[i] = sums.NewAdder()
		}
		counts, err = survey.Stream(ctx, frame, sources, opts, func(worker int, b *terrain.Batch) error {
			return adders[worker].Add(b)
		}, progress)
		if err == nil {
			err = counts.Err()
		}
		if err != nil {
			return "", surveyError(ctx, err)
		}
		voxels = sums.Voxels()
		return fmt.Sprintf("%d points in %d voxels of %g m", counts.Kept, voxels.Len(), lattice.SpacingM()), nil
	})
	if err != nil {
		return err
	}
	for _, d := range counts.Defects {
		r.warn(defectText(d))
	}
	return r.stages.do(ctx, "clean", 0, Voxels, func() (string, error) {
		clean, dropped := terrain.Clean(voxels)
		if clean.Len() == 0 {
			return "", &SurveyError{fmt.Errorf("survey: %w: all %d voxels are isolated", terrain.ErrNoPoints, dropped.Voxels)}
		}
		r.ground.voxels = clean
		r.ground.meta.Counts = countsOf(&counts, dropped)
		r.ground.meta.Sources = r.inputs(sources, of, headers, &counts)
		return count(dropped.Voxels, "isolated voxel", "isolated voxels") + " dropped", nil
	})
}

// countsOf lists what became of the points.
func countsOf(c *survey.Counts, cleaned terrain.Cleaned) map[string]int64 {
	n := map[string]int64{
		"points_read":              c.Read,
		"points_dropped: isolated": cleaned.Points,
	}
	for _, d := range c.Dropped {
		n["points_dropped: "+d.Reason] = d.Count
	}
	for _, d := range c.Defects {
		n["defects: "+d.Reason] = d.Count
	}
	return n
}

// lattice has the spacing that is given, or one that suits the survey.
func (r *run) lattice(ctx context.Context, sources []survey.Source, frame *survey.Frame, opts survey.StreamOptions, bytes int64) (terrain.Lattice, error) {
	if g := float64(r.SpacingM); g != 0 {
		if frame.GridCell > g {
			r.warn(fmt.Sprintf("spacing_m is %g, finer than the grid's cells of %g m: most voxels will be empty", g, frame.GridCell))
		}
		return newLattice(g)
	}
	g, err := autoSpacing(ctx, &r.stages, sources, frame, opts, r.Platform.FootprintRadiusM, bytes)
	if err != nil {
		return terrain.Lattice{}, err
	}
	return newLattice(g)
}

// autoSpacing is a spacing in metres that suits a footprint and the density of
// the survey: of a grid, its cells.
func autoSpacing(ctx context.Context, s *stages, sources []survey.Source, frame *survey.Frame, opts survey.StreamOptions, footprintM float64, bytes int64) (g float64, err error) {
	if frame.GridCell > 0 {
		return clampSpacing(frame.GridCell), nil
	}
	err = s.do(ctx, "spacing", bytes, Bytes, func() (string, error) {
		median, err := survey.MedianSpacing(ctx, frame, sources, opts, func(done, _, _ int64) { s.progress.Set(done) })
		if err != nil {
			return "", surveyError(ctx, err)
		}
		g = clampSpacing(survey.AutoSpacing(footprintM, median))
		return fmt.Sprintf("%g m, points are %.3g m apart", g, median), nil
	})
	return g, err
}

// clampSpacing keeps a spacing that was found within what a lattice can have.
func clampSpacing(g float64) float64 {
	return min(max(g, terrain.MinSpacingM), terrain.MaxSpacingM)
}

// newLattice is terrain.NewLattice for a spacing that a survey led to.
func newLattice(g float64) (terrain.Lattice, error) {
	l, err := terrain.NewLattice(g)
	if err != nil {
		return l, &SurveyError{err}
	}
	return l, nil
}

// describe says where the ground is and when it was surveyed.
func (r *run) describe(frame *survey.Frame) {
	m := &r.ground.meta
	m.Site, m.CRS = r.Site, siteCRS(frame)
	for i := range r.Surveys {
		s := &r.Surveys[i]
		if s.Date != "" && !slices.Contains(m.Dates, s.Date) {
			m.Dates = append(m.Dates, s.Date)
		}
		for _, p := range s.Sensors {
			m.Sensors = append(m.Sensors, p)
		}
		m.AccuracyM = max(m.AccuracyM, s.AccuracyM)
	}
	slices.Sort(m.Dates)
	if len(m.Dates) > 1 {
		r.warn(fmt.Sprintf("surveys of %d dates were put together as if taken at one time", len(m.Dates)))
	}
	m.Conversions = strings.Join(frame.Notes, "; ")
}
