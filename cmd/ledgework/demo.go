package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"ledgework/cmd/internal/worksite"
	"ledgework/terrain"
	"ledgework/terrain/demo"
	"ledgework/terrain/las"
)

// DemoOptions are the flags of demo.
type DemoOptions struct {
	Out       string
	Overwrite bool
	Points    int
}

// AddFlags declares the flags.
func (o *DemoOptions) AddFlags(f *pflag.FlagSet) {
	f.StringVarP(&o.Out, "output", "o", "demo", "folder to write")
	f.BoolVar(&o.Overwrite, "overwrite", false, "replace the folder if it is an earlier demo")
	f.IntVar(&o.Points, "points", demo.DefaultPoints, "points in a season's survey, about")
}

func newDemoCommand(g *globals, term *terminal) *cobra.Command {
	var opts DemoOptions
	cmd := &cobra.Command{
		Use:   "demo",
		Short: "Make an invented site, survey it and build it",
		Long: `Demo invents a sea cliff above a branch railway, scans it in two seasons, writes the
surveys, a worksite and the truth, and builds the first season. Nothing of it exists.

It writes worksite.yaml, survey/, truth.json and run/.`,
		Example: `  ledgework demo
  ledgework demo -o /tmp/gull-head`,
		Args: cobra.NoArgs,
		RunE: func(cmd *cobra.Command, _ []string) error {
			return runDemo(cmd.Context(), g, opts, term)
		},
	}
	opts.AddFlags(cmd.Flags())
	return cmd
}

// demoSeed makes every demo the same.
const demoSeed = 1

func runDemo(ctx context.Context, g *globals, opts DemoOptions, term *terminal) error {
	if opts.Points < 1 {
		return usageError{fmt.Errorf("--points %d: at least one is needed", opts.Points)}
	}
	if err := checkDemoTarget(opts.Out, opts.Overwrite); err != nil {
		return usageError{err}
	}
	// Everything is made beside the target, which appears complete or not at all.
	temp, err := os.MkdirTemp(filepath.Dir(filepath.Clean(opts.Out)), "."+filepath.Base(opts.Out)+".partial-")
	if err != nil {
		return usageError{fmt.Errorf("cannot make the folder %s: %w", opts.Out, cause(err))}
	}
	remove := func() { _ = os.RemoveAll(temp) }
	term.onAbandon(remove)
	defer func() {
		term.onAbandon(nil)
		remove()
	}()
	if err := os.Chmod(temp, 0o755); err != nil {
		return err
	}

	progress, closeProgress := newProgress(g, term)
	result, err := makeDemo(ctx, g, opts, temp, progress)
	closeProgress()
	if err != nil {
		return err
	}
	if err := replace(temp, opts.Out); err != nil {
		return err
	}
	result.Run = filepath.Join(opts.Out, "run")
	if err := printResult(g, term, result); err != nil {
		return err
	}
	return nothing(result)
}

// makeDemo writes the demo into dir and builds it.
func makeDemo(ctx context.Context, g *globals, opts DemoOptions, dir string, progress worksite.Progress) (*worksite.Result, error) {
	site := demo.NewSite(demoSeed)
	scan := demo.ScanOptions{Points: opts.Points}
	for n := 1; n <= demo.Seasons; n++ {
		if err := scanSeason(ctx, site.Season(n), scan, seasonFolder(dir, site.Season(n)), g.Threads, progress); err != nil {
			return nil, err
		}
	}
	season := site.Season(1)
	truth := map[string]any{}
	for n := 1; n <= demo.Seasons; n++ {
		truth[fmt.Sprintf("season_%d", n)] = site.Season(n).Truth()
	}
	f, err := os.Create(filepath.Join(dir, "truth.json"))
	if err != nil {
		return nil, err
	}
	if err := errors.Join(writeJSON(f, truth), f.Close()); err != nil {
		return nil, err
	}
	w := worksite.Default()
	w.Site, w.CRS = site.Name(), site.CRS()
	if opts.Points >= demo.DefaultPoints {
		w.SpacingM = 0.05 // finer than auto, which suits thinner surveys
	}
	s := worksite.Survey{Date: season.Date(), Files: []string{"survey/" + season.Date() + "/*.las"}, AccuracyM: season.Truth().NoiseSigmaM}
	for _, p := range season.Stations() {
		s.Sensors = append(s.Sensors, worksite.Point{p.X, p.Y, p.Z})
	}
	w.Surveys = []worksite.Survey{s}
	text, err := w.Text()
	if err != nil {
		return nil, err
	}
	path := filepath.Join(dir, "worksite.yaml")
	if err := writeFile(path, text); err != nil {
		return nil, err
	}
	if w, err = worksite.Load(path); err != nil {
		return nil, err
	}
	return w.Run(ctx, worksite.RunOptions{
		Out: filepath.Join(dir, "run"), Threads: g.Threads, Version: buildVersion().String(), Progress: progress,
	})
}

func seasonFolder(dir string, s *demo.Season) string {
	return filepath.Join(dir, "survey", s.Date())
}

// scanSeason writes one LAS file for each station.
func scanSeason(ctx context.Context, s *demo.Season, o demo.ScanOptions, dir string, threads int, progress worksite.Progress) error {
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return err
	}
	date, err := time.Parse(time.DateOnly, s.Date())
	if err != nil {
		return err
	}
	stations := s.Stations()
	if progress != nil {
		progress.Begin("survey "+s.Date(), int64(o.Points), worksite.Points)
		defer progress.End()
	}
	var written int64
	for i, at := range stations {
		f, err := os.Create(filepath.Join(dir, fmt.Sprintf("station-%d.las", i+1)))
		if err != nil {
			return err
		}
		w, err := las.NewWriter(f, las.WriterOptions{
			PointFormat: 7,
			Scale:       [3]float64{demoScaleM, demoScaleM, demoScaleM},
			Offset:      [3]float64{float64(int(at.X)), float64(int(at.Y)), 0},
			WKT:         demoWKT,
			Producer:    "ledgework demo",
			Date:        date,
		})
		if err == nil {
			err = s.ScanStation(ctx, i, o, threads, func(b *terrain.Batch) error {
				written += int64(b.Len())
				if progress != nil {
					progress.Set(written)
				}
				return w.Write(b)
			})
		}
		if err == nil {
			err = w.Close()
		}
		if err := errors.Join(err, f.Close()); err != nil {
			return err
		}
	}
	return nil
}

// demoScaleM is the step of the demo's stored coordinates: 0.1 mm, so that
// rounding adds nothing to the noise.
const demoScaleM = 0.0001

// demoWKT is the demo's CRS as LAS 1.4 wants it: WKT of OGC 01-009. The form of
// EPSG:32633, which lends an invented place its coordinates.
const demoWKT = `PROJCS["WGS 84 / UTM zone 33N",GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563,AUTHORITY["EPSG","7030"]],AUTHORITY["EPSG","6326"]],PRIMEM["Greenwich",0,AUTHORITY["EPSG","8901"]],UNIT["degree",0.0174532925199433,AUTHORITY["EPSG","9122"]],AUTHORITY["EPSG","4326"]],PROJECTION["Transverse_Mercator"],PARAMETER["latitude_of_origin",0],PARAMETER["central_meridian",15],PARAMETER["scale_factor",0.9996],PARAMETER["false_easting",500000],PARAMETER["false_northing",0],UNIT["metre",1,AUTHORITY["EPSG","9001"]],AXIS["Easting",EAST],AXIS["Northing",NORTH],AUTHORITY["EPSG","32633"]]`

// checkDemoTarget says whether a demo may take the place of dir.
func checkDemoTarget(dir string, overwrite bool) error {
	entries, err := os.ReadDir(dir)
	switch {
	case errors.Is(err, fs.ErrNotExist), err == nil && len(entries) == 0:
		return nil
	case err != nil:
		return fmt.Errorf("%s: %w; choose another folder with -o", dir, cause(err))
	case !overwrite:
		return fmt.Errorf("%s already exists; choose another folder with -o, or pass --overwrite", dir)
	}
	for _, name := range []string{"worksite.yaml", "truth.json", "survey", "run"} {
		if _, err := os.Lstat(filepath.Join(dir, name)); err != nil {
			return fmt.Errorf("%s already exists and is no demo: it has no %s; it is left alone", dir, name)
		}
	}
	return nil
}

// replace gives the folder temp the name dir. What stood there goes only once
// the new one is in place.
func replace(temp, dir string) error {
	old := temp + ".old"
	switch err := os.Rename(dir, old); {
	case errors.Is(err, fs.ErrNotExist):
		return os.Rename(temp, dir)
	case err != nil:
		return err
	}
	if err := os.Rename(temp, dir); err != nil {
		return errors.Join(err, os.Rename(old, dir))
	}
	return os.RemoveAll(old)
}
