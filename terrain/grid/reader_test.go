package grid

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain"
)

// write puts text into a new file of that name and returns its path.
func write(t testing.TB, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

type point struct{ x, y, z float64 }

// readAll returns all points of r, read in batches of n.
func readAll(t testing.TB, r terrain.Reader, n int) []point {
	t.Helper()
	var points []point
	b := terrain.NewBatch(n, terrain.Intensity)
	for {
		err := r.Read(b)
		if errors.Is(err, io.EOF) {
			if b.Len() != 0 {
				t.Fatalf("%d points together with io.EOF", b.Len())
			}
			return points
		}
		if err != nil {
			t.Fatal(err)
		}
		for i := range b.Len() {
			points = append(points, point{b.X[i], b.Y[i], b.Z[i]})
			if b.Intensity[i] != 0 {
				t.Fatal("a column that the file lacks is not zero")
			}
		}
	}
}

func open(t testing.TB, path string, opts Options) terrain.Reader {
	t.Helper()
	r, err := Open(path, opts)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := r.Close(); err != nil {
			t.Error(err)
		}
	})
	return r
}

const smallGrid = `ncols 3
nrows 2
xllcorner 100
yllcorner 200
cellsize 2
NODATA_value -9999
1.5 2.5 -9999
4.5 nan 6.5
`

func TestASCIIGrid(t *testing.T) {
	path := write(t, "small.asc", smallGrid)
	for _, n := range []int{1, 2, 4096} {
		r := open(t, path, Options{})
		h := r.Header()
		if want := "elevation grid (AAIGrid, 3 × 2)"; h.Format != want {
			t.Errorf("format %q, want %q", h.Format, want)
		}
		if h.Cell != 2 || h.CRS != "" || h.Points != -1 || h.Columns != 0 || h.Bytes != int64(len(smallGrid)) {
			t.Errorf("header %+v", h)
		}
		got := fmt.Sprint(readAll(t, r, n))
		want := fmt.Sprint([]point{{101, 203, 1.5}, {103, 203, 2.5}, {101, 201, 4.5}, {105, 201, 6.5}})
		if got != want {
			t.Errorf("batches of %d: points %s, want %s", n, got, want)
		}
		if r.Consumed() != h.Bytes {
			t.Errorf("consumed %d of %d bytes", r.Consumed(), h.Bytes)
		}
		d := r.Defects()
		if len(d) != 1 || d[0].Count != 1 || d[0].First != "column 1, row 1" {
			t.Errorf("defects %+v, want the one NaN", d)
		}
	}
}

// vrt is a raster of two bands on top of smallGrid, with the given bits put in.
func vrt(geo, srs, band1, band2 string) string {
	source := `<SimpleSource><SourceFilename relativeToVRT="1">small.asc</SourceFilename><SourceBand>1</SourceBand></SimpleSource>`
	text := `<VRTDataset rasterXSize="3" rasterYSize="2">` + srs + geo +
		`<VRTRasterBand dataType="Float32" band="1"><NoDataValue>-9999</NoDataValue>` + band1 + source + `</VRTRasterBand>`
	if band2 != "" {
		text += `<VRTRasterBand dataType="Float32" band="2"><NoDataValue>-9999</NoDataValue>` + band2 + source + `</VRTRasterBand>`
	}
	return text + `</VRTDataset>`
}

func vrtFile(t testing.TB, geo, srs, band1, band2 string) string {
	t.Helper()
	path := write(t, "small.vrt", vrt(geo, srs, band1, band2))
	if err := os.WriteFile(filepath.Join(filepath.Dir(path), "small.asc"), []byte(smallGrid), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

const northUp = `<GeoTransform>100, 2, 0, 204, 0, -2</GeoTransform>`

func TestPlacesCells(t *testing.T) {
	// Rows run along (3, 4), 5 long; columns along (8, -6), 10 long.
	path := vrtFile(t, `<GeoTransform>1000, 3, 8, 2000, 4, -6</GeoTransform>`, "", "<Description/>", "")
	r := open(t, path, Options{})
	if got, want := r.Header().Cell, math.Sqrt(5*10); math.Abs(got-want) > 1e-12 {
		t.Errorf("cell %g, want %g", got, want)
	}
	notes := strings.Join(r.Header().Notes, "; ")
	for _, want := range []string{"not square: 5 × 10", "53.13°"} {
		if !strings.Contains(notes, want) {
			t.Errorf("notes %q lack %q", notes, want)
		}
	}
	got := readAll(t, r, 10)[3] // column 2, row 1
	want := point{1000 + 2.5*3 + 1.5*8, 2000 + 2.5*4 - 1.5*6, 6.5}
	if got != want {
		t.Errorf("point %v, want %v", got, want)
	}
}

func TestHeights(t *testing.T) {
	const utm = `<SRS>EPSG:32633</SRS>`
	const feet = `<SRS>EPSG:2225</SRS>` // California zone 1, US survey feet
	const both = `<SRS>EPSG:2225+5703</SRS>`
	tests := []struct {
		name, srs, band string
		want            float64 // of the stored 1.5
		note            string
	}{
		{"stored", utm, "", 1.5, ""},
		{"metres", utm, "<UnitType>metre</UnitType>", 1.5, ""},
		{"scaled", utm, "<Offset>100</Offset><Scale>0.5</Scale>", 100.75, ""},
		{"feet to metres", utm, "<UnitType>ft</UnitType>", 1.5 * 0.3048, `"ft", to metre`},
		{"feet to metres without a CRS", "", "<UnitType>feet</UnitType>", 1.5 * 0.3048, `to metre`},
		{"survey feet, scaled", utm, "<UnitType>US survey foot</UnitType><Offset>100</Offset><Scale>0.5</Scale>", 100.75 * 1200 / 3937, "to metre"},
		{"degrees with feet", `<SRS>EPSG:4326</SRS>`, "<UnitType>ft</UnitType>", 1.5 * 0.3048, "to metre"},
		{"metres on a CRS in feet", feet, "<UnitType>m</UnitType>", 1.5 * 3937 / 1200, "to US survey foot"},
		{"feet on a CRS in feet", feet, "<UnitType>US survey foot</UnitType>", 1.5, ""},
		{"metres on a plan in feet with heights in metres", both, "<UnitType>m</UnitType>", 1.5, ""},
		{"unknown unit", utm, "<UnitType>furlong</UnitType>", 1.5, ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			r := open(t, vrtFile(t, northUp, tt.srs, tt.band, ""), Options{})
			got := readAll(t, r, 10)[0].z
			// Heights pass through products of numbers known to 1e-15.
			if math.Abs(got-tt.want) > 1e-12*tt.want {
				t.Errorf("height %.12g, want %.12g", got, tt.want)
			}
			notes := strings.Join(r.Header().Notes, "; ")
			if (tt.note == "") != (notes == "") || !strings.Contains(notes, tt.note) {
				t.Errorf("notes %q, want %q", notes, tt.note)
			}
		})
	}
}

// Heights used to be converted to the unit of the file's CRS where another one
// was given, and then taken to be in that one's: wrong by the ratio of the two.
func TestHeightsWithGivenCRS(t *testing.T) {
	const usFoot = 1200.0 / 3937
	for _, tt := range []struct {
		name, srs, unit, crs string
		want                 float64 // of the stored 1.5
	}{
		{"feet on a given CRS in feet", "", "US survey foot", "EPSG:2225", 1.5},
		{"metres on a given CRS in feet", "", "m", "EPSG:2225", 1.5 / usFoot},
		{"metres for a file in feet", "<SRS>EPSG:2225</SRS>", "m", "EPSG:32610", 1.5},
		{"given heights in metres", "", "US survey foot", "EPSG:2225+5703", 1.5 * usFoot},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := open(t, vrtFile(t, northUp, tt.srs, "<UnitType>"+tt.unit+"</UnitType>", ""), Options{CRS: tt.crs})
			if got := readAll(t, r, 10)[0].z; math.Abs(got-tt.want) > 1e-12*tt.want {
				t.Errorf("height %.12g, want %.12g", got, tt.want)
			}
		})
	}
	_, err := Open(vrtFile(t, northUp, "", "<UnitType>m</UnitType>", ""), Options{CRS: "EPSG:1"})
	var format *terrain.FormatError
	if err == nil || errors.As(err, &format) || !strings.Contains(err.Error(), "the given CRS") {
		t.Errorf("error %v", err)
	}
}

func TestOpenRefuses(t *testing.T) {
	tests := []struct {
		name, path string
		opts       Options
		want       string
	}{
		{"missing", filepath.Join(t.TempDir(), "none.tif"), Options{}, "no such file"},
		{"garbage", write(t, "a.tif", "not a raster at all"), Options{}, "not recognized"},
		{"empty", write(t, "a.tif", ""), Options{}, "cannot be opened"},
		{"remote", "/vsicurl/http://localhost/a.tif", Options{}, "not a local file"},
		{"no geotransform", vrtFile(t, "", "", "", ""), Options{}, "no geotransform"},
		{"flat cells", vrtFile(t, "<GeoTransform>1, 0, 0, 1, 0, 0</GeoTransform>", "", "", ""), Options{}, "no area"},
		{"not finite", vrtFile(t, "<GeoTransform>nan, 1, 0, 1, 0, 1</GeoTransform>", "", "", ""), Options{}, "no area"},
		{"scale zero", vrtFile(t, northUp, "", "<Scale>0</Scale>", ""), Options{}, "scaled by 0"},
		{"band too high", vrtFile(t, northUp, "", "", ""), Options{Band: 2}, "there is no band 2; choose one of 1 to 1"},
		{"band negative", vrtFile(t, northUp, "", "", ""), Options{Band: -1}, "counted from 1"},
		{"control points", vrtFile(t, `<GCPList><GCP Id="1" Pixel="0" Line="0" X="1" Y="1"/><GCP Id="2" Pixel="3" Line="0" X="7" Y="1"/><GCP Id="3" Pixel="0" Line="2" X="1" Y="9"/></GCPList>`, "", "", ""), Options{}, "3 ground control points but no geotransform"},
		{"complex", write(t, "c.vrt", `<VRTDataset rasterXSize="1" rasterYSize="1">`+northUp+`<VRTRasterBand dataType="CFloat32" band="1"/></VRTDataset>`), Options{}, "complex numbers (CFloat32) is not supported"},
		{"one huge block", write(t, "h.tif", hugeTile()), Options{}, "blocks of 30000 × 30000 cells"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			r, err := Open(tt.path, tt.opts)
			if err == nil {
				r.Close()
				t.Fatal("no error")
			}
			if !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error %q, want it to say %q", err, tt.want)
			}
		})
	}
}

// hugeTile is a GeoTIFF without data whose only tile is 30000 × 30000 cells of
// eight bytes.
func hugeTile() string {
	le := binary.LittleEndian
	const side, ifd, entries = 30000, 8, 13
	out := append([]byte("II*\x00"), ifd, 0, 0, 0, entries, 0)
	at := uint32(ifd + 2 + entries*12 + 4)
	for _, e := range [entries][4]uint32{ // tag, type, count, value
		{256, 4, 1, side}, {257, 4, 1, side}, {258, 3, 1, 64}, {259, 3, 1, 8}, {262, 3, 1, 1}, {277, 3, 1, 1},
		{322, 4, 1, side}, {323, 4, 1, side}, {324, 4, 1, 0}, {325, 4, 1, 0}, {339, 3, 1, 3}, {33550, 12, 3, at}, {33922, 12, 6, at + 24},
	} {
		out = le.AppendUint16(out, uint16(e[0]))
		out = le.AppendUint16(out, uint16(e[1]))
		out = le.AppendUint32(out, e[2])
		out = le.AppendUint32(out, e[3])
	}
	out = le.AppendUint32(out, 0)
	for _, v := range []float64{1, 1, 0, 0, 0, 0, 100, 200, 0} { // ModelPixelScale, ModelTiepoint
		out = le.AppendUint64(out, math.Float64bits(v))
	}
	return string(out)
}

func TestTruncatedGrid(t *testing.T) {
	path := write(t, "short.asc", smallGrid[:len(smallGrid)-10])
	r := open(t, path, Options{})
	b := terrain.NewBatch(16, 0)
	var err error
	for err == nil {
		err = r.Read(b)
	}
	var format *terrain.FormatError
	if !errors.As(err, &format) || !strings.Contains(err.Error(), "short.asc") {
		t.Errorf("error %v, want a FormatError that names the file", err)
	}
}

func TestUndeclaredNoData(t *testing.T) {
	text := strings.Replace(smallGrid, "NODATA_value -9999\n", "", 1)
	text = strings.Replace(text, "-9999", "-3.4028234663852886e38", 1)
	r := open(t, write(t, "a.asc", text), Options{})
	if n := len(readAll(t, r, 8)); n != 4 {
		t.Errorf("%d points, want 4", n)
	}
	if d := r.Defects(); len(d) != 1 || d[0].First != "column 2, row 0" {
		t.Errorf("defects %+v, want the impossible height", d)
	}
}

// A raster of any size is cheap to promise: a VRT without sources is nodata
// throughout. Reading must stay lazy.
func TestHugePromise(t *testing.T) {
	path := write(t, "huge.vrt", `<VRTDataset rasterXSize="2000000000" rasterYSize="2000000000">`+northUp+
		`<VRTRasterBand dataType="Float32" band="1"><NoDataValue>0</NoDataValue></VRTRasterBand></VRTDataset>`)
	r, err := Open(path, Options{})
	if err != nil {
		t.Skip("this GDAL refuses it at once:", err)
	}
	defer r.Close()
	b := terrain.NewBatch(16, 0)
	for range 10 {
		if err := r.Read(b); err != nil {
			t.Fatal(err)
		}
		if b.Len() != 0 {
			t.Fatal("a point where there is no data")
		}
	}
}

func TestReadDoesNotAllocatePerPoint(t *testing.T) {
	r := open(t, rampFile(t, 600, 600), Options{})
	b := terrain.NewBatch(terrain.BatchPoints, 0)
	if err := r.Read(b); err != nil { // loads the first window
		t.Fatal(err)
	}
	if n := testing.AllocsPerRun(20, func() {
		if err := r.Read(b); err != nil {
			t.Fatal(err)
		}
	}); n != 0 {
		t.Errorf("%g allocations a batch", n)
	}
}

// rampFile is an ASCII grid with height = column + row/1000.
func rampFile(t testing.TB, w, h int) string {
	var s strings.Builder
	fmt.Fprintf(&s, "ncols %d\nnrows %d\nxllcorner 0\nyllcorner 0\ncellsize 1\n", w, h)
	for row := range h {
		for col := range w {
			fmt.Fprintf(&s, "%d.%03d ", col, row%1000)
		}
		s.WriteByte('\n')
	}
	return write(t, "ramp.asc", s.String())
}

func BenchmarkRead(b *testing.B) {
	path := rampFile(b, 1500, 1000)
	// Parsing text would be all that is measured: a VRT of constant blocks
	// times this package and the border to C.
	vrt := write(b, "plain.vrt", `<VRTDataset rasterXSize="2048" rasterYSize="2048">`+northUp+
		`<VRTRasterBand dataType="Float32" band="1"></VRTRasterBand></VRTDataset>`)
	for _, c := range []struct{ name, path string }{{"ascii", path}, {"plain", vrt}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			batch := terrain.NewBatch(terrain.BatchPoints, 0)
			var n int
			for b.Loop() {
				r, err := Open(c.path, Options{})
				if err != nil {
					b.Fatal(err)
				}
				for err == nil {
					err = r.Read(batch)
					n += batch.Len()
				}
				if !errors.Is(err, io.EOF) {
					b.Fatal(err)
				}
				r.Close()
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(n), "ns/cell")
		})
	}
}

func FuzzASCIIGrid(f *testing.F) {
	f.Add([]byte(strings.TrimPrefix(smallGrid, "ncols")))
	f.Add([]byte(" 3\nnrows 2\nxllcenter 1e300\nyllcenter -0\ndx 1\ndy 2\n1 2 3\n4 5 6"))
	f.Add([]byte(" 999999999\nnrows 999999999\nxllcorner 0\nyllcorner 0\ncellsize 1\n1 2 3"))
	f.Add([]byte(" 2\nnrows 1\nxllcorner 0\nyllcorner 0\ncellsize 0.1\nnodata_value nan\n1e38 inf"))
	dir := f.TempDir()
	f.Fuzz(func(t *testing.T, tail []byte) {
		// The first word keeps to this format, whatever else GDAL could guess.
		path := filepath.Join(dir, fmt.Sprintf("%d.asc", os.Getpid()))
		if err := os.WriteFile(path, append([]byte("ncols"), tail...), 0o600); err != nil {
			t.Fatal(err)
		}
		few, lastFew := digest(t, path, 7)
		many, lastMany := digest(t, path, 4096)
		if few != many || (lastFew == nil) != (lastMany == nil) {
			t.Errorf("batches of 7 give %v and %v, batches of 4096 %v and %v", few, lastFew, many, lastMany)
		}
	})
}

// digest sums the points of a grid, up to a bound, and checks each.
func digest(t *testing.T, path string, n int) (sum [2]float64, err error) {
	r, err := Open(path, Options{})
	if err != nil {
		return sum, err
	}
	defer r.Close()
	b := terrain.NewBatch(n, 0)
	for sum[0] < 28672 { // 4096·7
		err := r.Read(b)
		if errors.Is(err, io.EOF) {
			return sum, nil
		}
		if err != nil {
			return sum, err
		}
		for _, z := range b.Z {
			if !(math.Abs(z) <= maxHeight) {
				t.Fatalf("height %g", z)
			}
			sum[0]++
			if sum[0] <= 28672 {
				sum[1] += z
			}
		}
		if b.Len() == 0 {
			return sum, nil
		}
	}
	sum[0] = 28672
	return sum, nil
}
