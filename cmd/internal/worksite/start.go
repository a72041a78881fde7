package worksite

import (
	"context"
	"errors"
	"path/filepath"

	"ledgework/terrain"
	"ledgework/terrain/survey"
)

// StartOptions say how Start looks at survey files.
type StartOptions struct {
	CRS      string // of files that carry none
	Tolerant bool   // pass over damage
	Band     int    // elevation band of grids, 0 is automatic
	Threads  int    // the default is runtime.GOMAXPROCS(0)
	Progress Progress
}

// Start makes a worksite for survey files, folders or globs, with the CRS,
// spacing and extent that it finds in them. File names in it are relative to
// dir. The notes say what was assumed.
func Start(ctx context.Context, dir string, files []string, o StartOptions) (w *Worksite, notes []string, err error) {
	if o.Progress == nil {
		o.Progress = silent{}
	}
	w = Default()
	s := Survey{CRS: o.CRS, TolerateDefects: o.Tolerant, Band: o.Band}
	for _, f := range files {
		s.Files = append(s.Files, relativeTo(dir, f))
	}
	w.Surveys = []Survey{s}
	w.path = filepath.Join(dir, "worksite.yaml") // what file names are relative to
	sources, _, err := w.sources()
	if err != nil {
		var e *Error
		if errors.As(err, &e) {
			return nil, nil, &FolderError{Reason: e.Reason, Remedy: e.Remedy}
		}
		return nil, nil, err
	}
	w.Site = filepath.Base(filepath.Dir(absolute(sources[0].Path)))
	frame, err := w.plan(ctx, sources)
	if err != nil {
		return nil, nil, err
	}
	w.CRS = auto
	if frame.AuthorityCode != "" {
		w.CRS = frame.AuthorityCode
	}
	notes = frame.Notes

	opts := survey.StreamOptions{Workers: o.Threads, Filter: survey.Filter{ExcludeClasses: w.Exclude, DropWithheld: true}}
	stages := stages{progress: o.Progress}
	progress := func(done, _, _ int64) { o.Progress.Set(done) }
	bytes, err := size(sources)
	if err != nil {
		return nil, nil, surveyError(ctx, err)
	}
	err = stages.do(ctx, "extent", bytes, Bytes, func() (string, error) {
		counts, err := survey.Stream(ctx, frame, sources, opts, func(int, *terrain.Batch) error { return nil }, progress)
		if err == nil {
			err = counts.Err()
		}
		if err != nil {
			return "", surveyError(ctx, err)
		}
		e := counts.Extent
		w.Crop = BoxAround(e.Min[0], e.Min[1], e.Max[0], e.Max[1])
		for _, d := range counts.Defects {
			notes = append(notes, defectText(d))
		}
		return "", nil
	})
	if err != nil {
		return nil, nil, err
	}
	g, err := autoSpacing(ctx, &stages, sources, frame, opts, w.Platform.FootprintRadiusM, bytes)
	if err != nil {
		return nil, nil, err
	}
	w.SpacingM = AutoLength(g)
	return w, notes, nil
}

// size is the number of bytes in all sources.
func size(sources []survey.Source) (int64, error) {
	var bytes int64
	for _, s := range sources {
		h, err := header(s)
		if err != nil {
			return 0, err
		}
		bytes += h.Bytes
	}
	return bytes, nil
}

// relativeTo names a file as seen from dir, or absolutely where dir does not
// lead to it. Both are relative to the current folder unless absolute.
func relativeTo(dir, file string) string {
	if filepath.IsAbs(file) != filepath.IsAbs(dir) {
		dir, file = absolute(dir), absolute(file)
	}
	rel, err := filepath.Rel(dir, file)
	if err != nil {
		return absolute(file)
	}
	return filepath.ToSlash(rel)
}

// absolute is filepath.Abs, or the path itself if there is no current folder.
func absolute(path string) string {
	if abs, err := filepath.Abs(path); err == nil {
		return abs
	}
	return path
}
