package worksite

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"
)

func TestParse(t *testing.T) {
	w, err := Parse("job/worksite.yaml", []byte(`
site: Gull Head
crs: EPSG:32633
spacing_m: 0.05
crop: [1, 2, 3, 4.5]
surveys:
  - date: 2026-05-14
    files: ["scan/*.las", more]
    crs: EPSG:4326
    sensors: [[1, 2, 3], [4, 5, 6.5]]
    accuracy_m: 0.01
    band: 2
    tolerate_defects: true
    checkpoints: [[7, 8, 9]]
    checkpoint_sigma_m: 0.02
exclude_classes: [7]
platform: { profile: ledge, roughness_m: { allowed: 0.05 } }
obstacles: { bulge_height_m: 0.5, reference_radius_m: 4, surface_radius_m: auto }
outputs: [geojson]
`))
	if err != nil {
		t.Fatal(err)
	}
	s := w.Surveys[0]
	for _, c := range []struct {
		what      string
		got, want any
	}{
		{"site", w.Site, "Gull Head"},
		{"crs", w.CRS, "EPSG:32633"},
		{"spacing", w.SpacingM, AutoLength(0.05)},
		{"crop", w.Crop.Box, [4]float64{1, 2, 3, 4.5}},
		{"date", s.Date, "2026-05-14"},
		{"second file", s.Files[1], "more"},
		{"survey crs", s.CRS, "EPSG:4326"},
		{"second sensor", s.Sensors[1], Point{4, 5, 6.5}},
		{"accuracy", s.AccuracyM, 0.01},
		{"band", s.Band, 2},
		{"tolerate", s.TolerateDefects, true},
		{"checkpoint", s.Checkpoints[0], Point{7, 8, 9}},
		{"checkpoint sigma", s.CheckpointSigmaM, 0.02},
		{"classes", len(w.Exclude), 1},
		{"profile", w.Platform.Name, "ledge"},
		{"limit given", w.Platform.RoughnessM.Allowed, 0.05},
		{"limit beside it", w.Platform.RoughnessM.Best, 0.02},
		{"limit left alone", w.Platform.FootprintRadiusM, 0.40},
		{"threshold given", w.Obstacles.BulgeHeightM, 0.5},
		{"threshold left alone", w.Obstacles.RecessDepthM, 0.40},
		{"reference radius", w.Obstacles.ReferenceRadiusM, AutoLength(4)},
		{"relative path", w.Resolve("scan"), filepath.FromSlash("job/scan")},
		{"absolute path", w.Resolve("/scan"), "/scan"},
	} {
		if c.got != c.want {
			t.Errorf("%s: got %v, want %v", c.what, c.got, c.want)
		}
	}
}

func TestParseDefaults(t *testing.T) {
	w, err := Parse("w.yaml", []byte("surveys: [{files: [a.las]}]\n"))
	if err != nil {
		t.Fatal(err)
	}
	if w.CRS != "auto" || w.SpacingM != 0 || w.Crop != nil || w.Platform.Name != "suspended" ||
		len(w.Exclude) != 2 || w.Obstacles.BulgeHeightM != 0.30 || w.Obstacles.ReferenceRadiusM != 0 {
		t.Errorf("got %+v", w)
	}
}

func TestParseErrors(t *testing.T) {
	const surveys = "surveys: [{files: [a.las]}]\n"
	for _, c := range []struct {
		name, src string
		want      string // the whole error, or its start if it ends in …
	}{
		{"empty", "", "w.yaml: the file is empty; 'ledgework init' writes a worksite for a survey"},
		{"only a comment", "# hello\n", "w.yaml: the file is empty; …"},
		{"no surveys", "site: a\n", "w.yaml:1:1: no surveys are given; …"},
		{"no files", "surveys:\n  - date: 2026-01-02\n", "w.yaml:2:5: the survey has no files; …"},
		{"unknown key", surveys + "spacing: 0.1\n", `w.yaml:2:1: unknown key "spacing"; did you mean "spacing_m"?`},
		{"unknown key with a slip", surveys + "exclude_clases: [1]\n", `w.yaml:2:1: unknown key "exclude_clases"; did you mean "exclude_classes"?`},
		{"unknown key, nothing near", surveys + "colour_scheme: dark\n", `w.yaml:2:1: unknown key "colour_scheme"; 'ledgework init' writes a file with every key`},
		{"unknown key in a survey", "surveys:\n  - files: [a]\n    sensor: [[1,2,3]]\n", `w.yaml:3:5: unknown key "sensor"; did you mean "sensors"?`},
		{"unknown key in a limit", surveys + "platform: {profile: ledge, step_m: {allowd: 1}}\n", `w.yaml:2:37: unknown key "allowd"; did you mean "allowed"?`},
		{"unknown obstacle key", surveys + "obstacles:\n  bulge_height: 1\n", `w.yaml:3:3: unknown key "bulge_height"; did you mean "bulge_height_m"?`},
		{"key twice", surveys + "site: a\nsite: b\n", `w.yaml:3:1: mapping key "site" already defined at [2:1]; …`},
		{"open bracket", "surveys: [\n", "w.yaml:1:10: sequence end token ']' not found; …"},
		{"two documents", surveys + "---\nsite: a\n", "w.yaml:3:1: a second document begins; …"},
		{"a list", "- a\n", "w.yaml:1:1: sequence was used where a block of keys is expected; …"},
		{"text for a number", surveys + "obstacles: {min_area_m2: big}\n", `w.yaml:2:26: "big" is not a number`},
		{"text for a list", "surveys: a.las\n", "w.yaml:1:10: string was used where sequence is expected; …"},
		{"class out of range", surveys + "exclude_classes: [300]\n", "w.yaml:2:19: 300 is out of range"},
		{"spacing in words", surveys + "spacing_m: fine\n", `w.yaml:2:12: "fine" is neither auto nor a positive number; …`},
		{"spacing zero", surveys + "spacing_m: 0\n", `w.yaml:2:12: "0" is neither auto nor a positive number; …`},
		{"spacing NaN", surveys + "spacing_m: .nan\n", `w.yaml:2:12: ".nan" is neither auto nor a positive number; …`},
		{"spacing too small", surveys + "spacing_m: 0.0001\n", "w.yaml:2:12: 0.0001 m is outside 0.005 to 5000 m; write auto to have it chosen"},
		{"crop of three", surveys + "crop: [1, 2, 3]\n", `w.yaml:2:7: "[1, 2, 3]" is not a list of 4 numbers; …`},
		{"crop turned round", surveys + "crop: [3, 2, 1, 4]\n", "w.yaml:2:7: the box is empty: its minima are not below its maxima; …"},
		{"crop infinite", surveys + "crop: [3, 2, .inf, 4]\n", `w.yaml:2:7: "[3, 2, .inf, 4]" is not finite; …`},
		{"sensor in the plane", "surveys: [{files: [a], sensors: [[1, 2]]}]\n", `w.yaml:1:34: "[1, 2]" is not a list of 3 numbers; write [E, N, H] …`},
		{"not a date", "surveys: [{files: [a], date: 14.5.2026}]\n", `w.yaml:1:30: "14.5.2026" is not a date; write it as 2026-05-14`},
		{"negative accuracy", "surveys: [{files: [a], accuracy_m: -1}]\n", "w.yaml:1:36: -1 m is no accuracy; …"},
		{"checkpoints of no accuracy", "surveys: [{files: [a], checkpoint_sigma_m: .nan}]\n", "w.yaml:1:44: NaN m is no accuracy; …"},
		{"negative band", "surveys: [{files: [a], band: -1}]\n", "w.yaml:1:30: there is no band -1; bands count from 1"},
		{"unknown output", surveys + "outputs: [geojson, gpkg]\n", `w.yaml:2:20: output "gpkg" is not written yet; only geojson is`},
		{"unknown profile", surveys + "platform: {profile: lege}\n", `w.yaml:2:11: "lege" is no example profile and footprint_radius_m, inclination_deg, roughness_m, step_m, clearance_m, coverage not given; name suspended, ledge or pad, or give every limit`},
		{"profile makes no sense", surveys + "platform: {profile: ledge, footprint_radius_m: -1}\n", "w.yaml:2:48: footprint_radius_m is -1, …"},
		{"limit makes no sense", surveys + "platform:\n  profile: ledge\n  coverage: {best: 2}\n", "w.yaml:4:20: coverage.best is 2, …"},
		{"negative threshold", surveys + "obstacles: {recess_depth_m: -1}\n", "w.yaml:2:29: -1 is outside 0.001 to 10000; …"},
		{"anchor", "site: &a x\n" + surveys, "w.yaml:1:7: tags, anchors and aliases are not used in a worksite; write the value itself"},
		{"tag that the YAML library panics on", "surveys:\n  - files: !x\ny", "w.yaml:2:12: tags, anchors and aliases are not used …"},
		{"empty CRS", surveys + "crs: ''\n", "w.yaml:2:6: the working CRS is empty; …"},
		{"empty file name", "surveys: [{files: ['']}]\n", "w.yaml:1:20: a file name is empty"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Parse("w.yaml", []byte(c.src))
			var e *Error
			if !errors.As(err, &e) {
				t.Fatalf("got %v (%T), want an *Error", err, err)
			}
			want, open := strings.CutSuffix(c.want, "…")
			if got := e.Error(); got != want && !(open && strings.HasPrefix(got, want)) {
				t.Errorf("got  %s\nwant %s", got, c.want)
			}
		})
	}
}

func TestLoadErrors(t *testing.T) {
	dir := t.TempDir()
	binary := filepath.Join(dir, "scan.las")
	if err := os.WriteFile(binary, []byte("LASF\x00\x00"), 0o600); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ name, path, want string }{
		{"missing", filepath.Join(dir, "none.yaml"), "no such file or directory; give the path of a worksite file"},
		{"folder", dir, "is a directory; give the path"},
		{"survey", binary, "is no worksite file; 'ledgework init' writes one"},
	} {
		_, err := Load(c.path)
		if err == nil || !strings.Contains(err.Error(), c.path+": "+c.want) {
			t.Errorf("%s: got %v, want %s", c.name, err, c.want)
		}
	}
}

// FuzzParse looks for input that makes the parser panic, and checks that what
// it accepts survives being written and read again.
func FuzzParse(f *testing.F) {
	for _, s := range []string{
		"surveys: [{files: [a.las]}]\n",
		"surveys:\n  - date: 2026-05-14\n    files: [a, b]\n    sensors: [[1, 2, 3]]\nspacing_m: 0.05\n",
		"surveys: &a [{files: [a]}]\nsite: *a\n",
		"platform: {profile: pad, weights: {step: 3}}\nvoxels: run\ncrop: [1, 2, 3, 4]\n",
		"{", "- [", "a: !!binary x", "? x", "%YAML", "<<: 1",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, src []byte) {
		if len(src) > 4096 {
			return // long enough to fill every key, short enough to be fast
		}
		w, err := Parse("w.yaml", src)
		if err != nil {
			var e *Error
			if !errors.As(err, &e) || e.File != "w.yaml" {
				t.Fatalf("%v is no *Error of the file", err)
			}
			return
		}
		start := Default()
		start.Site, start.CRS, start.SpacingM, start.Crop, start.Surveys = w.Site, w.CRS, w.SpacingM, w.Crop, w.Surveys
		if len(start.Surveys) == 0 || !utf8.Valid(src) {
			return
		}
		text, err := start.Text()
		if err != nil {
			t.Fatal(err)
		}
		again, err := Parse("w.yaml", text)
		if err != nil {
			t.Fatalf("%v\n%s", err, text)
		}
		if got, want := len(again.Surveys), len(w.Surveys); got != want {
			t.Fatalf("%d surveys came back as %d", want, got)
		}
	})
}
