package decimal

import (
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
)

// TestParseAgreesWithStrconv takes the standard library as oracle, bit by bit.
func TestParseAgreesWithStrconv(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 1))
	check := func(s string) {
		t.Helper()
		want, err := strconv.ParseFloat(s, 64)
		if err != nil && !math.IsInf(want, 0) {
			t.Fatalf("%q is no number", s)
		}
		got, ok := Parse([]byte(s))
		if !ok || math.Float64bits(got) != math.Float64bits(want) {
			t.Errorf("Parse(%q) = %v, %v, want %v", s, got, ok, want)
		}
	}
	for range 20000 {
		v := math.Float64frombits(rnd.Uint64())
		if math.IsNaN(v) || math.IsInf(v, 0) {
			continue
		}
		check(strconv.FormatFloat(v, 'g', -1, 64))
		check(strconv.FormatFloat(rnd.NormFloat64()*1e6, 'f', rnd.IntN(25), 64))
		check(strconv.FormatFloat(rnd.NormFloat64()*1e6, 'e', rnd.IntN(18), 64))
		check(strconv.FormatUint(rnd.Uint64(), 10))
	}
	for _, s := range []string{"0", "-0", "+1", ".5", "5.", "-.5", "1e5", "1E-5", "1e400", "-1e400", "1e-400", "9007199254740993",
		"9007199254740992", "0.1", "123456789012345678", "0000000000000000000000001.5", "0.00000000000000000000001",
		"1.7976931348623157e308", "4.9e-324", strings.Repeat("9", 400)} {
		check(s)
	}
}

func TestParseWords(t *testing.T) {
	for s, want := range map[string]float64{"inf": math.Inf(1), "-INF": math.Inf(-1), "+Infinity": math.Inf(1)} {
		if got, ok := Parse([]byte(s)); !ok || got != want {
			t.Errorf("Parse(%q) = %v, %v", s, got, ok)
		}
	}
	for _, s := range []string{"nan", "NaN", "-nan"} {
		if got, ok := Parse([]byte(s)); !ok || !math.IsNaN(got) {
			t.Errorf("Parse(%q) = %v, %v", s, got, ok)
		}
	}
}

func TestParseRefuses(t *testing.T) {
	for _, s := range []string{"", ".", "-", "+", "e", "e5", "1e", "1e+", "--1", "1-2", "1.2.3", "1,5", " 1", "1 ", "0x10", "0x1p3", "1_000",
		"one", "1f", "nano", "\xff", "1\x00"} {
		if got, ok := Parse([]byte(s)); ok {
			t.Errorf("Parse(%q) = %v", s, got)
		}
	}
}

func TestParseAllocatesNothing(t *testing.T) {
	for _, s := range []string{"123456.789", "-1.5e-3", "4000000.123456789012", "nan", "x"} {
		b := []byte(s)
		if n := testing.AllocsPerRun(100, func() { Parse(b) }); n != 0 {
			t.Errorf("Parse(%q) allocates %v times", s, n)
		}
	}
}

func FuzzParse(f *testing.F) {
	f.Add([]byte("-12.5e3"))
	f.Add([]byte("1_0"))
	f.Fuzz(func(t *testing.T, b []byte) {
		got, ok := Parse(b)
		want, err := strconv.ParseFloat(string(b), 64)
		if ok && !math.IsNaN(got) && got != want {
			t.Errorf("Parse(%q) = %v, want %v", b, got, want)
		}
		if !ok && err == nil && !strings.ContainsAny(string(b), "xX_") {
			t.Errorf("Parse(%q) refuses %v", b, want)
		}
	})
}

func BenchmarkParse(b *testing.B) {
	s := []byte("636110.300003")
	b.ReportAllocs()
	for b.Loop() {
		Parse(s)
	}
}
