package worksite

import (
	"context"
	"fmt"
	"runtime"
	"time"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/export"
	"ledgework/fit"
	"ledgework/hazards"
)

// RunOptions say how a worksite is built. Out must be set.
type RunOptions struct {
	Out       string // run folder to write
	Overwrite bool   // replace Out if it is an earlier run
	From      string // run folder or voxels.parquet that stands in for the surveys
	Threads   int    // the default is runtime.GOMAXPROCS(0)
	Version   string // of the program, for the record

	Progress Progress     // the default tells nobody
	OnFolder func(func()) // told what removes the unfinished folder, then nil
}

// A Result says what a run came to.
type Result struct {
	Run       string  `json:"run"` // the folder
	SpacingM  float64 `json:"spacing_m"`
	Points    int64   `json:"points"` // raw points in the voxels
	Voxels    int     `json:"voxels"`
	Obstacles int     `json:"obstacles"`
	Patches   int     `json:"patches"`
	Zones     int     `json:"zones"`
	Reason    string  `json:"reason,omitempty"` // why nothing qualifies, if nothing does

	// Checkpoints compares the survey's heights with the worksite's
	// checkpoints; nil without any.
	Checkpoints *Checkpoints `json:"checkpoints,omitempty"`

	Warnings []string `json:"warnings"`
	Stages   []Stage  `json:"stages"`
	Caution  string   `json:"caution"`
	Exit     int      `json:"exit"`
}

// A run is one build on its way.
type run struct {
	*Worksite
	opts     RunOptions
	started  time.Time
	stages   stages
	warnings []string
	ground   ground
	options  hazards.ObstacleOptions // resolved
	findings hazards.Findings
	heights  *Checkpoints
}

// Run builds the worksite: from survey files, or the voxels of an earlier run,
// to a folder of layers, which is complete or not there at all. A run in which
// nothing qualifies is complete too; its Result has a Reason.
//
// Errors are *Error, *SurveyError, *FolderError, ctx's, or others for what is
// nobody's fault but the disk's or the program's.
func (w *Worksite) Run(ctx context.Context, o RunOptions) (*Result, error) {
	if o.Threads <= 0 {
		o.Threads = runtime.GOMAXPROCS(0)
	}
	if o.Progress == nil {
		o.Progress = silent{}
	}
	if o.OnFolder == nil {
		o.OnFolder = func(func()) {}
	}
	r := &run{Worksite: w, opts: o, started: time.Now(), stages: stages{progress: o.Progress}}

	// The folder comes first, so that an hour's work is not lost to a bad path.
	folder, err := export.NewFolder(o.Out, o.Overwrite)
	if err != nil {
		return nil, outputError(err)
	}
	o.OnFolder(func() { _ = folder.Discard() })
	defer func() {
		o.OnFolder(nil)
		_ = folder.Discard() // what cannot be removed can only be left
	}()

	if err := r.survey(ctx); err != nil {
		return nil, err
	}
	if err := r.judge(ctx); err != nil {
		return nil, err
	}
	if err := r.write(ctx, folder); err != nil {
		return nil, err
	}
	return r.result(folder.Target()), nil
}

// judge finds obstacles, patches and zones on the ground. It is the one place
// that calls on fits and judgements.
func (r *run) judge(ctx context.Context) error {
	v := r.ground.voxels
	work := fit.Work{Workers: r.opts.Threads, Progress: func(done, total int) {
		r.opts.Progress.Set(int64(float64(done) / float64(total) * float64(v.Len())))
	}}
	var notes []string
	r.options, notes = r.Obstacles.options(max(0, r.Platform.ClearanceM.Allowed)).Resolve(v.Lattice.SpacingM())
	r.warn(notes...)
	var sensors []r3.Vec
	for _, p := range r.ground.meta.Sensors {
		sensors = append(sensors, r3.Vec{X: p[0], Y: p[1], Z: p[2]})
	}

	var (
		surface *hazards.Surface
		err     error
	)
	err = r.stages.do(ctx, "local planes", int64(v.Len()), Voxels, func() (string, error) {
		surface, err = hazards.NewSurface(ctx, v, sensors, r.options, work)
		if err != nil {
			return "", err
		}
		if g := surface.GuessedShare; g > tellGuessFrom {
			r.warn(fmt.Sprintf("which side is air is a guess on %.0f %% of the surface: give the scanner positions as sensors", 100*g))
		}
		return fmt.Sprintf("radius %g m", r.options.SurfaceRadiusM), nil
	})
	if err != nil {
		return err
	}
	err = r.stages.do(ctx, "reference faces", int64(v.Len()), Voxels, func() (string, error) {
		return fmt.Sprintf("radius %g m", r.options.ReferenceRadiusM), surface.MeasureRelief(ctx)
	})
	if err != nil {
		return err
	}
	err = r.stages.do(ctx, "obstacles", 0, Voxels, func() (string, error) {
		r.findings.Obstacles, err = hazards.FindObstacles(ctx, surface)
		surface.Relief = nil // nobody else asks for it, and the next stage needs room
		return count(len(r.findings.Obstacles), "obstacle", "obstacles"), err
	})
	if err != nil {
		return err
	}
	if err := r.check(ctx, surface); err != nil {
		return err
	}
	var planes *fit.LocalPlanes
	err = r.stages.do(ctx, "footprint planes", int64(v.Len()), Voxels, func() (string, error) {
		planes, err = surface.PlanesAt(ctx, r.Platform.FootprintRadiusM)
		surface.Planes = nil // as for Relief
		return fmt.Sprintf("radius %g m", r.Platform.FootprintRadiusM), err
	})
	if err != nil {
		return err
	}
	return r.stages.do(ctx, "patches", int64(v.Len()), Voxels, func() (string, error) {
		f := &r.findings
		f.Patches, f.Zones, err = hazards.FindPatches(ctx, surface, planes, f.Obstacles, &r.Platform.Profile, work)
		return count(len(f.Patches), "patch", "patches") + " in " + count(len(f.Zones), "zone", "zones"), err
	})
}

// tellGuessFrom is the share of the surface whose air side may be a guess
// before the user hears of it: below it, it is stray crumbs.
const tellGuessFrom = 0.02

// warn adds warnings for the user and the record.
func (r *run) warn(warnings ...string) { r.warnings = append(r.warnings, warnings...) }

// result sums the run up.
func (r *run) result(folder string) *Result {
	f := &r.findings
	res := &Result{
		Run:      folder,
		SpacingM: r.ground.voxels.Lattice.SpacingM(),
		Points:   r.ground.voxels.Points(), Voxels: r.ground.voxels.Len(),
		Obstacles: len(f.Obstacles), Patches: len(f.Patches), Zones: len(f.Zones),
		Checkpoints: r.heights,
		Warnings:    append([]string{}, r.warnings...),
		Stages:      r.stages.done,
		Caution:     export.Caution,
	}
	if len(f.Patches) == 0 {
		res.Reason = r.whyNothing()
	}
	return res
}

// Outcome is what came out of the run, in one line.
func (r *Result) Outcome() string {
	s := count(r.Obstacles, "obstacle", "obstacles") + ", " + count(r.Patches, "patch", "patches") + ", " + count(r.Zones, "zone", "zones")
	if r.Reason != "" {
		s += ": " + r.Reason
	}
	return s
}

// whyNothing says what keeps every footprint from qualifying.
func (r *run) whyNothing() string {
	p, g := &r.Platform, r.ground.voxels.Lattice.SpacingM()
	if g > p.FootprintRadiusM {
		return fmt.Sprintf("the survey is too coarse: voxels of %g m under a footprint of radius %g m (profile %s)", g, p.FootprintRadiusM, p.Name)
	}
	return fmt.Sprintf("no footprint of radius %g m meets every limit of profile %s", p.FootprintRadiusM, p.Name)
}

// count is a number with its noun.
func count(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}
