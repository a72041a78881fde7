package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// command is the real program, to be run in dir.
func command(t *testing.T, dir string, args ...string) *exec.Cmd {
	t.Helper()
	cmd := exec.CommandContext(t.Context(), "ledgework", args...)
	cmd.Dir = dir
	return cmd
}

// finish runs cmd to its end and returns its exit code and what it wrote.
func finish(t *testing.T, cmd *exec.Cmd) (code int, stdout, stderr string) {
	t.Helper()
	var out, errs bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &errs
	err := cmd.Run()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		t.Fatal(err)
	}
	return cmd.ProcessState.ExitCode(), out.String(), errs.String()
}

// TestInterrupt stops a demo in each of its parts. It must end within a second
// with code 130 and leave nothing behind.
func TestInterrupt(t *testing.T) {
	const (
		promised = time.Second
		// Tests of other packages have the processors at the same time.
		slack = 500 * time.Millisecond
	)
	for _, signal := range []os.Signal{os.Interrupt, syscall.SIGTERM} {
		for _, stage := range []string{
			"survey/2025-04-09/station-2.las", // while it scans
			"survey/2026-04-15/station-5.las", // while it reads, soon
			"run/.at",                         // while it fits
		} {
			t.Run(fmt.Sprintf("%v %s", signal, filepath.Base(stage)), func(t *testing.T) {
				dir := t.TempDir()
				cmd := command(t, dir, "demo", "-o", "d")
				var errs bytes.Buffer
				cmd.Stderr = &errs
				if err := cmd.Start(); err != nil {
					t.Fatal(err)
				}
				waitFor(t, dir, stage)
				start := time.Now()
				if err := cmd.Process.Signal(signal); err != nil {
					t.Fatal(err)
				}
				_ = cmd.Wait()
				if took := time.Since(start); took > promised+slack {
					t.Errorf("stopped after %v, want %v", took, promised)
				}
				if code := cmd.ProcessState.ExitCode(); code != exitInterrupted {
					t.Errorf("exit code %d, want %d", code, exitInterrupted)
				}
				if got := strings.TrimSpace(errs.String()); got != "ledgework: interrupted" {
					t.Errorf("stderr %q", got)
				}
				left, err := os.ReadDir(dir)
				if err != nil {
					t.Fatal(err)
				}
				for _, e := range left {
					t.Errorf("%s is left behind", e.Name())
				}
			})
		}
	}
}

// waitFor waits until the demo that is being made in dir has the named file;
// "run/.at" stands for the run's folder, a second after it appeared.
func waitFor(t *testing.T, dir, name string) {
	t.Helper()
	ctx, cancel := context.WithTimeout(t.Context(), 2*time.Minute)
	defer cancel()
	pattern, extra := filepath.Join(dir, ".d.partial-*", name), time.Duration(0)
	if name == "run/.at" {
		pattern, extra = filepath.Join(dir, ".d.partial-*", ".run.partial-*"), 3*time.Second
	}
	for {
		if found, _ := filepath.Glob(pattern); len(found) > 0 {
			time.Sleep(extra)
			return
		}
		select {
		case <-ctx.Done():
			t.Fatalf("%s never appeared", pattern)
		case <-time.After(10 * time.Millisecond):
		}
	}
}

// TestDeterminism builds the same points twice: with one processor and with
// two, in one file and in two, which come in either order.
func TestDeterminism(t *testing.T) {
	dir := t.TempDir()
	if err := writeSurveys(dir); err != nil {
		t.Fatal(err)
	}
	builds := []struct{ files, processors string }{
		{"[part1.las, part2.las]", "1"},
		{"[part2.las, part1.las]", "2"},
		{"[wall.las]", "2"},
	}
	for i, b := range builds {
		name := fmt.Sprintf("w%d.yaml", i)
		text := "site: wall\nspacing_m: 0.1\nsurveys:\n"
		// One survey for each file, so that their order is the worksite's.
		for _, f := range strings.Split(strings.Trim(b.files, "[]"), ", ") {
			text += "  - files: [" + f + "]\n"
		}
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		cmd := command(t, dir, "build", name, "-o", fmt.Sprint("run", i))
		cmd.Env = append(os.Environ(), "GOMAXPROCS="+b.processors)
		if code, _, stderr := finish(t, cmd); code != exitDone {
			t.Fatalf("exit code %d: %s", code, stderr)
		}
	}
	layers, err := filepath.Glob(filepath.Join(dir, "run0", "layers", "*"))
	if err != nil || len(layers) == 0 {
		t.Fatalf("%d layers, error %v", len(layers), err)
	}
	for _, l := range layers {
		want, err := os.ReadFile(l)
		if err != nil {
			t.Fatal(err)
		}
		for i := range builds[1:] {
			other := filepath.Join(dir, fmt.Sprint("run", i+1), "layers", filepath.Base(l))
			got, err := os.ReadFile(other)
			if err != nil {
				t.Fatal(err)
			}
			if !bytes.Equal(got, want) {
				t.Errorf("%s differs with files %s and %s processors", filepath.Base(l), builds[i+1].files, builds[i+1].processors)
			}
		}
	}
}

// TestFullDisk builds into a file system of 64 KiB.
func TestFullDisk(t *testing.T) {
	dir := t.TempDir()
	if err := writeSurveys(dir); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, "w.yaml"), []byte("surveys: [{files: [wall.las]}]\nspacing_m: 0.1\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Mkdir(filepath.Join(dir, "small"), 0o755); err != nil {
		t.Fatal(err)
	}
	// A file system of its own, which needs no privilege in a user namespace.
	const script = `mount -t tmpfs -o size=64k tmpfs small || exit 99
ledgework build w.yaml -o small/run -q; code=$?
ls -A small; exit $code`
	if _, err := exec.LookPath("unshare"); err != nil {
		t.Skip("no unshare, so no file system of a known size")
	}
	cmd := exec.CommandContext(t.Context(), "unshare", "--map-root-user", "--mount", "sh", "-c", script)
	cmd.Dir = dir
	code, stdout, stderr := finish(t, cmd)
	if code == 99 || strings.Contains(stderr, "unshare") {
		t.Skipf("no file system of a known size: %s", stderr)
	}
	if code != exitFailure || !strings.Contains(stderr, "disk full while writing") || strings.Count(stderr, "\n") != 1 {
		t.Errorf("exit code %d: %s", code, stderr)
	}
	if stdout != "" {
		t.Errorf("left behind: %s", stdout)
	}
}
