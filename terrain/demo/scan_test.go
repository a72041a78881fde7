package demo

import (
	"context"
	"encoding/binary"
	"errors"
	"hash/fnv"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// points collects the true positions of a scan.
func points(t *testing.T, se *Season, o ScanOptions, keep func(r3.Vec)) int {
	t.Helper()
	n := 0
	err := se.Scan(context.Background(), o, 2, func(b *terrain.Batch) error {
		n += b.Len()
		for i := range b.X {
			keep(se.FromDelivered(r3.Vec{X: b.X[i], Y: b.Y[i], Z: b.Z[i]}))
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return n
}

func TestScanLiesOnTheSurface(t *testing.T) {
	for n := 1; n <= Seasons; n++ {
		se := NewSite(1).Season(n)
		shrub := se.Truth().Scatter[0]
		off, leaves := 0, 0
		const want = 200_000
		got := points(t, se, ScanOptions{Points: want}, func(p r3.Vec) {
			d := math.Abs(se.SignedDistance(p))
			switch {
			case d < 6*DefaultNoiseM*math.Sqrt(3):
			case r3.Norm(r3.Sub(p, shrub.Centre.Vec())) < shrub.RadiusM+0.05:
				leaves++
			default:
				off++
			}
		})
		if math.Abs(float64(got)-want) > 0.05*want {
			t.Errorf("season %d: %d points, want about %d", n, got, want)
		}
		// A stray is 0.5 to 8 m short; few of these end next to a surface.
		mean := DefaultStrays * float64(got)
		if f := float64(off); f < mean-5*math.Sqrt(mean) || f > mean+5*math.Sqrt(mean) {
			t.Errorf("season %d: %d strays, want about %.0f", n, off, mean)
		}
		if leaves < 20 {
			t.Errorf("season %d: %d points in the shrub", n, leaves)
		}
	}
}

func TestScanWithoutNoiseIsExact(t *testing.T) {
	for n := 1; n <= Seasons; n++ {
		se := NewSite(1).Season(n)
		shrub := se.Truth().Scatter[0]
		worst := 0.0
		points(t, se, ScanOptions{Points: 50_000, NoiseM: -1, Strays: -1}, func(p r3.Vec) {
			if r3.Norm(r3.Sub(p, shrub.Centre.Vec())) > shrub.RadiusM {
				worst = max(worst, math.Abs(se.SignedDistance(p)))
			}
		})
		if worst > 1e-6 {
			t.Errorf("season %d: a point lies %g m off the surface", n, worst)
		}
	}
}

// Least squares planes through the points of the known planes, by gonum's
// symmetric eigenproblem, give their attitude and the noise.
func TestKnownPlanesFit(t *testing.T) {
	for n := 1; n <= Seasons; n++ {
		se := NewSite(1).Season(n)
		planes := se.Truth().Planes
		type sums struct {
			n    float64
			mean r3.Vec
			m    [6]float64
		}
		all := make([]sums, len(planes))
		points(t, se, ScanOptions{Points: 1_200_000}, func(p r3.Vec) {
			for i := range planes {
				if !planes[i].Box.Contains(p, 0) {
					continue
				}
				s, q := &all[i], r3.Sub(p, planes[i].Point.Vec())
				s.n++
				s.mean = r3.Add(s.mean, q)
				for j, v := range [6]float64{q.X * q.X, q.X * q.Y, q.X * q.Z, q.Y * q.Y, q.Y * q.Z, q.Z * q.Z} {
					s.m[j] += v
				}
				break
			}
		})
		for i, s := range all {
			pl := planes[i]
			if s.n < 2000 {
				t.Errorf("season %d, %s: %.0f points", n, pl.Name, s.n)
				continue
			}
			c := r3.Scale(1/s.n, s.mean)
			cov := mat.NewSymDense(3, []float64{
				s.m[0]/s.n - c.X*c.X, s.m[1]/s.n - c.X*c.Y, s.m[2]/s.n - c.X*c.Z,
				0, s.m[3]/s.n - c.Y*c.Y, s.m[4]/s.n - c.Y*c.Z,
				0, 0, s.m[5]/s.n - c.Z*c.Z,
			})
			var e mat.EigenSym
			if !e.Factorize(cov, true) {
				t.Fatal("no eigenvectors")
			}
			var v mat.Dense
			e.VectorsTo(&v)
			normal := r3.Vec{X: v.At(0, 0), Y: v.At(1, 0), Z: v.At(2, 0)}
			if r3.Dot(normal, pl.Normal.Vec()) < 0 {
				normal = r3.Scale(-1, normal)
			}
			if got := inclinationDeg(normal); math.Abs(got-pl.InclinationDeg) > 0.01 {
				t.Errorf("season %d, %s: inclination %.4f°, want %.4f°", n, pl.Name, got, pl.InclinationDeg)
			}
			// The azimuth of a gentle plane is as much worse as its sine is small.
			sin, _ := sincosDeg(pl.InclinationDeg)
			if got := azimuth(normal); math.Abs(got-pl.DipDirectionDeg) > 0.01/sin {
				t.Errorf("season %d, %s: dip direction %.4f°, want %.4f°", n, pl.Name, got, pl.DipDirectionDeg)
			}
			// 1 %, or 4 standard errors of a standard deviation.
			rms := math.Sqrt(e.Values(nil)[0] * s.n / (s.n - 3))
			if tol := max(0.01, 4/math.Sqrt(2*s.n)); math.Abs(rms/DefaultNoiseM-1) > tol {
				t.Errorf("season %d, %s: noise %.6f m, want %g", n, pl.Name, rms, DefaultNoiseM)
			}
		}
	}
}

func TestRangeNoiseLiesAlongTheRay(t *testing.T) {
	se := NewSite(1).Season(1)
	collect := func(o ScanOptions) (p []r3.Vec) {
		o.Points, o.Strays = 20_000, -1
		err := se.ScanStation(context.Background(), 1, o, 1, func(b *terrain.Batch) error {
			for i := range b.X {
				p = append(p, r3.Vec{X: b.X[i], Y: b.Y[i], Z: b.Z[i]})
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		return p
	}
	from := se.Stations()[1]
	noisy, sum := collect(ScanOptions{RangeNoise: true, NoiseM: 0.02}), 0.0
	for _, p := range noisy {
		// On the ray and near the surface, by up to 6 sigma.
		ray := r3.Sub(p, from)
		dir := r3.Unit(ray)
		site := se.site
		u, _, ok := se.first(site.toSite(from), r3.Sub(site.toSite(r3.Add(from, dir)), site.toSite(from)), make([]int, 0, 64))
		if ok && math.Abs(r3.Norm(ray)-u) < 0.12 {
			sum += sq(r3.Norm(ray) - u)
		}
	}
	n := float64(len(noisy))
	got := math.Sqrt(sum / n)
	if math.Abs(got/0.02-1) > 4/math.Sqrt(2*n) { // standard errors
		t.Errorf("noise along the ray is %.5f m, want 0.02", got)
	}
}

// fingerprint hashes every column of a scan.
func fingerprint(t *testing.T, s *Site, season, workers int) uint64 {
	t.Helper()
	h := fnv.New64a()
	var buf []byte
	err := s.Season(season).Scan(context.Background(), ScanOptions{Points: 60_000}, workers, func(b *terrain.Batch) error {
		buf = buf[:0]
		for i := range b.X {
			for _, v := range [3]float64{b.X[i], b.Y[i], b.Z[i]} {
				buf = binary.LittleEndian.AppendUint64(buf, math.Float64bits(v))
			}
			for _, v := range [4]uint16{b.Intensity[i], b.Red[i], b.Green[i], b.Blue[i]} {
				buf = binary.LittleEndian.AppendUint16(buf, v)
			}
			buf = append(buf, b.Class[i], byte(b.Flags[i]), b.Return[i], b.Returns[i])
		}
		_, err := h.Write(buf)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return h.Sum64()
}

func TestScanIsTheSameForAnyWorkers(t *testing.T) {
	want := fingerprint(t, NewSite(7), 1, 1)
	for _, workers := range []int{0, 2, 3, 8} {
		if got := fingerprint(t, NewSite(7), 1, workers); got != want {
			t.Errorf("%d workers: another scan", workers)
		}
	}
	if fingerprint(t, NewSite(8), 1, 2) == want {
		t.Error("another seed: the same scan")
	}
	if fingerprint(t, NewSite(7), 2, 2) == want {
		t.Error("another season: the same scan")
	}
}

// The stations at the foot cannot see the treads of ledges; the masts can, and
// cannot see under roofs.
func TestScanHasShadowsAndUnevenDensity(t *testing.T) {
	se := NewSite(1).Season(1)
	ledge := se.truth.Ledges[3]
	var roof Box
	for _, o := range se.truth.Obstacles {
		if o.Name == "Gullet roof" {
			roof = o.Box
		}
	}
	tread := make([]int, len(se.setups))
	under := make([]int, len(se.setups))
	density := map[string]float64{}
	for i := range se.setups {
		err := se.ScanStation(context.Background(), i, ScanOptions{Points: 400_000, NoiseM: -1, Strays: -1}, 2, func(b *terrain.Batch) error {
			for j := range b.X {
				p := r3.Vec{X: b.X[j], Y: b.Y[j], Z: b.Z[j]}
				// 0.1 m into the bay is on no riser.
				if ledge.Bay.Contains(p, -0.1) {
					tread[i]++
				}
				if roof.Contains(p, 0.02) && se.NormalAt(p).Z < -0.5 {
					under[i]++
				}
				for _, pl := range se.truth.Planes {
					if pl.Box.Contains(p, 0) {
						density[pl.Name] += 1 / (4 * pl.Box.HalfM[0] * pl.Box.HalfM[1])
					}
				}
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		mast := se.setups[i].at.Z > 20
		if mast != (tread[i] > 50) || !mast && tread[i] > 0 {
			t.Errorf("station %d has %d points on the tread of %s", i, tread[i], ledge.Name)
		}
		if mast && under[i] > 0 {
			t.Errorf("station %d has %d points under the roof", i, under[i])
		}
	}
	if under[0]+under[1]+under[2] < 20 {
		t.Errorf("%v points under the roof", under)
	}
	if a, b := density["east face"], density["side face"]; a < 2*b {
		t.Errorf("density %.0f and %.0f points per m²", a, b)
	}
}

func TestScanStops(t *testing.T) {
	se := NewSite(1).Season(1)
	o := ScanOptions{Points: 20_000}
	broken := errors.New("disk full")
	for _, workers := range []int{1, 3} {
		calls := 0
		err := se.Scan(context.Background(), o, workers, func(*terrain.Batch) error { calls++; return broken })
		if !errors.Is(err, broken) || calls != 1 {
			t.Errorf("after %d calls: %v", calls, err)
		}
		ctx, cancel := context.WithCancel(context.Background())
		calls = 0
		err = se.Scan(ctx, o, workers, func(*terrain.Batch) error { calls++; cancel(); return nil })
		if !errors.Is(err, context.Canceled) || calls != 1 {
			t.Errorf("cancelled, after %d calls: %v", calls, err)
		}
	}
	if err := se.Scan(context.Background(), ScanOptions{Points: -1}, 1, nil); err == nil {
		t.Error("a negative number of points is accepted")
	}
}

func BenchmarkScan(b *testing.B) {
	se := NewSite(1).Season(1)
	n := 0
	b.ReportAllocs()
	for b.Loop() {
		n = 0
		err := se.Scan(context.Background(), ScanOptions{Points: 300_000}, 2, func(b *terrain.Batch) error { n += b.Len(); return nil })
		if err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(n), "ns/point")
}
