package main

import (
	"errors"
	"os/exec"
	"path/filepath"
	"strconv"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"

	"ledgework/terrain/gdal"
)

// TestMain lets scripts, and the tests that run commands, call the real
// program as "ledgework".
func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"ledgework": main})
}

// TestScripts runs testdata/script/*.txtar. Beside the usual commands they have
//
//	exits CODE program [arg…]   run a program that must end with that code
//	layers DIR                  every layer in DIR opens in GDAL and is valid
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:   "testdata/script",
		Setup: func(env *testscript.Env) error { return writeSurveys(env.WorkDir) },
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits":  scriptExits,
			"layers": scriptLayers,
		},
	})
}

func scriptExits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits CODE program [arg…]")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	got := 0
	var exit *exec.ExitError
	if err := ts.Exec(args[1], args[2:]...); errors.As(err, &exit) {
		got = exit.ExitCode()
	} else {
		ts.Check(err)
	}
	if got != want {
		ts.Fatalf("exit code %d, want %d", got, want)
	}
}

func scriptLayers(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: layers DIR")
	}
	ts.Check(checkLayers(ts.MkAbs(args[0])))
}

// checkLayers opens every GeoJSON layer of a run and checks its geometries.
func checkLayers(dir string) error {
	paths, err := filepath.Glob(filepath.Join(dir, "layers", "*.geojson"))
	if err != nil {
		return err
	}
	if len(paths) != 4 {
		return errors.New(strconv.Itoa(len(paths)) + " layers in " + dir + ", want 4")
	}
	for _, p := range paths {
		if err := checkLayer(p); err != nil {
			return errors.New(p + ": " + err.Error())
		}
	}
	return nil
}

func checkLayer(path string) error {
	ds, err := gdal.OpenVector(path)
	if err != nil {
		return err
	}
	defer ds.Close()
	layers, err := ds.Layers()
	if err != nil {
		return err
	}
	if len(layers) != 1 {
		return errors.New("no single layer")
	}
	for f, err := range layers[0].Features() {
		if err != nil {
			return err
		}
		ok, reason, err := gdal.ValidWKB(f.WKB)
		if err == nil && !ok {
			err = errors.New(reason)
		}
		if err != nil {
			return err
		}
	}
	return nil
}
