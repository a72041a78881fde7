package worksite

import "testing"

func TestNearest(t *testing.T) {
	names := []string{"site", "spacing_m", "surveys", "sensors", "step_m"}
	for _, c := range []struct{ given, want string }{
		{"sit", "site"},
		{"Surveys", "surveys"},
		{"survey", "surveys"},
		{"spacing", "spacing_m"},
		{"step", "step_m"},
		{"sensor", "sensors"},
		{"", ""},
		{"completely_else", ""},
	} {
		if got := nearest(c.given, names); got != c.want {
			t.Errorf("nearest(%q): got %q, want %q", c.given, got, c.want)
		}
	}
}

func TestEdits(t *testing.T) {
	for _, c := range []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"", "abc", 3}, {"abc", "abc", 0},
		{"kitten", "sitting", 3}, // Levenshtein's usual example
		{"flaw", "lawn", 2},
	} {
		if got := edits(c.a, c.b); got != c.want {
			t.Errorf("edits(%q, %q): got %d, want %d", c.a, c.b, got, c.want)
		}
	}
}
