package worksite_test

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"ledgework/terrain"
	"ledgework/terrain/demo"
	"ledgework/terrain/las"
)

// A scan as it comes from one day's work: 20 million points on a face of 100 by
// 60 m, eight in a voxel of 5 cm.
const (
	scanPoints    = 20_000_000
	scanSpacingM  = 0.05
	maxResidentMB = 1500 // what a build of it may take of a laptop
)

// From 20 million points to the finished folder, by the program itself, so that
// its memory is that of its own process. What each stage took is logged. It
// fails when the program needs more than maxResidentMB. It is left out with
// -short.
func BenchmarkBuild(b *testing.B) {
	if testing.Short() {
		b.Skip("20 million points take a minute: run without -short")
	}
	dir := b.TempDir()
	program := filepath.Join(dir, "ledgework")
	if out, err := exec.Command("go", "build", "-o", program, "ledgework/cmd/ledgework").CombinedOutput(); err != nil {
		b.Fatalf("%v\n%s", err, out)
	}
	writeScan(b, filepath.Join(dir, "scan.las"))
	yaml := fmt.Sprintf("site: face\ncrs: EPSG:32633\nspacing_m: %g\nsurveys:\n  - files: [scan.las]\n    crs: EPSG:32633\n", scanSpacingM)
	if err := os.WriteFile(filepath.Join(dir, "worksite.yaml"), []byte(yaml), 0o600); err != nil {
		b.Fatal(err)
	}
	var resident float64
	for b.Loop() {
		cmd := exec.Command(program, "build", "--json", "--quiet", "--overwrite", filepath.Join(dir, "worksite.yaml"))
		var stderr strings.Builder
		cmd.Stderr = &stderr
		out, err := cmd.Output()
		// Exit code 4 says that nothing qualifies, which is no matter here.
		if code := cmd.ProcessState.ExitCode(); code != 0 && code != 4 {
			b.Fatalf("%v\n%s", err, stderr.String())
		}
		resident = max(resident, residentMB(b, cmd.ProcessState))
		logStages(b, out)
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/scanPoints, "ns/point")
	b.ReportMetric(resident, "MB-resident")
	if resident > maxResidentMB {
		b.Errorf("%.0f MB resident, want %d at most", resident, maxResidentMB)
	}
}

// residentMB is the most memory that an ended process had resident.
func residentMB(b *testing.B, p *os.ProcessState) float64 {
	b.Helper()
	usage, ok := p.SysUsage().(*syscall.Rusage)
	if !ok {
		b.Fatal("the system does not tell a process's memory")
	}
	return float64(usage.Maxrss) * 1024 / 1e6 // Linux counts in KiB
}

// logStages logs what the stages of a build took, from its JSON.
func logStages(b *testing.B, out []byte) {
	b.Helper()
	var result struct {
		Points, Voxels, Obstacles, Patches int
		Stages                             []struct {
			Stage   string
			Seconds float64
			Note    string
		}
	}
	if err := json.Unmarshal(out, &result); err != nil {
		b.Fatalf("%v\n%s", err, out)
	}
	if result.Points < scanPoints*999/1000 {
		b.Errorf("%d points of %d", result.Points, scanPoints)
	}
	table := fmt.Sprintf("%d points, %d voxels, %d obstacles, %d patches\n", result.Points, result.Voxels, result.Obstacles, result.Patches)
	for _, s := range result.Stages {
		table += fmt.Sprintf("%-16s %7.2f s  %s\n", s.Stage, s.Seconds, s.Note)
	}
	b.Log(table)
}

// writeScan writes the points as LAS.
func writeScan(b *testing.B, path string) {
	b.Helper()
	face, err := demo.NewFace(demo.FaceOptions{
		Points: scanPoints, WidthM: 100, HeightM: 60, InclinationDeg: 70, RoughM: 0.3, NoiseM: 0.01, Seed: 1,
	})
	if err != nil {
		b.Fatal(err)
	}
	out, err := os.Create(path)
	if err != nil {
		b.Fatal(err)
	}
	defer out.Close()
	w, err := las.NewWriter(out, las.WriterOptions{PointFormat: 6, Offset: [3]float64{412000, 6543000, 0}})
	if err != nil {
		b.Fatal(err)
	}
	batch := terrain.NewBatch(terrain.BatchPoints, terrain.Intensity|terrain.Class)
	for {
		err := face.Read(batch)
		if err == io.EOF {
			break
		}
		if err == nil {
			err = w.Write(batch)
		}
		if err != nil {
			b.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		b.Fatal(err)
	}
}
