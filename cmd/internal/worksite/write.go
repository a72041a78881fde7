package worksite

import (
	"context"
	"errors"
	"io"
	"runtime"
	"syscall"
	"time"

	"ledgework/export"
	"ledgework/terrain/gdal"
)

// write puts layers, voxels and record into the folder and gives it its name.
func (r *run) write(ctx context.Context, folder *export.Folder) error {
	site := &export.Site{
		Name: r.Site, CRS: r.ground.meta.CRS, Conversions: r.ground.meta.Conversions, Dates: r.ground.meta.Dates,
		Voxels: r.ground.voxels, Findings: r.findings, Profile: r.Platform.Profile,
		InflatedByM: r.options.ClearanceM,
	}
	err := r.stages.do(ctx, "layers", 0, "", func() (string, error) {
		return export.LayerDir, r.writeLayers(folder, site)
	})
	if err != nil {
		return err
	}
	err = r.stages.do(ctx, "voxels", 0, "", func() (string, error) {
		return export.VoxelsName, folder.Write(export.VoxelsName, func(w io.Writer) error {
			return export.WriteVoxels(w, site.Voxels, r.ground.meta)
		})
	})
	if err != nil {
		return err
	}
	err = folder.Write(export.RecordName, func(w io.Writer) error {
		return export.WriteRecord(w, r.record(folder, site))
	})
	if err == nil {
		err = ctx.Err()
	}
	if err != nil {
		return err
	}
	return folder.Commit()
}

// writeLayers writes GeoJSON, or tables in local coordinates where nothing
// tells their place on Earth.
func (r *run) writeLayers(folder *export.Folder, site *export.Site) error {
	p, err := newProjector(site.CRS)
	if err != nil {
		return err
	}
	if p == nil {
		r.warn(export.ErrNoCRS.Error() + "; tables in local coordinates were written instead")
		return export.WriteLocal(folder, site)
	}
	defer p.Close()
	warnings, err := export.WriteLayers(folder, site, p, gdal.ValidWKB)
	r.warn(warnings...)
	return err
}

// record says how the run came about.
func (r *run) record(folder *export.Folder, site *export.Site) export.Record {
	res := r.result(folder.Target())
	rec := export.Record{
		Version: r.opts.Version, Command: "build",
		Started: r.started.Format(time.RFC3339), Finished: time.Now().Format(time.RFC3339),
		Outcome:  res.Outcome(),
		Site:     r.Site,
		CRS:      r.ground.meta.CRS,
		Frame:    site.Frame(),
		SpacingM: res.SpacingM,
		Inputs:   r.ground.meta.Sources,
		Parameters: parameters{
			Worksite: r.Worksite, Resolved: r.options, Checkpoints: r.heights, From: r.opts.From,
		},
		Counts:   map[string]int64{},
		Outputs:  folder.Outputs(),
		Warnings: r.warnings,
		System: export.System{
			OS: runtime.GOOS, Arch: runtime.GOARCH, Threads: r.opts.Threads,
			Go: runtime.Version(), GDAL: gdal.Version(), PeakMemoryBytes: peakMemory(),
		},
	}
	for k, n := range r.ground.meta.Counts {
		rec.Counts[k] = n
	}
	rec.Counts["points"], rec.Counts["voxels"] = res.Points, int64(res.Voxels)
	rec.Counts["obstacles"], rec.Counts["patches"], rec.Counts["zones"] = int64(res.Obstacles), int64(res.Patches), int64(res.Zones)
	for _, s := range r.stages.done {
		rec.Timings = append(rec.Timings, export.Timing{Stage: s.Name, Seconds: s.Seconds})
	}
	return rec
}

// parameters are what a run was made with: the worksite with every default
// filled in, and what auto came to.
type parameters struct {
	Worksite    *Worksite    `json:"worksite"`
	Resolved    any          `json:"obstacles_resolved"`
	Checkpoints *Checkpoints `json:"checkpoints,omitempty"`
	From        string       `json:"from,omitempty"`
}

// peakMemory is the most memory that the process has had resident, in bytes, 0
// if the system does not say.
func peakMemory() int64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0
	}
	const kib = 1024 // Linux counts in KiB
	return int64(u.Maxrss) * kib
}

// outputError says whose fault it is that a folder cannot be made: the path's,
// or the disk's.
func outputError(err error) error {
	if errors.Is(err, syscall.ENOSPC) || errors.Is(err, syscall.EDQUOT) || errors.Is(err, syscall.EIO) {
		return err
	}
	return &FolderError{Reason: err.Error()}
}
