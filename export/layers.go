package export

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/hazards"
)

// A Table is a layer with its features, in working coordinates. The tables of
// one call of Tables share scratch memory: only one goroutine may write them.
type Table struct {
	Layer
	Features []Feature
	shape    func(i int, dense bool) shape // plan outline; dense: with a vertex at every cell
}

// A Feature is one row of a Table. Its geometry is made when it is written.
type Feature struct {
	ID     string
	Values []any // one for each of the layer's fields: string, int64, float64, bool or nil
}

// Tables returns the layers of a site: obstacles, patches, zones and site.
// Features have the order of the findings.
func Tables(s *Site) ([]*Table, error) {
	if s.Voxels == nil || s.Voxels.Len() == 0 {
		return nil, fmt.Errorf("export: site %q has no voxels", s.Name)
	}
	if err := s.checkVoxels(); err != nil {
		return nil, err
	}
	o := &outliner{voxels: s.Voxels}
	f := &s.Findings
	tables := []*Table{
		table(obstacleLayer(), obstacleColumns(), obstacleRows(s), func(r *obstacleRow) string { return r.ID }),
		table(patchLayer(), patchColumns(), patchRows(s), func(r *patchRow) string { return r.ID }),
		table(zoneLayer(), zoneColumns(), zoneRows(s), func(r *zoneRow) string { return r.ID }),
		table(siteLayer(), siteColumns(), []siteRow{newSiteRow(s)}, func(*siteRow) string { return "site" }),
	}
	tables[0].shape = func(i int, dense bool) shape { return o.outline(f.Obstacles[i].Voxels, dense) }
	tables[1].shape = func(i int, dense bool) shape { return o.outline(f.Patches[i].Voxels, dense) }
	tables[2].shape = func(i int, dense bool) shape { return o.outline(f.Zones[i].Voxels, dense) }
	tables[3].shape = func(_ int, dense bool) shape { return o.survey(dense) }
	return tables, nil
}

// checkVoxels makes sure that every finding lies on voxels of the site, so that
// every feature has a geometry.
func (s *Site) checkVoxels() error {
	check := func(id string, voxels []int32) error {
		if len(voxels) == 0 {
			return fmt.Errorf("export: %s has no voxels", id)
		}
		for _, v := range voxels {
			if v < 0 || int(v) >= s.Voxels.Len() {
				return fmt.Errorf("export: %s: voxel %d is not one of %d", id, v, s.Voxels.Len())
			}
		}
		return nil
	}
	for i := range s.Findings.Obstacles {
		if err := check(s.Findings.Obstacles[i].ID, s.Findings.Obstacles[i].Voxels); err != nil {
			return err
		}
	}
	for i := range s.Findings.Patches {
		if err := check(s.Findings.Patches[i].ID, s.Findings.Patches[i].Voxels); err != nil {
			return err
		}
	}
	for i := range s.Findings.Zones {
		if err := check(s.Findings.Zones[i].ID, s.Findings.Zones[i].Voxels); err != nil {
			return err
		}
	}
	return nil
}

func table[T any](l Layer, columns []column[T], rows []T, id func(*T) string) *Table {
	t := &Table{Layer: describe(l, columns), Features: make([]Feature, len(rows))}
	for i := range rows {
		t.Features[i] = Feature{ID: id(&rows[i]), Values: values(&rows[i], columns)}
	}
	return t
}

// An obstacleRow is an obstacle with what its columns need besides.
type obstacleRow struct {
	*hazards.Obstacle
	quat        [4]float64 // w, x, y, z
	inflatedByM float64
}

func obstacleRows(s *Site) []obstacleRow {
	rows := make([]obstacleRow, len(s.Findings.Obstacles))
	for i := range rows {
		o := &s.Findings.Obstacles[i]
		w, x, y, z := o.Ellipsoid.Quaternion()
		rows[i] = obstacleRow{Obstacle: o, quat: [4]float64{w, x, y, z}, inflatedByM: s.InflatedByM}
	}
	return rows
}

// A patchRow is a patch with what its columns need besides.
type patchRow struct {
	*hazards.Patch
	rank    int
	zone    string // empty if it lies in none
	radiusM float64
}

func patchRows(s *Site) []patchRow {
	// By the centres of patches: zones can hold most voxels of a survey.
	zoneOf := make(map[int32]string, len(s.Findings.Patches))
	for i := range s.Findings.Patches {
		zoneOf[s.Findings.Patches[i].Voxel] = ""
	}
	for i := range s.Findings.Zones {
		for _, v := range s.Findings.Zones[i].Voxels {
			if _, ok := zoneOf[v]; ok {
				zoneOf[v] = s.Findings.Zones[i].ID
			}
		}
	}
	rows := make([]patchRow, len(s.Findings.Patches))
	order := make([]int, len(rows))
	for i := range rows {
		p := &s.Findings.Patches[i]
		rows[i] = patchRow{Patch: p, zone: zoneOf[p.Voxel], radiusM: s.Profile.FootprintRadiusM}
		order[i] = i
	}
	slices.SortFunc(order, func(a, b int) int {
		return cmp.Or(cmp.Compare(rows[b].Score, rows[a].Score), strings.Compare(rows[a].ID, rows[b].ID))
	})
	for rank, i := range order {
		rows[i].rank = rank + 1
	}
	return rows
}

// A zoneRow is a zone with what its columns need besides.
type zoneRow struct {
	*hazards.Zone
	centre     r3.Vec // mean of its voxels' means
	normal     r3.Vec // from inclination and dip direction
	hMin, hMax float64
}

func zoneRows(s *Site) []zoneRow {
	rows := make([]zoneRow, len(s.Findings.Zones))
	for i := range rows {
		z := &s.Findings.Zones[i]
		row := zoneRow{Zone: z, normal: fit.NormalOf(z.InclinationDeg, z.DipDirectionDeg), hMin: math.Inf(1), hMax: math.Inf(-1)}
		var mean r3.Vec // running mean: a plain sum of northings would lose digits
		for n, v := range z.Voxels {
			p := s.Voxels.Mean(int(v))
			mean = r3.Add(mean, r3.Scale(1/float64(n+1), r3.Sub(p, mean)))
			row.hMin, row.hMax = min(row.hMin, p.Z), max(row.hMax, p.Z)
		}
		row.centre = mean
		rows[i] = row
	}
	return rows
}

// A siteRow is the survey as a whole.
type siteRow struct {
	*Site
	points             int64
	voxels             int
	eMin, nMin, hMin   float64
	eMax, nMax, hMax   float64
	obstacles, patches int
	zones              int
}

func newSiteRow(s *Site) siteRow {
	e := s.Voxels.Extent()
	return siteRow{
		Site: s, points: s.Voxels.Points(), voxels: s.Voxels.Len(),
		eMin: e.Min[0], nMin: e.Min[1], hMin: e.Min[2],
		eMax: e.Max[0], nMax: e.Max[1], hMax: e.Max[2],
		obstacles: len(s.Findings.Obstacles), patches: len(s.Findings.Patches), zones: len(s.Findings.Zones),
	}
}
