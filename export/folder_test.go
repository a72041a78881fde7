package export

import (
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
	"testing"
)

// ls lists a folder, hidden entries too.
func ls(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	return names
}

// writeRun writes a small run folder.
func writeRun(target, text string, overwrite bool) (err error) {
	f, err := NewFolder(target, overwrite)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, f.Discard()) }()
	if err := f.Write(RecordName, func(w io.Writer) error { return WriteRecord(w, Record{Outcome: text}) }); err != nil {
		return err
	}
	if err := f.Write("layers/a.txt", func(w io.Writer) error {
		_, err := io.WriteString(w, text)
		return err
	}); err != nil {
		return err
	}
	return f.Commit()
}

func TestFolder(t *testing.T) {
	dir := t.TempDir()
	target := filepath.Join(dir, "run")
	f, err := NewFolder(target, false)
	if err != nil {
		t.Fatal(err)
	}
	if f.Target() != target {
		t.Errorf("target %s, want %s", f.Target(), target)
	}
	hello := func(w io.Writer) error { _, err := io.WriteString(w, "hello"); return err }
	for _, name := range []string{"layers/b.txt", "a.txt"} {
		if err := f.Write(name, hello); err != nil {
			t.Fatal(err)
		}
	}
	if names := ls(t, dir); len(names) != 1 || !strings.HasPrefix(names[0], ".run.partial-") {
		t.Errorf("before the commit %v, want one hidden folder", names)
	}
	sum := fmt.Sprintf("%x", sha256.Sum256([]byte("hello")))
	if got, want := f.Outputs(), []Output{{"a.txt", sum, 5}, {"layers/b.txt", sum, 5}}; !slices.Equal(got, want) {
		t.Errorf("outputs %v, want %v", got, want)
	}
	if err := f.Commit(); err != nil {
		t.Fatal(err)
	}
	if err := f.Discard(); err != nil {
		t.Errorf("discard after commit: %v", err)
	}
	if names := ls(t, dir); !slices.Equal(names, []string{"run"}) {
		t.Errorf("after the commit %v, want run", names)
	}
	if b, err := os.ReadFile(filepath.Join(target, "layers", "b.txt")); string(b) != "hello" {
		t.Errorf("read %q, %v", b, err)
	}
}

func TestFolderDiscard(t *testing.T) {
	dir := t.TempDir()
	f, err := NewFolder(filepath.Join(dir, "run"), false)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.Write("a.txt", func(io.Writer) error { return nil }); err != nil {
		t.Fatal(err)
	}
	for range 2 {
		if err := f.Discard(); err != nil {
			t.Error(err)
		}
	}
	if names := ls(t, dir); len(names) != 0 {
		t.Errorf("left %v", names)
	}
}

func TestFolderOverwrite(t *testing.T) {
	dir := t.TempDir()
	target := filepath.Join(dir, "run")
	if err := writeRun(target, "first", false); err != nil {
		t.Fatal(err)
	}
	if err := writeRun(target, "second", false); !errors.Is(err, ErrExists) || !strings.Contains(err.Error(), "--overwrite") {
		t.Errorf("error %v, want one that names --overwrite", err)
	}
	if err := writeRun(target, "third", true); err != nil {
		t.Fatal(err)
	}
	if b, _ := os.ReadFile(filepath.Join(target, "layers", "a.txt")); string(b) != "third" {
		t.Errorf("read %q, want third", b)
	}
	if names := ls(t, dir); !slices.Equal(names, []string{"run"}) {
		t.Errorf("left %v, want run alone", names)
	}
}

// What ledgework did not make is never deleted.
func TestFolderLeavesOthersAlone(t *testing.T) {
	tests := []struct {
		name  string
		make  func(target string) error
		files map[string]string
		want  string // empty: may be overwritten
	}{
		{"empty", nil, map[string]string{}, ""},
		{"photos", nil, map[string]string{"a.jpg": "x"}, "not a run of ledgework"},
		{"run.json of another program", nil, map[string]string{RecordName: `{"program":"other"}`}, "not one of ledgework"},
		{"broken run.json", nil, map[string]string{RecordName: `{"program":"ledge`}, "left alone"},
		{"file", func(target string) error { return os.WriteFile(target, nil, 0o666) }, nil, "not a folder"},
		{"link", func(target string) error { return os.Symlink(filepath.Dir(target), target) }, nil, "not a folder"},
	}
	for _, tt := range tests {
		target := filepath.Join(t.TempDir(), "run")
		if tt.make != nil {
			if err := tt.make(target); err != nil {
				t.Fatal(err)
			}
		} else if err := os.Mkdir(target, 0o777); err != nil {
			t.Fatal(err)
		}
		for name, text := range tt.files {
			if err := os.WriteFile(filepath.Join(target, name), []byte(text), 0o666); err != nil {
				t.Fatal(err)
			}
		}
		err := writeRun(target, "new", true)
		if tt.want == "" {
			if err != nil {
				t.Errorf("%s: %v", tt.name, err)
			}
			continue
		}
		if !errors.Is(err, ErrExists) || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want %q in it", tt.name, err, tt.want)
		}
		for name, text := range tt.files {
			if b, err := os.ReadFile(filepath.Join(target, name)); string(b) != text {
				t.Errorf("%s: %s is now %q, %v", tt.name, name, b, err)
			}
		}
	}
}

// A target that appears while the run goes on is not replaced.
func TestFolderRace(t *testing.T) {
	target := filepath.Join(t.TempDir(), "run")
	f, err := NewFolder(target, false)
	if err != nil {
		t.Fatal(err)
	}
	if err := writeRun(target, "other", false); err != nil {
		t.Fatal(err)
	}
	if err := f.Commit(); !errors.Is(err, ErrExists) {
		t.Errorf("error %v, want ErrExists", err)
	}
	if err := f.Discard(); err != nil {
		t.Error(err)
	}
	if b, _ := os.ReadFile(filepath.Join(target, "layers", "a.txt")); string(b) != "other" {
		t.Errorf("read %q, want other", b)
	}
}

func TestFolderErrors(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "file")
	if err := os.WriteFile(file, nil, 0o666); err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct{ target, want string }{
		{filepath.Join(dir, "no", "run"), "does not exist"},
		{filepath.Join(file, "run"), "not a directory"},
	} {
		if _, err := NewFolder(tt.target, false); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want %q in it", tt.target, err, tt.want)
		}
	}
	locked := filepath.Join(dir, "locked")
	if err := os.Mkdir(locked, 0o555); err != nil {
		t.Fatal(err)
	}
	if os.Getuid() != 0 { // root may write anywhere
		if _, err := NewFolder(filepath.Join(locked, "run"), false); !errors.Is(err, os.ErrPermission) {
			t.Errorf("error %v, want one of permission", err)
		}
	}
	f, err := NewFolder(filepath.Join(dir, "run"), false)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Discard()
	full := &os.PathError{Op: "write", Path: "a.txt", Err: syscall.ENOSPC}
	err = f.Write("a.txt", func(io.Writer) error { return full })
	if !errors.Is(err, syscall.ENOSPC) || !strings.Contains(err.Error(), "disk full while writing "+f.Target()) {
		t.Errorf("error %v, want disk full", err)
	}
	if got := f.Outputs(); len(got) != 0 {
		t.Errorf("outputs %v, want none", got)
	}
	if err := f.Write("../a.txt", func(io.Writer) error { return nil }); err == nil {
		t.Error("wrote beside the folder")
	}
	ok := func(io.Writer) error { return nil }
	if err := errors.Join(f.Write("b.txt", ok), f.Write("b.txt", ok)); !errors.Is(err, os.ErrExist) {
		t.Errorf("error %v, want that the file exists", err)
	}
}

// A folder that cannot take its place leaves the old one there.
func TestFolderRollsBack(t *testing.T) {
	dir := t.TempDir()
	target := filepath.Join(dir, "run")
	if err := writeRun(target, "old", false); err != nil {
		t.Fatal(err)
	}
	if _, err := replace(target, filepath.Join(dir, "missing")); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("error %v, want that the new folder is missing", err)
	}
	if b, _ := os.ReadFile(filepath.Join(target, "layers", "a.txt")); string(b) != "old" {
		t.Errorf("read %q, want old", b)
	}
	if names := ls(t, dir); !slices.Equal(names, []string{"run"}) {
		t.Errorf("left %v, want run alone", names)
	}
}
