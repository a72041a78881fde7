package survey

import (
	"encoding/binary"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

func TestCropBox(t *testing.T) {
	c, err := CropBox([4]float64{10, 20, 30, 40})
	if err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct {
		x, y float64
		want bool
	}{{10, 20, true}, {30, 40, true}, {20, 30, true}, {9.999, 30, false}, {20, 40.001, false}, {math.NaN(), 30, false}} {
		if got := c.Contains(tt.x, tt.y); got != tt.want {
			t.Errorf("Contains(%g, %g) = %v", tt.x, tt.y, got)
		}
	}
	if a := planar.Area(c.Area()); a != 400 {
		t.Errorf("area %g, want 400", a)
	}
	for _, box := range [][4]float64{{30, 20, 10, 40}, {10, 20, 10, 40}, {math.NaN(), 0, 1, 1}, {0, 0, math.Inf(1), 1}} {
		if _, err := CropBox(box); err == nil || !strings.Contains(err.Error(), "encloses nothing") {
			t.Errorf("box %v: %v", box, err)
		}
	}
}

// star returns a ring around a middle whose radius changes from corner to
// corner.
func star(rng *rand.Rand, cx, cy, radius float64, corners int) orb.Ring {
	var r orb.Ring
	for i := range corners {
		a := 2 * math.Pi * float64(i) / float64(corners)
		d := radius * (0.4 + 0.6*rng.Float64())
		r = append(r, orb.Point{cx + d*math.Cos(a), cy + d*math.Sin(a)})
	}
	return append(r, r[0])
}

// The index agrees with orb's plain test of every edge.
func TestCropAgreesWithOrb(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	areas := orb.MultiPolygon{
		{star(rng, 0, 0, 50, 300), star(rng, 0, 0, 15, 40)}, // with a hole
		{star(rng, 40, 10, 30, 7)},                          // overlaps the first
		{orb.Ring{{100, 0}, {110, 0}, {110, 90}, {100, 90}, {100, 0}}},
	}
	c, err := newCrop(areas)
	if err != nil {
		t.Fatal(err)
	}
	inside := 0
	for range 20000 {
		x, y := rng.Float64()*200-70, rng.Float64()*180-70
		want := planar.MultiPolygonContains(areas, orb.Point{x, y})
		if got := c.Contains(x, y); got != want {
			t.Fatalf("Contains(%g, %g) = %v, orb says %v", x, y, got, want)
		}
		if want {
			inside++
		}
	}
	if inside < 2000 || inside > 18000 {
		t.Errorf("%d of 20000 places inside: the test tests little", inside)
	}
}

// A comb of tall teeth has edges in every row; the index stays small.
func TestCropIndexIsBounded(t *testing.T) {
	const teeth = 20000
	var r orb.Ring
	for i := range teeth {
		r = append(r, orb.Point{float64(2 * i), 0}, orb.Point{float64(2*i) + 1, 1000})
	}
	r = append(r, orb.Point{2 * teeth, -1}, orb.Point{0, -1}, r[0])
	c, err := newCrop(orb.MultiPolygon{{r}})
	if err != nil {
		t.Fatal(err)
	}
	total := 0
	for _, row := range c.rows {
		total += len(row)
	}
	if total > (rowsPerEdge+2)*len(r) {
		t.Errorf("%d entries for %d edges", total, len(r))
	}
}

func TestCropFile(t *testing.T) {
	dir := t.TempDir()
	square := func(kind, coords string) string {
		return `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{},"geometry":{"type":"` + kind + `","coordinates":` + coords + `}}]}`
	}
	f, err := planFakes("", map[string]*fakeReader{"a": boxReader("EPSG:32633", 0, [3]float64{500000, 4982000, 0}, [3]float64{500100, 4982100, 50})}, "a")
	if err != nil {
		t.Fatal(err)
	}
	// 15° E is the middle of zone 33; GeoJSON is longitude and latitude.
	path := writeFile(t, dir, "area.geojson", square("Polygon", "[[[15,45],[15.001,45],[15.001,45.001],[15,45.001],[15,45]]]"))
	c, err := CropFile(path, f)
	if err != nil {
		t.Fatal(err)
	}
	// 0.001° is 78.8 m east, 111.1 m north there; the corner is at N 4982950.4.
	if b := c.Area().Bound(); math.Abs(b.Min[0]-500000) > 0.01 || math.Abs(b.Max[0]-500078.8) > 0.2 || math.Abs(b.Min[1]-4982950.4) > 0.1 {
		t.Errorf("bound %v", b)
	}
	if !c.Contains(500040, 4983000) || c.Contains(500040, 4982940) {
		t.Error("the wrong side is inside")
	}

	local := &Frame{Local: true}
	if _, err := CropFile(path, local); err == nil || !strings.HasPrefix(err.Error(), path+": survey: crop: ") || !strings.Contains(err.Error(), "crs: EPSG:n") {
		t.Errorf("local frame: %v", err)
	}
	line := writeFile(t, dir, "line.geojson", square("LineString", "[[15,45],[15.001,45]]"))
	for _, bad := range []string{line, writeFile(t, dir, "empty.geojson", ""), dir + "/none.gpkg"} {
		if _, err := CropFile(bad, f); err == nil || !strings.HasPrefix(err.Error(), bad+": survey: crop: ") {
			t.Errorf("%s: %v", bad, err)
		}
	}
}

func FuzzAppendWKB(f *testing.F) {
	wkb := func(kind uint32, size int) []byte {
		b := binary.LittleEndian.AppendUint32([]byte{1}, kind)
		b = binary.LittleEndian.AppendUint32(b, 1) // ring
		b = binary.LittleEndian.AppendUint32(b, 4)
		return append(b, make([]byte, 4*size)...)
	}
	f.Add(wkb(3, 16))
	f.Add(wkb(1003, 24))
	f.Add(wkb(3003, 32))
	f.Add(append([]byte{1, 6, 0, 0, 0, 1, 0, 0, 0}, wkb(3, 16)...))
	f.Fuzz(func(t *testing.T, b []byte) {
		areas, err := appendWKB(nil, b)
		if err != nil {
			return
		}
		places := 0
		for _, p := range areas {
			for _, r := range p {
				places += len(r)
			}
		}
		if 16*places > len(b) {
			t.Errorf("%d places from %d bytes", places, len(b))
		}
	})
}

func BenchmarkCropContains(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 1))
	c, err := newCrop(orb.MultiPolygon{{star(rng, 0, 0, 50, 1000)}})
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		c.Contains(float64(i%100)-50, float64(i/100%100)-50)
		i++
	}
}
