package hazards_test

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/hazards"
	"ledgework/terrain"
	"ledgework/terrain/gdal"
	"ledgework/terrain/survey"
)

// gridFile is the path of a real elevation grid; the test is skipped without
// the data folder.
func gridFile(t *testing.T, name string) string {
	t.Helper()
	root := os.Getenv("LEDGEWORK_DATA")
	if root == "" {
		t.Skip("LEDGEWORK_DATA is not set: it names the folder of real surveys")
	}
	return filepath.Join(root, "terrain", name)
}

// A raster is one band as it is stored; cells without data are NaN.
type raster struct {
	w, h   int
	place  [6]float64
	values []float64
}

func readRaster(t *testing.T, path string, band int) raster {
	t.Helper()
	d, err := gdal.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer d.Close()
	b, err := d.Band(band)
	if err != nil {
		t.Fatal(err)
	}
	var r raster
	r.w, r.h = d.Size()
	r.place, _ = d.GeoTransform()
	r.values = make([]float64, r.w*r.h)
	valid := make([]uint8, len(r.values))
	if err := b.ReadMasked(0, 0, r.w, r.h, r.values, valid); err != nil {
		t.Fatal(err)
	}
	for i, ok := range valid {
		if ok == 0 {
			r.values[i] = math.NaN()
		}
	}
	return r
}

// window is the cell with its neighbours; NaN beyond the edge.
func (r *raster) window(col, row int) *fit.Window {
	var w fit.Window
	for i := range w {
		c, l := col+i%3-1, row+i/3-1
		w[i] = math.NaN()
		if c >= 0 && c < r.w && l >= 0 && l < r.h {
			w[i] = r.values[l*r.w+c]
		}
	}
	return &w
}

// cellOf is the cell that holds p, in a raster whose rows run east.
func (r *raster) cellOf(p r3.Vec) (col, row int) {
	return int(math.Floor((p.X - r.place[0]) / r.place[1])), int(math.Floor((p.Y - r.place[3]) / r.place[5]))
}

// gridSurface is the surface of a grid at its own scale, by the way that a
// build takes, with defaults.
func gridSurface(t *testing.T, path string, band int) *hazards.Surface {
	t.Helper()
	ctx := context.Background()
	sources := []survey.Source{{Path: path, Band: band}}
	frame, err := survey.Plan(ctx, sources, "auto")
	if err != nil {
		t.Fatal(err)
	}
	l, err := terrain.NewLattice(frame.GridCell)
	if err != nil {
		t.Fatal(err)
	}
	sums := terrain.NewAccumulator(l, 0)
	adder := sums.NewAdder()
	counts, err := survey.Stream(ctx, frame, sources, survey.StreamOptions{Workers: 1}, func(_ int, b *terrain.Batch) error {
		return adder.Add(b)
	}, nil)
	if err != nil {
		t.Fatal(err)
	}
	v := sums.Voxels()
	if v.Points() != counts.Read {
		t.Fatalf("%d of %d cells in voxels", v.Points(), counts.Read)
	}
	o, _ := hazards.ObstacleOptions{}.Resolve(l.SpacingM())
	s, err := hazards.NewSurface(ctx, v, nil, o, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// quantile is the value below which the share q of v lies.
func quantile(v []float64, q float64) float64 {
	s := slices.Sorted(slices.Values(v))
	return s[int(q*float64(len(s)-1))]
}

// differences are by how much one slope exceeds another, cell by cell, in
// degrees.
type differences []float64

// sums are the median and the 90th percentile of the sizes, and the mean with
// its sign.
func (d differences) sums() (half, ninety, mean float64) {
	size := make([]float64, len(d))
	for i, v := range d {
		mean += v / float64(len(d))
		size[i] = math.Abs(v)
	}
	return quantile(size, 0.5), quantile(size, 0.9), mean
}

// steepness is the angle of a plane from the level, whichever side is out.
func steepness(n r3.Vec) float64 {
	i := fit.InclinationDeg(n)
	return min(i, 180-i)
}

// blockPlane is the total least squares plane of the nine points of w.
func blockPlane(w *fit.Window, cell float64) fit.Plane {
	quanta := func(m float64) int64 { return int64(math.Round(m * terrain.QuantaPerMetre)) }
	var m terrain.Moments
	for i, z := range w {
		m.AddPoint(quanta(float64(i%3-1)*cell), quanta(float64(1-i/3)*cell), quanta(z-w[4]))
	}
	p, _ := fit.PlaneFromMoments(&m, r3.Vec{}, len(w))
	return p
}

// leastSquaresSlope is the slope of the regression of height on position over
// the nine points of w.
func leastSquaresSlope(w *fit.Window, cell float64) float64 {
	east := w[2] + w[5] + w[8] - w[0] - w[3] - w[6]
	north := w[0] + w[1] + w[2] - w[6] - w[7] - w[8]
	return fit.GradientSlopeDeg(east/(6*cell), north/(6*cell))
}

// ballSlopes are, over the voxels within radius of voxel i, the slope of the
// regression of height on position, and the slope of the mean of the cells'
// own gradients by Zevenbergen and Thorne.
func ballSlopes(s *hazards.Surface, z *raster, i int, radius float64) (regression, mean float64) {
	c := s.Index.Mean(i)
	members := s.Index.Within(nil, c, radius)
	n := float64(len(members))
	var d, xx r3.Vec // sums; of squares xx, xy, yy
	var xz, yz, east, north float64
	for _, k := range members {
		p := r3.Sub(s.Index.Mean(int(k)), c)
		d = r3.Add(d, p)
		xx = r3.Add(xx, r3.Vec{X: p.X * p.X, Y: p.X * p.Y, Z: p.Y * p.Y})
		xz, yz = xz+p.X*p.Z, yz+p.Y*p.Z
		e, nn := z.window(z.cellOf(s.Index.Mean(int(k)))).ZevenbergenThorne(z.place[1])
		east, north = east+e/n, north+nn/n
	}
	xx = r3.Sub(xx, r3.Vec{X: d.X * d.X / n, Y: d.X * d.Y / n, Z: d.Y * d.Y / n})
	xz, yz = xz-d.X*d.Z/n, yz-d.Y*d.Z/n
	det := xx.X*xx.Z - xx.Y*xx.Y
	return fit.GradientSlopeDeg((xz*xx.Z-yz*xx.Y)/det, (yz*xx.X-xz*xx.Y)/det), fit.GradientSlopeDeg(east, north)
}

// The reference slope of a 10 m grid of mountains in Ecuador (up to 76°) is
// Zevenbergen and Thorne's, of four neighbours. A local plane is another
// measure, and here is how far apart they are and why. Each line changes one
// thing; figures are the median of |difference|:
//
//	0.0000°  the reference by fit.Window, to the rounding of float32
//	0.77°    Horn's eight neighbours: no two public methods agree better
//	1.02°    regression of height on position over the block of nine
//	1.00°    total least squares over the block: distances from the plane,
//	         not heights, are made small, which tips it up by 0.5° on average
//	1.03°    the plane of radius 2 g, the least that reaches all of a block:
//	         on gentle ground it is the block's plane, on ground beyond 60° only
//	         the cells across and not those straight up and down are in reach
//	3.45°    the plane of radius 4 g, the default: it levels out what is
//	         narrower than 80 m and is 3.2° less steep on average
//
// So a plane at the grid's own scale is as far from either finite difference as
// those are from each other and a little more, and half as far where the two
// agree within 0.5°. The last step is smoothing and no error of the fit: the
// slope of the mean of the reference gradients over the very same members is
// 4.2° less than the reference, and total least squares puts 1.1° of that back.
// The difference grows with the plane's own roughness, from 2.0° in the
// smoothest quarter of the cells to 7.6° in the roughest. Who wants the slope
// of single cells has to set surface_radius_m to 2 g.
func TestGridSlope(t *testing.T) {
	path := gridFile(t, "ecuador_ta_10m_5band.tif")
	z, ref := readRaster(t, path, 4), readRaster(t, path, 1)
	s := gridSurface(t, path, 4)
	const g = 10.0
	if s.Voxels.Lattice.SpacingM() != g || s.Planes.RadiusM != 4*g {
		t.Fatalf("spacing %g m, surface radius %g m", s.Voxels.Lattice.SpacingM(), s.Planes.RadiusM)
	}
	near, err := fit.FitLocal(context.Background(), s.Voxels, s.Index, 2*g, fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	var zt, horn, regression, block, tips, radius2, radius4, members, gradients, agree2, agree4 differences
	var roughness []float64
	unfitted, overhanging := 0, 0
	for i := range s.Voxels.Cells {
		col, row := z.cellOf(s.Index.Mean(i))
		w, want := z.window(col, row), ref.values[row*z.w+col]
		h := fit.GradientSlopeDeg(w.Horn(g))
		if math.IsNaN(h + want) { // at the edge or a hole
			continue
		}
		zt = append(zt, fit.GradientSlopeDeg(w.ZevenbergenThorne(g))-want)
		horn = append(horn, h-want)
		regression = append(regression, leastSquaresSlope(w, g)-want)
		b := steepness(blockPlane(w, g).Normal)
		block, tips = append(block, b-want), append(tips, b-leastSquaresSlope(w, g))
		if near.Fitted(i) {
			radius2 = append(radius2, steepness(near.Normal[i])-want)
			if math.Abs(horn[len(horn)-1]) < 0.5 {
				agree2 = append(agree2, radius2[len(radius2)-1])
			}
		} else {
			unfitted++
		}
		p := fit.InclinationDeg(s.Planes.Normal[i])
		if p > 90 {
			overhanging++
		}
		radius4 = append(radius4, p-want)
		if math.Abs(horn[len(horn)-1]) < 0.5 {
			agree4 = append(agree4, p-want)
		}
		roughness = append(roughness, float64(s.Planes.Roughness[i]))
		r, mean := ballSlopes(s, &z, i, 4*g)
		members = append(members, p-r)
		if !math.IsNaN(mean) {
			gradients = append(gradients, p-mean)
		}
	}
	var smooth, rough differences
	quarter, threeQuarters := quantile(roughness, 0.25), quantile(roughness, 0.75)
	for i, r := range roughness {
		if r <= quarter {
			smooth = append(smooth, radius4[i])
		} else if r >= threeQuarters {
			rough = append(rough, radius4[i])
		}
	}
	t.Logf("%d cells; %d have no plane at 2 g, %d overhang at 4 g", len(zt), unfitted, overhanging)
	// Planes need five voxels: a pinnacle has fewer within 2 g.
	if len(zt) < 150000 || unfitted > len(zt)/300 || overhanging > 3 || s.GuessedShare > 0.001 {
		t.Errorf("%d cells, %d without a plane at 2 g, %d overhang, guessed share %g", len(zt), unfitted, overhanging, s.GuessedShare)
	}
	for _, c := range []struct {
		name               string
		got                differences
		half, ninety, mean float64 // as measured
	}{
		{"Zevenbergen-Thorne", zt, 0, 0, 0},
		{"Horn", horn, 0.768, 2.404, -0.314},
		{"regression over nine", regression, 1.023, 3.201, -0.409},
		{"plane of nine", block, 1.003, 3.159, +0.118},
		{"plane less regression of nine", tips, 0.222, 1.153, +0.527},
		{"plane at 2 g", radius2, 1.033, 3.407, -0.354},
		{"plane at 4 g", radius4, 3.449, 10.926, -3.152},
		{"plane at 4 g less regression over its members", members, 0.676, 2.478, +1.102},
		{"plane at 4 g less its members' mean gradient", gradients, 1.197, 3.999, +1.074},
		{"plane at 2 g where Horn agrees", agree2, 0.392, 1.361, -0.023},
		{"plane at 4 g where Horn agrees", agree4, 2.409, 7.355, -2.064},
		{"plane at 4 g where smooth", smooth, 2.043, 5.177, -0.564},
		{"plane at 4 g where rough", rough, 7.625, 18.210, -7.735},
	} {
		// Sums are exact and fits alike on every machine but for fused
		// multiplications: what moves a figure by more is another method.
		const printed = 0.002 // degrees
		half, ninety, mean := c.got.sums()
		t.Logf("%-46s median %.4f° 90th percentile %.4f° mean %+.4f°", c.name, half, ninety, mean)
		if math.Abs(half-c.half) > printed || math.Abs(ninety-c.ninety) > printed || math.Abs(mean-c.mean) > printed {
			t.Errorf("%s: median %.4f°, 90th percentile %.4f°, mean %+.4f°, want %.3f°, %.3f°, %+.3f°", c.name, half, ninety, mean, c.half, c.ninety, c.mean)
		}
	}
	// Half a step of float32 at 64° to 128°, and the rounding of heights.
	const float32Deg = 5e-6
	if d := max(slices.Max(zt), -slices.Min(zt)); d > float32Deg {
		t.Errorf("fit.Window is up to %g° off the reference", d)
	} else {
		t.Logf("fit.Window is up to %.2g° off the reference", d)
	}
}

// metresPerDegree is the length of a degree of longitude and latitude on WGS
// 84, from its radii of curvature.
func metresPerDegree(latDeg float64) (lon, lat float64) {
	const a, f = 6378137.0, 1 / 298.257223563
	const e2 = f * (2 - f)
	s, c := math.Sincos(latDeg * math.Pi / 180)
	w := math.Sqrt(1 - e2*s*s)
	return a * c / w * math.Pi / 180, a * (1 - e2) / (w * w * w) * math.Pi / 180
}

// Grids in degrees, one of them without a CRS, go through the working CRS to
// slopes as they are. The oracle is Horn's slope with the sides of a cell in
// metres. A lattice of the cell's longer side holds up to two cells in a voxel,
// so that planes at 2 g are less steep than Horn by up to half a degree in the
// median, and those of the default radius, 4 g or 370 m here, by up to 3.5°.
func TestGridsInDegrees(t *testing.T) {
	for _, c := range []struct {
		name         string
		naive        float64 // least median of Horn with degrees taken for metres
		half2, half4 float64 // median less Horn's at 2 g and 4 g, as measured
	}{
		{"west_bijou_escarpment.asc", 89.9, -0.23, -0.61},
		{"hintereisferner_srtm_3arcsec.tif", 89.9, -0.17, -3.38},
		{"zion_srtm_3arcsec.tif", 89.9, -0.50, -2.08},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := gridFile(t, c.name)
			z, s := readRaster(t, path, 1), gridSurface(t, path, 0)
			var horn, naive []float64
			for row := range z.h {
				lon, lat := metresPerDegree(z.place[3] + (float64(row)+0.5)*z.place[5])
				for col := range z.w {
					e, n := z.window(col, row).Horn(1)
					if math.IsNaN(e + n) {
						continue
					}
					horn = append(horn, fit.GradientSlopeDeg(e/(lon*z.place[1]), n/(-lat*z.place[5])))
					naive = append(naive, fit.GradientSlopeDeg(e/z.place[1], n/z.place[5]))
				}
			}
			g := s.Voxels.Lattice.SpacingM()
			near, err := fit.FitLocal(context.Background(), s.Voxels, s.Index, 2*g, fit.Work{Workers: 2})
			if err != nil {
				t.Fatal(err)
			}
			var at2, at4 []float64
			for i := range s.Voxels.Cells {
				if near.Fitted(i) {
					at2 = append(at2, steepness(near.Normal[i]))
				}
				at4 = append(at4, fit.InclinationDeg(s.Planes.Normal[i]))
			}
			oracle := quantile(horn, 0.5)
			d2, d4 := quantile(at2, 0.5)-oracle, quantile(at4, 0.5)-oracle
			t.Logf("g %g m, median slope: Horn %.3f°, at 2 g %+.3f°, at 4 g %+.3f°; at 4 g 90 %% are below %.3f°, all below %.3f°",
				g, oracle, d2, d4, quantile(at4, 0.9), quantile(at4, 1))
			const printed = 0.01 // degrees
			if math.Abs(d2-c.half2) > printed || math.Abs(d4-c.half4) > printed {
				t.Errorf("median less Horn's: %+.3f° at 2 g and %+.3f° at 4 g, want %+.2f° and %+.2f°", d2, d4, c.half2, c.half4)
			}
			if quantile(at4, 0.5) > 60 || quantile(at4, 0.99) > 85 || quantile(at2, 0.99) > 85 {
				t.Errorf("too steep: median %.1f°, 99th percentile %.1f° and at 2 g %.1f°", quantile(at4, 0.5), quantile(at4, 0.99), quantile(at2, 0.99))
			}
			if q := quantile(naive, 0.5); q < c.naive {
				t.Errorf("degrees taken for metres give a median slope of %.2f°: the test shows nothing", q)
			}
		})
	}
}
