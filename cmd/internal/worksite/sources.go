package worksite

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"strings"

	"ledgework/terrain"
	"ledgework/terrain/survey"
)

// sources are the files of all surveys, in the order of the worksite, and the
// survey that each belongs to.
func (w *Worksite) sources() (all []survey.Source, of []*Survey, err error) {
	seen := make(map[string]bool)
	for i := range w.Surveys {
		s := &w.Surveys[i]
		at := fmt.Sprintf("$.surveys[%d].files", i)
		paths, err := survey.Expand(filepath.Dir(w.path), s.Files)
		if err != nil {
			return nil, nil, w.at(at, strings.TrimPrefix(err.Error(), "survey: "), "")
		}
		for _, p := range paths {
			if seen[p] {
				return nil, nil, w.at(at, fmt.Sprintf("%q belongs to two surveys", p), "name it in one")
			}
			seen[p] = true
			all = append(all, survey.Source{Path: p, CRS: s.CRS, Tolerant: s.TolerateDefects, Band: s.Band})
			of = append(of, s)
		}
	}
	return all, of, nil
}

// plan chooses the working CRS of the sources.
func (w *Worksite) plan(ctx context.Context, sources []survey.Source) (*survey.Frame, error) {
	if err := w.checkCRS(); err != nil {
		return nil, err
	}
	frame, err := survey.Plan(ctx, sources, w.CRS)
	return frame, surveyError(ctx, err)
}

// crop is the area that is read, nil for all.
func (w *Worksite) crop(frame *survey.Frame) (*survey.Crop, error) {
	if w.Crop == nil {
		return nil, nil
	}
	var (
		c   *survey.Crop
		err error
	)
	if w.Crop.File != "" {
		c, err = survey.CropFile(w.Resolve(w.Crop.File), frame)
	} else {
		c, err = survey.CropBox(w.Crop.Box)
	}
	if err != nil {
		return nil, w.at("$.crop", err.Error(), "")
	}
	return c, nil
}

// surveyError says that err comes from a survey, unless ctx has ended.
func surveyError(ctx context.Context, err error) error {
	switch {
	case err == nil:
		return nil
	case ctx.Err() != nil:
		return ctx.Err()
	}
	var file *Error
	if errors.As(err, &file) {
		return err
	}
	return &SurveyError{Err: err}
}

// A Checked is what the headers of a worksite's surveys say.
type Checked struct {
	Worksite *Worksite     `json:"worksite"`
	Files    []CheckedFile `json:"files"`
	CRS      string        `json:"crs,omitempty"` // authority code of the working CRS, or its name
	Points   int64         `json:"points"`
	Notes    []string      `json:"notes"` // on all files, each under the name of its file
}

// A CheckedFile is what one file's header says.
type CheckedFile struct {
	Path   string `json:"path"`
	Format string `json:"format"`
	Points int64  `json:"points"` // -1 if the header does not say
}

// Check opens every file of the worksite, chooses the working CRS and reads the
// crop, without processing points.
func (w *Worksite) Check(ctx context.Context) (*Checked, error) {
	c := &Checked{Worksite: w, Files: []CheckedFile{}, Notes: []string{}}
	if w.Voxels != "" {
		c.Notes = append(c.Notes, "the surveys are not read: voxels names an earlier run")
		_, err := w.voxelFile("")
		return c, err
	}
	sources, _, err := w.sources()
	if err != nil {
		return nil, err
	}
	for _, s := range sources {
		h, err := header(s)
		if err != nil {
			return nil, surveyError(ctx, err)
		}
		c.Files = append(c.Files, CheckedFile{Path: s.Path, Format: h.Format, Points: h.Points})
		if err := ctx.Err(); err != nil {
			return nil, err
		}
	}
	frame, err := w.plan(ctx, sources)
	if err != nil {
		return nil, err
	}
	if _, err := w.crop(frame); err != nil {
		return nil, err
	}
	c.CRS, c.Points = frame.AuthorityCode, frame.Points
	if c.CRS == "" {
		c.CRS = frame.Name
	}
	c.Notes = append(c.Notes, frame.Notes...)
	return c, nil
}

// header is what one source says of itself.
func header(s survey.Source) (*terrain.Header, error) {
	r, err := survey.Open(s.Path, survey.Options{CRS: s.CRS, Tolerant: s.Tolerant, Band: s.Band})
	if err != nil {
		return nil, err
	}
	return r.Header(), r.Close()
}
