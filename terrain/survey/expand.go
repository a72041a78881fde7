package survey

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"

	"ledgework/terrain/xyz"
)

// Expand turns the patterns of a worksite file into paths of survey files,
// sorted and each once. A pattern is a file, a folder or a glob in the syntax
// of filepath.Match, relative to base (the working directory if empty) unless
// absolute. A folder stands for every file below it that looks like a survey by
// its name, hidden folders and files excepted; text files must also look like
// points. Files that only accompany a survey (.prj, .tfw, .aux.xml and the like) are left out of
// folders and globs.
//
// A pattern that yields nothing is an error that names it.
func Expand(base string, patterns []string) ([]string, error) {
	base = cmp.Or(base, ".")
	var all []string
	for _, pattern := range patterns {
		found, err := expandOne(base, pattern)
		if err != nil {
			return nil, err
		}
		all = append(all, found...)
	}
	slices.Sort(all)
	return slices.Compact(all), nil
}

func expandOne(base, pattern string) ([]string, error) {
	if strings.TrimSpace(pattern) == "" {
		return nil, errors.New("survey: an empty file name; name a file, a folder or a pattern such as scan/*.las")
	}
	full, glob := filepath.Clean(pattern), filepath.Clean(pattern)
	if !filepath.IsAbs(full) {
		glob = filepath.Join(quoteMeta(base), full)
		full = filepath.Join(base, full)
	}
	info, err := os.Stat(full)
	switch {
	case err == nil && !info.IsDir():
		return []string{full}, nil
	case err == nil:
		found, err := surveysBelow(full)
		if err != nil {
			return nil, fmt.Errorf("survey: folder %q: %w", pattern, err)
		}
		if len(found) == 0 {
			return nil, fmt.Errorf("survey: folder %q holds no survey file; name the files themselves if their names are unusual", pattern)
		}
		return found, nil
	case !errors.Is(err, fs.ErrNotExist):
		return nil, fmt.Errorf("survey: %q: %w", pattern, err)
	case !strings.ContainsAny(pattern, "*?["):
		return nil, fmt.Errorf("survey: %q: %w; names are relative to %s", pattern, fs.ErrNotExist, base)
	}

	matches, err := filepath.Glob(glob)
	if err != nil {
		return nil, fmt.Errorf("survey: pattern %q: %w", pattern, err)
	}
	found := matches[:0]
	dots := strings.HasPrefix(filepath.Base(pattern), ".")
	for _, m := range matches {
		if strings.HasPrefix(filepath.Base(m), ".") && !dots {
			continue // hidden, as a shell has it
		}
		if info, err := os.Stat(m); err == nil && !info.IsDir() && !sidecar(m) {
			found = append(found, m)
		}
	}
	if len(found) == 0 {
		return nil, fmt.Errorf("survey: pattern %q matches no file in %s", pattern, base)
	}
	return found, nil
}

// quoteMeta makes a folder's own name match itself in a glob. Windows has no
// way to say so.
func quoteMeta(dir string) string {
	if runtime.GOOS == "windows" {
		return dir
	}
	return strings.NewReplacer(`\`, `\\`, `*`, `\*`, `?`, `\?`, `[`, `\[`).Replace(dir)
}

// surveysBelow lists the survey files below dir.
func surveysBelow(dir string) ([]string, error) {
	// WalkDir does not enter a symbolic link, unless it ends like a folder.
	root := strings.TrimSuffix(dir, string(filepath.Separator)) + string(filepath.Separator)
	var found []string
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		hidden := strings.HasPrefix(d.Name(), ".") && path != root
		switch {
		case d.IsDir() && hidden:
			return fs.SkipDir
		case d.IsDir() || hidden || sidecar(path):
		case surveyName(path):
			found = append(found, path)
		}
		return nil
	})
	return found, err
}

// sidecar reports whether a file only accompanies a survey.
func sidecar(path string) bool {
	name := strings.ToLower(filepath.Base(path))
	switch filepath.Ext(name) {
	case ".prj", ".tfw", ".tifw", ".wld", ".jgw", ".aux", ".ovr", ".msk", ".lax", ".hdr", ".md", ".qpj", ".cpg", ".sha256", ".md5":
		return true
	case ".xml":
		return true // .aux.xml, .tif.xml and catalogue records; a VRT is named .vrt
	}
	return false
}

// surveyName reports whether a file found in a folder is taken for a survey:
// by its extension, and a text file by its first bytes too, since a folder may
// hold notes.
func surveyName(path string) bool {
	switch strings.ToLower(filepath.Ext(path)) {
	case ".las", ".laz", ".ply", ".e57", ".pcd",
		".tif", ".tiff", ".asc", ".vrt", ".dem", ".img", ".hgt", ".bil", ".flt", ".dt0", ".dt1", ".dt2", ".grd", ".nc", ".jp2", ".sdat":
		return true
	case ".xyz", ".pts", ".csv", ".txt":
		head, err := readHead(path)
		return err == nil && xyz.Looks(head)
	}
	return false
}
