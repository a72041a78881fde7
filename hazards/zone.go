package hazards

import (
	"context"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// bridgeCells is how far apart the cells of connected voxels may be on each
// axis: neighbours by face, edge or corner, or with up to two cells between.
const bridgeCells = 3

// zones joins the voxels whose footprint scores above 0 to connected zones,
// sorted by id. Every patch lies in exactly one. A zone is named after the first
// of its voxels, so pieces of a zone found in different tiles join under the
// lowest cell of any.
func (j *judge) zones(ctx context.Context, scores []float64, patches []Patch) ([]Zone, error) {
	var usable []int32
	for v, s := range scores {
		if s > 0 {
			usable = append(usable, int32(v))
		}
	}
	labels, err := connected(ctx, j.voxels.Cells, usable, bridgeCells)
	if err != nil {
		return nil, err
	}

	zoneOf := make(map[int32]int) // by the zone's first voxel
	var zones []Zone
	var normals, horizontals []fit.Directions
	for i, v := range usable {
		if i%chunkVoxels == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		at, ok := zoneOf[labels[i]]
		if !ok {
			at = len(zones)
			zoneOf[labels[i]] = at
			zones = append(zones, Zone{})
			normals = append(normals, fit.Directions{})
			horizontals = append(horizontals, fit.Directions{})
		}
		z := &zones[at]
		z.Voxels = append(z.Voxels, v)
		z.AreaM2 += columnArea(j.index, j.planes.Normal[v], int(v), func(i int) bool { return scores[i] > 0 })
		z.MeanScore += scores[v]
		z.BestScore = max(z.BestScore, scores[v])
		n := j.planes.Normal[v]
		normals[at].Add(n)
		if _, ok := fit.DipDirectionDeg(n); ok {
			horizontals[at].Add(r3.Unit(r3.Vec{X: n.X, Y: n.Y}))
		}
	}

	firsts := make([]terrain.Cell, len(zones))
	for at := range zones {
		z := &zones[at]
		z.MeanScore /= float64(len(z.Voxels))
		mean, _, _ := normals[at].Mean()
		z.InclinationDeg = fit.InclinationDeg(mean)
		z.DipDirectionDeg, _ = fit.DipDirectionDeg(mean)
		z.SpreadDeg = normals[at].DispersionDeg()
		z.Concentration = orNaN(normals[at].Concentration())
		z.DipDirectionMeanDeg, z.DipDirectionSpreadDeg = math.NaN(), math.NaN()
		if m, _, ok := horizontals[at].Mean(); ok {
			z.DipDirectionMeanDeg = orNaN(fit.DipDirectionDeg(m))
			z.DipDirectionSpreadDeg = orNaN(horizontals[at].CircularDeviationDeg())
		}
		firsts[at] = j.voxels.Cells[z.Voxels[0]]
	}
	for at, id := range IDs(zonePrefix, j.voxels.Lattice, firsts) {
		zones[at].ID = id
	}
	best := make([]*Patch, len(zones))
	for p := range patches {
		i, _ := slices.BinarySearch(usable, patches[p].Voxel)
		at := zoneOf[labels[i]]
		zones[at].PatchCount++
		if b := best[at]; b == nil || patches[p].Score > b.Score ||
			patches[p].Score == b.Score && patches[p].Voxel < b.Voxel {
			best[at] = &patches[p]
		}
	}
	for at, b := range best {
		if b != nil {
			zones[at].BestPatch, zones[at].BestScore = b.ID, b.Score
		}
	}
	slices.SortFunc(zones, func(a, b Zone) int { return strings.Compare(a.ID, b.ID) })
	return zones, nil
}

func orNaN(v float64, ok bool) float64 {
	if !ok {
		return math.NaN()
	}
	return v
}

// connected labels the listed cells, which like list are in the order of
// Cell.Compare, by connected set: two cells belong together if on no axis their
// indices differ by more than reach. The label is the lowest index into cells
// of a set.
//
// For each of the rows before a cell's own that lie within reach, a cursor
// follows the cell as it moves through the list and never turns back, so the
// cost is a few steps per cell and row.
func connected(ctx context.Context, cells []terrain.Cell, list []int32, reach int32) ([]int32, error) {
	parent := make([]int32, len(list))
	root := func(i int32) int32 {
		for parent[i] != i {
			parent[i] = parent[parent[i]]
			i = parent[i]
		}
		return i
	}
	type cursor struct {
		dj, dk int32
		at     int
	}
	var rows []cursor
	for dk := -reach; dk <= 0; dk++ {
		for dj := -reach; dj <= reach && (dk < 0 || dj <= 0); dj++ {
			rows = append(rows, cursor{dj: dj, dk: dk})
		}
	}
	for i := range list {
		if i%chunkVoxels == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		parent[i] = int32(i)
		c := cells[list[i]]
		mine := int32(i)
		for r := range rows {
			row := &rows[r]
			first := terrain.Cell{I: c.I - reach, J: c.J + row.dj, K: c.K + row.dk}
			for cells[list[row.at]].Compare(first) < 0 {
				row.at++
			}
			for n := row.at; n < i; n++ {
				o := cells[list[n]]
				if o.J != first.J || o.K != first.K || o.I > c.I+reach {
					break
				}
				// The lower index becomes the root, so labels are lowest.
				if other := root(int32(n)); other < mine {
					parent[mine] = other
					mine = other
				} else if other > mine {
					parent[other] = mine
				}
			}
		}
	}
	labels := make([]int32, len(list))
	for i := range list {
		labels[i] = list[root(int32(i))]
	}
	return labels, nil
}
