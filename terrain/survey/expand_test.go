package survey

import (
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
)

func TestExpand(t *testing.T) {
	dir := t.TempDir()
	for _, name := range []string{
		"scan/b.las", "scan/a.las", "scan/a.las.aux.xml", "scan/a.prj", "scan/deep/c.ply", "scan/.hidden/d.las", "scan/.e.las",
		"dem.tif", "dem.tfw", "odd[1].las",
	} {
		writeFile(t, dir, name, "x")
	}
	writeFile(t, dir, "text/points.txt", "1 2 3\n4 5 6\n7 8 9\n")
	writeFile(t, dir, "text/notes.txt", "Scanned on Monday, windy.\n")
	tests := []struct {
		patterns, want []string
	}{
		{[]string{"dem.tif"}, []string{"dem.tif"}},
		{[]string{"scan"}, []string{"scan/a.las", "scan/b.las", "scan/deep/c.ply"}},
		{[]string{"scan/*.las"}, []string{"scan/a.las", "scan/b.las"}},
		{[]string{"scan/*"}, []string{"scan/a.las", "scan/b.las"}},
		{[]string{"scan/b.las", "./scan/*.las", "scan/../scan/a.las"}, []string{"scan/a.las", "scan/b.las"}},
		{[]string{"text"}, []string{"text/points.txt"}},
		{[]string{"text/notes.txt"}, []string{"text/notes.txt"}}, // asked for, so given
		{[]string{"odd[1].las"}, []string{"odd[1].las"}},
		{[]string{"dem.*"}, []string{"dem.tif"}},
		{[]string{filepath.Join(dir, "dem.tif")}, []string{"dem.tif"}},
		{nil, nil},
	}
	for _, tt := range tests {
		got, err := Expand(dir, tt.patterns)
		if err != nil {
			t.Errorf("%v: %v", tt.patterns, err)
			continue
		}
		for i := range got {
			if got[i], err = filepath.Rel(dir, got[i]); err != nil {
				t.Fatal(err)
			}
		}
		if !slices.Equal(got, tt.want) {
			t.Errorf("%v: got %v, want %v", tt.patterns, got, tt.want)
		}
	}
}

func TestExpandNamesThePatternThatMatchesNothing(t *testing.T) {
	dir := t.TempDir()
	writeFile(t, dir, "empty/readme.md", "x")
	for pattern, want := range map[string]string{
		"none.las":   `"none.las"`,
		"scan/*.las": `pattern "scan/*.las" matches no file`,
		"empty":      `folder "empty" holds no survey file`,
		"empty/*":    `pattern "empty/*" matches no file`,
		"[":          `pattern "["`,
		" ":          "an empty file name",
	} {
		if _, err := Expand(dir, []string{pattern}); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error %v lacks %q", pattern, err, want)
		}
	}
}

// The name of the folder itself used to be read as a part of the pattern, and a
// link to a folder was said to hold no survey.
func TestExpandTakesTheFolderAsItIs(t *testing.T) {
	if runtime.GOOS == "windows" {
		t.Skip("a folder's name cannot be quoted in a pattern, and links need rights")
	}
	dir := filepath.Join(t.TempDir(), `head [1] *?\ é`)
	want := writeFile(t, dir, "scan/a.las", "x")
	link := filepath.Join(dir, "link")
	if err := os.Symlink("scan", link); err != nil {
		t.Fatal(err)
	}
	for pattern, want := range map[string]string{"scan/*.las": want, "scan": want, "link": filepath.Join(link, "a.las")} {
		got, err := Expand(dir, []string{pattern})
		if err != nil || !slices.Equal(got, []string{want}) {
			t.Errorf("%q: got %q, %v, want %q", pattern, got, err, want)
		}
	}
}
