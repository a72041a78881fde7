package survey

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"testing"
	"time"

	"ledgework/terrain"
)

// cloud returns n points in a box of 100 × 100 × 20 m on a grid of millimetres.
func cloud(n int) [][3]float64 {
	rng := rand.New(rand.NewPCG(1, 1))
	points := make([][3]float64, n)
	for i := range points {
		points[i] = [3]float64{
			500000 + float64(rng.IntN(100001))/1000,
			5000000 + float64(rng.IntN(100001))/1000,
			float64(rng.IntN(20001)) / 1000,
		}
	}
	return points
}

// A tally is a number of points and the sum of a hash of each, so that equal
// tallies mean the same points in whatever order.
type tally struct {
	n    int64
	hash uint64
}

func (t *tally) add(x, y, z float64) {
	mm := func(v float64) float64 { return math.Round(v * 1000) }
	t.n++
	t.hash += cubeHash(place{mm(x), mm(y), mm(z)}, 1)
}

// gather streams sources and tallies the points.
func gather(t *testing.T, sources []Source, opts StreamOptions) (tally, Counts) {
	t.Helper()
	f, err := Plan(context.Background(), sources, "auto")
	if err != nil {
		t.Fatal(err)
	}
	opts = opts.withWorkers()
	parts := make([]tally, opts.Workers)
	c, err := Stream(context.Background(), f, sources, opts, func(w int, b *terrain.Batch) error {
		for i := range b.X {
			parts[w].add(b.X[i], b.Y[i], b.Z[i])
		}
		return nil
	}, nil)
	if err != nil {
		t.Fatal(err)
	}
	var all tally
	for _, p := range parts {
		all.n += p.n
		all.hash += p.hash
	}
	return all, c
}

func TestStreamDeliversEveryPointOnce(t *testing.T) {
	dir := t.TempDir()
	n := 3*unitPoints + 12345 // four units and another file
	points := cloud(n)
	var want tally
	for _, p := range points {
		want.add(p[0], p[1], p[2])
	}
	utm := wktOf(t, "EPSG:32633")
	sources := []Source{
		{Path: writeLAS(t, dir, "a.las", utm, points[:n-5000], nil)},
		{Path: writeLAS(t, dir, "b.las", utm, points[n-5000:], nil)},
	}
	for _, workers := range []int{1, 3} {
		got, c := gather(t, sources, StreamOptions{Workers: workers})
		if got != want {
			t.Errorf("%d workers: got %v, want %v", workers, got, want)
		}
		if c.Read != int64(n) || c.Kept != int64(n) || len(c.Dropped) != 0 || c.Files[1].Kept != 5000 {
			t.Errorf("%d workers: counts %+v", workers, c)
		}
		if e := c.Extent; e.Max[0]-e.Min[0] > 100.0001 || e.Max[2]-e.Min[2] > 20.0001 || e.Empty() {
			t.Errorf("extent %v", e)
		}
	}
}

func TestStreamDropsAndCounts(t *testing.T) {
	dir := t.TempDir()
	points := cloud(1000)
	class := make([]uint8, len(points))
	for i := range class {
		class[i] = [4]uint8{2, 7, 18, 5}[i%4]
	}
	inside := int64(0)
	for i, p := range points {
		if class[i] != 7 && class[i] != 18 && p[0] <= 500050 {
			inside++
		}
	}
	crop, err := CropBox([4]float64{500000, 5000000, 500050, 5000100})
	if err != nil {
		t.Fatal(err)
	}
	path := writeLAS(t, dir, "a.las", wktOf(t, "EPSG:32633"), points, class)
	_, c := gather(t, []Source{{Path: path}}, StreamOptions{Filter: Filter{ExcludeClasses: []uint8{18, 7}, Crop: crop}})
	want := []Drop{{"outside the crop", 500 - inside}, {"class 7", 250}, {"class 18", 250}}
	if c.Read != 1000 || c.Kept != inside || len(c.Dropped) != 3 {
		t.Fatalf("counts %+v, want %d kept", c, inside)
	}
	for i, w := range want {
		if c.Dropped[i] != w || c.Files[0].Dropped[i] != w {
			t.Errorf("dropped %v, want %v", c.Dropped[i], w)
		}
	}
}

func TestStreamHidesColumnsOfTheFilter(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", "", cloud(100), nil)
	src := []Source{{Path: path}}
	f, err := Plan(context.Background(), src, "")
	if err != nil {
		t.Fatal(err)
	}
	for _, columns := range []terrain.Columns{0, terrain.Intensity, terrain.Class | terrain.Returns} {
		opts := StreamOptions{Columns: columns, Filter: Filter{ExcludeClasses: []uint8{7}}}
		_, err := Stream(context.Background(), f, src, opts, func(_ int, b *terrain.Batch) error {
			if got := b.Columns(); got != columns {
				t.Errorf("columns %b, want %b", got, columns)
			}
			return nil
		}, nil)
		if err != nil {
			t.Error(err)
		}
	}
}

func TestStreamEndsSoonAfterContext(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", "", cloud(200000), nil)
	src := []Source{{Path: path}}
	f, err := Plan(context.Background(), src, "")
	if err != nil {
		t.Fatal(err)
	}
	before := runtime.NumGoroutine()
	ctx, cancel := context.WithCancel(context.Background())
	var at time.Time
	var once sync.Once
	_, err = Stream(ctx, f, src, StreamOptions{Workers: 4}, func(int, *terrain.Batch) error {
		once.Do(func() { at = time.Now(); cancel() })
		return nil
	}, func(int64, int64, int64) {})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want context.Canceled", err)
	}
	if d := time.Since(at); d > 100*time.Millisecond {
		t.Errorf("ended %v after the context", d)
	}
	// A goroutine that is done still counts until it is off the books.
	after := runtime.NumGoroutine()
	for range 100 {
		if after = runtime.NumGoroutine(); after <= before {
			break
		}
		time.Sleep(10 * time.Millisecond)
	}
	if after > before {
		t.Errorf("%d goroutines before, %d after", before, after)
	}
}

func TestStreamReturnsFirstError(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", "", cloud(50000), nil)
	src := []Source{{Path: path}}
	f, err := Plan(context.Background(), src, "")
	if err != nil {
		t.Fatal(err)
	}
	full := errors.New("the disk is full")
	_, err = Stream(context.Background(), f, src, StreamOptions{Workers: 3}, func(int, *terrain.Batch) error { return full }, nil)
	if !errors.Is(err, full) || !strings.HasPrefix(err.Error(), path+": ") {
		t.Errorf("error %v", err)
	}

	// The file shrinks between the plan and the stream.
	info, err := os.Stat(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(path, info.Size()-100); err != nil {
		t.Fatal(err)
	}
	_, err = Stream(context.Background(), f, src, StreamOptions{}, func(int, *terrain.Batch) error { return nil }, nil)
	var bad *terrain.FormatError
	if !errors.As(err, &bad) || !strings.HasPrefix(err.Error(), path+": las: point ") {
		t.Errorf("truncated: error %v", err)
	}

	// Allowed, it is a defect.
	src[0].Tolerant = true
	if f, err = Plan(context.Background(), src, ""); err != nil {
		t.Fatal(err)
	}
	c, err := Stream(context.Background(), f, src, StreamOptions{}, func(int, *terrain.Batch) error { return nil }, nil)
	if err != nil || len(c.Defects) != 1 || c.Defects[0].Count != 50000-c.Read {
		t.Errorf("tolerant: error %v, counts %+v", err, c)
	}
}

func TestStreamReportsProgress(t *testing.T) {
	path := writeLAS(t, t.TempDir(), "a.las", "", cloud(5000), nil)
	src := []Source{{Path: path}}
	f, err := Plan(context.Background(), src, "")
	if err != nil {
		t.Fatal(err)
	}
	var done, total, points int64
	_, err = Stream(context.Background(), f, src, StreamOptions{}, func(int, *terrain.Batch) error { return nil },
		func(d, t, p int64) { done, total, points = d, t, p })
	info, _ := os.Stat(path)
	if err != nil || done != total || total != info.Size() || points != 5000 {
		t.Errorf("progress %d of %d bytes, %d points, error %v", done, total, points, err)
	}
}

func TestCountsErr(t *testing.T) {
	c := Counts{Read: 5, Dropped: []Drop{{"class 7", 3}, {"outside the crop", 2}}}
	want := "survey: the survey holds no usable point: 5 points read; 3 dropped: class 7; 2 dropped: outside the crop"
	if err := c.Err(); !errors.Is(err, terrain.ErrNoPoints) || err.Error() != want {
		t.Errorf("got %v\nwant %v", err, want)
	}
	c.Kept = 1
	if err := c.Err(); err != nil {
		t.Error(err)
	}
}

// A count of 2^40 points in a small file makes few units.
func TestSectionsOfCountThatLies(t *testing.T) {
	units := sections(0, &terrain.Header{Points: 1 << 40, Bytes: 50 << 20})
	var n int64
	for _, u := range units {
		if u.first != n {
			t.Errorf("unit starts at %d, want %d", u.first, n)
		}
		n += u.n
	}
	if len(units) != 10 || n != 1<<40 {
		t.Errorf("%d units of %d points", len(units), n)
	}
}

func TestPumpDropsWhatIsNotFinite(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	r := boxReader("", 0, [3]float64{0, 0, 0}, [3]float64{10, 10, 10})
	f, err := planFakes("", map[string]*fakeReader{"a": r}, "a")
	if err != nil {
		t.Fatal(err)
	}
	r.at = 0
	r.points = append(r.points, [3]float64{nan, 0, 0}, [3]float64{0, inf, 0}, [3]float64{0, 0, -inf}, [3]float64{1e7, 0, 0})
	r.flags = make([]terrain.Flags, len(r.points))
	r.flags[0] = terrain.Withheld
	run := &run{frame: f, sources: []Source{{Path: "a"}}, units: []unit{{}}, bounds: f.bounds(), counts: newCounts([]Source{{Path: "a"}}),
		defects: make([][]terrain.Defect, 1), opts: StreamOptions{Filter: Filter{DropWithheld: true}},
		emit: func(int, *terrain.Batch) error { return nil }}
	w := &worker{run: run}
	tr, err := f.Transformer(Source{Path: "a"})
	if err != nil {
		t.Fatal(err)
	}
	if err := w.pump(context.Background(), 0, r, tr); err != nil {
		t.Fatal(err)
	}
	run.sum()
	want := []Drop{{"coordinate is not finite", 3}, {"withheld", 1}, {"more than 100 km outside the extent that the headers tell", 1}}
	if got := run.counts.Dropped; len(got) != 3 || got[0] != want[0] || got[1] != want[1] || got[2] != want[2] {
		t.Errorf("dropped %v, want %v", got, want)
	}
}

func BenchmarkStream(b *testing.B) {
	path := writeLAS(b, b.TempDir(), "a.las", "", cloud(1<<20), nil)
	src := []Source{{Path: path}}
	f, err := Plan(context.Background(), src, "")
	if err != nil {
		b.Fatal(err)
	}
	for _, workers := range []int{1, 2} {
		b.Run(map[int]string{1: "one worker", 2: "two workers"}[workers], func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				c, err := Stream(context.Background(), f, src, StreamOptions{Workers: workers, Filter: Filter{ExcludeClasses: []uint8{7}}},
					func(int, *terrain.Batch) error { return nil }, nil)
				if err != nil || c.Kept != 1<<20 {
					b.Fatal(err, c.Kept)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/(1<<20), "ns/point")
		})
	}
}

// Every real survey is planned and streamed to its last point.
func TestRealSurveys(t *testing.T) {
	root := surveys(t)
	frames := map[string]string{ // path or folder: working CRS
		"terrain/Haystack_Rock.las":                "EPSG:3645",
		"terrain/mountain_spur_utm42.las":          "EPSG:32642",
		"terrain/SainteHelens_usgs.dem":            "EPSG:26710",
		"terrain/alps_rgi11_01270_46m.tif":         "",
		"terrain/ecuador_ta_10m_5band.tif":         "EPSG:32717",
		"terrain/hintereisferner_srtm_3arcsec.tif": "EPSG:32632",
		"terrain/south_glacier_20m.tif":            "EPSG:32607",
		"terrain/west_bijou_escarpment.asc":        "EPSG:32613",
		"terrain/zion_srtm_3arcsec.tif":            "EPSG:32612",
		"seasons/bmx/2010.las":                     "EPSG:2991",
		"seasons/bmx/2023.las":                     "EPSG:2991",
		"seasons/crater/2000-09-25_10m.tif":        "EPSG:26910",
		"seasons/crater/epoch15_10m.tif":           "EPSG:26910",
		"seasons/landslide/pre_runout_DEM.asc":     "",
		"seasons/landslide/DEM_of_Difference.asc":  "",
		"formats/pdal/autzen-utm.las":              "EPSG:26910",
		"formats/pdal/epsg_4326.las":               "EPSG:32615",
		"formats/pdal/mvk-thin.las":                "EPSG:26995",
		"formats/laspy/simple.las":                 "",
		"formats/laspy/simple1_3.las":              "",
		"formats/laz-perf/1815.las":                "EPSG:6580",
	}
	for name, code := range frames {
		t.Run(name, func(t *testing.T) {
			src := []Source{{Path: filepath.Join(root, name)}}
			f, err := Plan(context.Background(), src, "auto")
			if err != nil {
				t.Fatal(err)
			}
			if f.AuthorityCode != code {
				t.Errorf("frame %q %q, want %q", f.AuthorityCode, f.Name, code)
			}
			c, err := Stream(context.Background(), f, src, StreamOptions{Columns: terrain.Class}, func(int, *terrain.Batch) error { return nil }, nil)
			if err != nil {
				t.Fatal(err)
			}
			if c.Kept != c.Read || c.Kept != f.Points || c.Err() != nil {
				t.Errorf("%d planned, %d read, %d kept: %v", f.Points, c.Read, c.Kept, c.Dropped)
			}
			// Nothing may stand as a wall of 90° because of its units.
			if e := c.Extent; e.Max[2]-e.Min[2] > max(e.Max[0]-e.Min[0], e.Max[1]-e.Min[1]) && !strings.Contains(name, "DEM_of_D") {
				t.Errorf("%v is higher than wide", e)
			}
		})
	}
}
