package export

import (
	"bytes"
	"flag"
	"fmt"
	"os"
	"regexp"
	"strings"
	"testing"
)

// FIELDS.md is generated: go test ./export -run Dictionary -update
func TestDictionaryMarkdown(t *testing.T) {
	var b bytes.Buffer
	if err := WriteDictionaryMarkdown(&b); err != nil {
		t.Fatal(err)
	}
	if flag.Lookup("update").Value.String() == "true" {
		if err := os.WriteFile("FIELDS.md", b.Bytes(), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	got, err := os.ReadFile("FIELDS.md")
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, b.Bytes()) {
		t.Error("FIELDS.md is out of date: run go test ./export -run Dictionary -update")
	}
}

func TestMain(m *testing.M) {
	flag.Bool("update", false, "write FIELDS.md anew")
	flag.Parse()
	os.Exit(m.Run())
}

// The properties that other programs rely on.
func TestDictionaryNames(t *testing.T) {
	promised := map[string]string{
		"obstacles": "id kind centre_e_m centre_n_m centre_h_m semi_axis_1_m semi_axis_2_m semi_axis_3_m quat_w quat_x quat_y quat_z " +
			"height_m area_m2 rock_volume_m3 ellipsoid_volume_m3 volume_gap scattered",
		"patches": "id e_m n_m h_m normal_e normal_n normal_h inclination_deg dip_direction_deg roughness_m step_m coverage clearance_m " +
			"score confidence limited_by",
		"zones": "id area_m2 patch_count best_patch best_score mean_score inclination_deg dip_direction_deg",
		"site":  "name crs crs_wkt spacing_m points voxels caution",
	}
	name := regexp.MustCompile(`^[a-z][a-z0-9_]*$`)
	for _, l := range Dictionary() {
		has := make(map[string]bool)
		for _, f := range l.Fields {
			if has[f.Name] || !name.MatchString(f.Name) || len(f.Name) > 63 {
				t.Errorf("%s: name %q is repeated or of a form that databases change", l.Name, f.Name)
			}
			has[f.Name] = true
			if f.Meaning == "" || f.Type == Real && f.Decimals == 0 {
				t.Errorf("%s.%s: meaning %q, decimals %d", l.Name, f.Name, f.Meaning, f.Decimals)
			}
			suffix := map[string]string{"m": "_m", "m²": "_m2", "m³": "_m3", "°": "_deg"}[f.Unit]
			if !strings.HasSuffix(f.Name, suffix) {
				t.Errorf("%s.%s: the name does not end in %s", l.Name, f.Name, suffix)
			}
		}
		for _, want := range strings.Fields(promised[l.Name]) {
			if !has[want] {
				t.Errorf("%s: property %s is missing", l.Name, want)
			}
		}
	}
}

func ExampleDictionary() {
	for _, l := range Dictionary() {
		fmt.Println(l.Name, l.Fields[0].Name)
	}
	// Output:
	// obstacles id
	// patches id
	// zones id
	// site name
}
