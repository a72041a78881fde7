package export

import (
	"bufio"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
)

// ErrExists says that a run folder's place is taken.
var ErrExists = errors.New("already exists")

// A Folder is a run folder in the making: a hidden folder beside its target,
// which takes the target's name at the end or vanishes. It is used by one
// goroutine at a time.
type Folder struct {
	target    string
	temp      string // empty after Commit or Discard
	overwrite bool
	outputs   []Output
}

// NewFolder begins a run folder that will be named target. An existing target
// is an error that wraps ErrExists, unless overwrite is set and the target is
// a run folder of this program or an empty folder. The parent must exist.
func NewFolder(target string, overwrite bool) (*Folder, error) {
	target, err := filepath.Abs(target)
	if err != nil {
		return nil, fmt.Errorf("export: run folder: %w", err)
	}
	if err := checkTarget(target, overwrite); err != nil {
		return nil, err
	}
	parent := filepath.Dir(target)
	switch info, err := os.Stat(parent); {
	case errors.Is(err, fs.ErrNotExist):
		return nil, fmt.Errorf("export: cannot make run folder %s: %s does not exist; make it first", target, parent)
	case err != nil:
		return nil, fmt.Errorf("export: cannot make run folder %s: %w", target, err)
	case !info.IsDir():
		return nil, fmt.Errorf("export: cannot make run folder %s: %s is not a folder", target, parent)
	}
	// Not os.MkdirTemp, whose mode 0700 would hide the results from others.
	temp := filepath.Join(parent, fmt.Sprintf(".%s.partial-%08x", filepath.Base(target), rand.Uint32()))
	if err := os.Mkdir(temp, 0o777); err != nil {
		return nil, fmt.Errorf("export: cannot make run folder %s: %w", target, full(err, parent))
	}
	return &Folder{target: target, temp: temp, overwrite: overwrite}, nil
}

// checkTarget says whether a run folder may take the name target.
func checkTarget(target string, overwrite bool) error {
	info, err := os.Lstat(target)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil
	case err != nil:
		return fmt.Errorf("export: run folder: %w", err)
	case !overwrite:
		return fmt.Errorf("export: run folder %s %w; choose another with -o, or pass --overwrite", target, ErrExists)
	case !info.IsDir():
		return fmt.Errorf("export: %s %w and is not a folder; it is left alone", target, ErrExists)
	}
	entries, err := os.ReadDir(target)
	if err != nil {
		return fmt.Errorf("export: run folder: %w", err)
	}
	if len(entries) == 0 {
		return nil
	}
	f, err := os.Open(filepath.Join(target, RecordName))
	if err != nil {
		return fmt.Errorf("export: %s %w and holds no %s, so it is not a run of %s; it is left alone", target, ErrExists, RecordName, Program)
	}
	defer f.Close()
	if _, err := ReadRecord(f); err != nil {
		return fmt.Errorf("export: %s %w and its record is not one of %s, so it is left alone: %w", target, ErrExists, Program, err)
	}
	return nil
}

// Target is the path that the folder will have.
func (f *Folder) Target() string { return f.target }

// Outputs are the files written so far, in order of their names.
func (f *Folder) Outputs() []Output {
	out := slices.Clone(f.outputs)
	slices.SortFunc(out, func(a, b Output) int { return strings.Compare(a.File, b.File) })
	return out
}

// Write makes the file of that name, which may hold slashes, writes it with
// the function and brings it to the disk. Folders are made as needed.
func (f *Folder) Write(name string, write func(io.Writer) error) error {
	if f.temp == "" {
		panic("export: write to a finished folder")
	}
	if !filepath.IsLocal(name) {
		return fmt.Errorf("export: %q is no place in a run folder", name)
	}
	path := filepath.Join(f.temp, filepath.FromSlash(name))
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		return fmt.Errorf("%s: %w", name, full(err, f.target))
	}
	file, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return fmt.Errorf("%s: %w", name, full(err, f.target))
	}
	sum := sha256.New()
	buffered := bufio.NewWriterSize(io.MultiWriter(file, sum), 1<<18)
	err = write(buffered)
	if err == nil {
		err = buffered.Flush()
	}
	if err == nil {
		err = file.Sync()
	}
	info, statErr := file.Stat()
	if err = errors.Join(err, statErr, file.Close()); err != nil {
		return errors.Join(fmt.Errorf("%s: %w", name, full(err, f.target)), os.Remove(path))
	}
	f.outputs = append(f.outputs, Output{File: name, SHA256: hex.EncodeToString(sum.Sum(nil)), Bytes: info.Size()})
	return nil
}

// Commit gives the folder its name. With overwrite, what stood there is moved
// aside first, comes back if the renaming fails, and is deleted at the end.
// After an error the folder is still to be discarded.
func (f *Folder) Commit() error {
	if f.temp == "" {
		panic("export: commit of a finished folder")
	}
	if err := syncDirs(f.temp); err != nil {
		return fmt.Errorf("export: run folder %s: %w", f.target, full(err, f.target))
	}
	// The place may have been taken, or become something else, meanwhile.
	if err := checkTarget(f.target, f.overwrite); err != nil {
		return err
	}
	old, err := replace(f.target, f.temp)
	if err != nil {
		return fmt.Errorf("export: run folder %s: %w", f.target, err)
	}
	f.temp = ""
	if err := syncDir(filepath.Dir(f.target)); err != nil {
		return fmt.Errorf("export: run folder %s: %w", f.target, err)
	}
	if old != "" {
		if err := os.RemoveAll(old); err != nil {
			return fmt.Errorf("export: run folder %s is complete, but the old one remains as %s: %w", f.target, old, err)
		}
	}
	return nil
}

// replace gives the folder temp the name target. What stood there has the name
// old afterwards, or its own again after an error.
func replace(target, temp string) (old string, err error) {
	if _, err := os.Lstat(target); err == nil {
		old = temp + ".old"
		if err := os.Rename(target, old); err != nil {
			return "", fmt.Errorf("cannot move the old one aside: %w", err)
		}
	}
	err = os.Rename(temp, target)
	if err != nil && old != "" {
		if back := os.Rename(old, target); back != nil {
			return "", fmt.Errorf("%w; the old one is now %s: %w", err, old, back)
		}
	}
	return old, err
}

// Discard deletes the unfinished folder. After Commit it does nothing, so that
// it can be deferred.
func (f *Folder) Discard() error {
	if f.temp == "" {
		return nil
	}
	temp := f.temp
	f.temp = ""
	if err := os.RemoveAll(temp); err != nil {
		return fmt.Errorf("export: unfinished run folder: %w", err)
	}
	return nil
}

// full says "disk full" where that is the reason.
func full(err error, where string) error {
	if errors.Is(err, syscall.ENOSPC) || errors.Is(err, syscall.EDQUOT) {
		return fmt.Errorf("disk full while writing %s; free some space or choose another place with -o: %w", where, err)
	}
	return err
}

// syncDirs brings the entries of a folder and of those in it to the disk.
func syncDirs(root string) error {
	return filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil || !d.IsDir() {
			return err
		}
		return syncDir(path)
	})
}

// syncDir brings the entries of a folder to the disk. File systems that cannot
// do that say EINVAL or ENOTSUP, which is no failure of ours.
func syncDir(path string) error {
	d, err := os.Open(path)
	if err != nil {
		return err
	}
	err = d.Sync()
	if errors.Is(err, syscall.EINVAL) || errors.Is(err, syscall.ENOTSUP) {
		err = nil
	}
	return errors.Join(err, d.Close())
}
