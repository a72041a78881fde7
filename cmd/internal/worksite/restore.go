package worksite

import (
	"context"
	"fmt"
	"os"
	"path/filepath"

	"ledgework/export"
	"ledgework/terrain"
)

// voxelFile is the path of the voxels that stand in for the surveys: those of
// the given run or file, or else those that the worksite names. It is empty
// when the surveys themselves are to be read.
func (w *Worksite) voxelFile(from string) (string, error) {
	complain := func(reason string) error {
		return &FolderError{Reason: "--from " + reason, Remedy: "give a run folder or its " + export.VoxelsName}
	}
	path := from
	if from == "" {
		if w.Voxels == "" {
			return "", nil
		}
		path = w.Resolve(w.Voxels)
		complain = func(reason string) error {
			return w.at("$.voxels", reason, "give a run folder or its "+export.VoxelsName)
		}
	}
	info, err := os.Stat(path)
	if err == nil && info.IsDir() {
		path = filepath.Join(path, export.VoxelsName)
		_, err = os.Stat(path)
	}
	if err != nil {
		return "", complain(fmt.Sprintf("%q: %s", path, reason(err)))
	}
	return path, nil
}

// restore takes the ground from the voxels of an earlier run.
func (r *run) restore(ctx context.Context, path string) error {
	return r.stages.do(ctx, "read voxels", 0, Voxels, func() (string, error) {
		v, meta, err := readVoxels(path)
		if err != nil {
			return "", surveyError(ctx, fmt.Errorf("%s: %w", path, err))
		}
		if r.Site == "" {
			r.Site = meta.Site
		}
		if g := float64(r.SpacingM); g != 0 && g != v.Lattice.SpacingM() {
			r.warn(fmt.Sprintf("spacing_m %g has no effect: the earlier run's voxels have %g m", g, v.Lattice.SpacingM()))
		}
		if r.Crop != nil {
			r.warn("crop has no effect on an earlier run's voxels")
		}
		r.ground = ground{voxels: v, meta: meta}
		return fmt.Sprintf("%d voxels of %g m", v.Len(), v.Lattice.SpacingM()), nil
	})
}

func readVoxels(path string) (*terrain.Voxels, export.VoxelMeta, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, export.VoxelMeta{}, err
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, export.VoxelMeta{}, err
	}
	v, meta, err := export.ReadVoxels(f, info.Size())
	if err == nil && v.Len() == 0 {
		err = terrain.ErrNoPoints
	}
	return v, meta, err
}
