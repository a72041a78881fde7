package main

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
	"ledgework/terrain/las"
)

// wall is a face of 8 m × 6 m at 62° with a round bulge 0.6 m proud in its
// middle, as points 8 cm apart with 3 mm of noise.
func wall(origin r3.Vec) []r3.Vec {
	const (
		length, height = 8.0, 6.0
		step, noise    = 0.08, 0.003
		bulge          = 0.6
		inclination    = 62 * math.Pi / 180
	)
	up := r3.Vec{Y: math.Cos(inclination), Z: math.Sin(inclination)}
	out := r3.Vec{Y: -math.Sin(inclination), Z: math.Cos(inclination)}
	rng := rand.New(rand.NewPCG(1, 1))
	var points []r3.Vec
	for v := 0.0; v < height; v += step {
		for u := 0.0; u < length; u += step {
			a, b := u+step*(rng.Float64()-0.5), v+step*(rng.Float64()-0.5)
			h := noise * rng.NormFloat64()
			if d := math.Hypot(a-length/2, b-height/2); d < bulge {
				h += math.Sqrt(bulge*bulge - d*d)
			}
			p := r3.Add(r3.Scale(b, up), r3.Scale(h, out))
			p.X = a
			points = append(points, r3.Add(origin, p))
		}
	}
	return points
}

// writeSurveys writes the surveys that the scripts use into dir:
//
//	wall.csv        the wall, in local coordinates
//	wall.las        the wall in the form of EPSG:32633
//	part1.las, …    the same points in two files
//	far.las         the wall, 50 km to the north
//	empty.las       nothing
//	magic.las       no survey
//	truncated.las   wall.las without its last third
//	nan.csv         the wall with a coordinate that is not finite
func writeSurveys(dir string) error {
	origin := r3.Vec{X: 412000, Y: 6543000, Z: 10}
	points := wall(origin)
	half := len(points) / 2
	whole, err := lasOf(points)
	if err != nil {
		return err
	}
	first, err1 := lasOf(points[:half])
	second, err2 := lasOf(points[half:])
	far, err3 := lasOf(wall(r3.Add(origin, r3.Vec{Y: 50e3})))
	local := csvOf(wall(r3.Vec{}))
	return errors.Join(err1, err2, err3,
		os.WriteFile(filepath.Join(dir, "wall.csv"), local, 0o644),
		os.WriteFile(filepath.Join(dir, "nan.csv"), append(local, "nan,1,2\n"...), 0o644),
		os.WriteFile(filepath.Join(dir, "wall.las"), whole, 0o644),
		os.WriteFile(filepath.Join(dir, "part1.las"), first, 0o644),
		os.WriteFile(filepath.Join(dir, "part2.las"), second, 0o644),
		os.WriteFile(filepath.Join(dir, "far.las"), far, 0o644),
		os.WriteFile(filepath.Join(dir, "empty.las"), nil, 0o644),
		os.WriteFile(filepath.Join(dir, "magic.las"), []byte("\x7fELF\x02\x01\x01\x00 no survey at all"), 0o644),
		os.WriteFile(filepath.Join(dir, "truncated.las"), whole[:len(whole)*2/3], 0o644),
	)
}

func csvOf(points []r3.Vec) []byte {
	var b bytes.Buffer
	b.WriteString("x,y,z\n")
	for _, p := range points {
		fmt.Fprintf(&b, "%.4f,%.4f,%.4f\n", p.X, p.Y, p.Z)
	}
	return b.Bytes()
}

func lasOf(points []r3.Vec) ([]byte, error) {
	f, err := os.CreateTemp("", "ledgework-*.las")
	if err != nil {
		return nil, err
	}
	defer os.Remove(f.Name())
	defer f.Close()
	w, err := las.NewWriter(f, las.WriterOptions{
		PointFormat: 6,
		Scale:       [3]float64{1e-4, 1e-4, 1e-4},
		Offset:      [3]float64{math.Floor(points[0].X), math.Floor(points[0].Y), 0},
		WKT:         demoWKT,
	})
	if err != nil {
		return nil, err
	}
	b := terrain.NewBatch(len(points), 0)
	b.Resize(len(points))
	for i, p := range points {
		b.X[i], b.Y[i], b.Z[i] = p.X, p.Y, p.Z
	}
	if err := errors.Join(w.Write(b), w.Close()); err != nil {
		return nil, err
	}
	return os.ReadFile(f.Name())
}
