package export

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// Values have their fields' types, and null only where the field says so.
func TestTablesTypes(t *testing.T) {
	tables, err := Tables(testSite(t, 0.1, 600000, 5200000, 20))
	if err != nil {
		t.Fatal(err)
	}
	for _, table := range tables {
		for _, f := range table.Features {
			for i, field := range table.Fields {
				var ok bool
				switch v := f.Values[i].(type) {
				case nil:
					ok = field.Null != ""
				case string:
					ok = field.Type == Text
				case int64:
					ok = field.Type == Integer
				case bool:
					ok = field.Type == Boolean
				case float64:
					ok = field.Type == Real && !math.IsNaN(v) && !math.IsInf(v, 0)
				}
				if !ok {
					t.Errorf("%s: %s: %s is %#v, a %s with null %q", table.Name, f.ID, field.Name, f.Values[i], field.Type, field.Null)
				}
			}
		}
	}
}

// A point of the ellipsoid's surface, found from the written quaternion and
// semi-axes, is where the ellipsoid's own axes put it.
func TestObstacleEllipsoidFromValues(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	value := make(map[string]float64)
	for i, f := range tables[0].Fields {
		if v, ok := tables[0].Features[0].Values[i].(float64); ok {
			value[f.Name] = v
		}
	}
	w, x, y, z := value["quat_w"], value["quat_x"], value["quat_y"], value["quat_z"]
	// The textbook matrix of a unit quaternion.
	rotate := func(v r3.Vec) r3.Vec {
		return r3.Vec{
			X: (1-2*(y*y+z*z))*v.X + 2*(x*y-w*z)*v.Y + 2*(x*z+w*y)*v.Z,
			Y: 2*(x*y+w*z)*v.X + (1-2*(x*x+z*z))*v.Y + 2*(y*z-w*x)*v.Z,
			Z: 2*(x*z-w*y)*v.X + 2*(y*z+w*x)*v.Y + (1-2*(x*x+y*y))*v.Z,
		}
	}
	e := &s.Findings.Obstacles[0].Ellipsoid
	for i, unit := range [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}} {
		axis := [3]string{"semi_axis_1_m", "semi_axis_2_m", "semi_axis_3_m"}[i]
		got := r3.Scale(value[axis], rotate(unit))
		if want := r3.Scale(e.SemiAxes[i], e.Axes[i]); r3.Norm(r3.Sub(got, want)) > 1e-14 {
			t.Errorf("%s: %v, want %v", axis, got, want)
		}
	}
	// Axis 1 is (0.6, 0.8, 0): azimuth atan2(0.6, 0.8).
	if got, want := value["axis_1_trend_deg"], math.Atan2(0.6, 0.8)*180/math.Pi; math.Abs(got-want) > 1e-12 {
		t.Errorf("axis_1_trend_deg %v, want %v", got, want)
	}
	if got := value["axis_3_plunge_deg"]; got != 90 {
		t.Errorf("axis_3_plunge_deg %v, want 90", got)
	}
}

func TestTablesErrors(t *testing.T) {
	tests := []struct {
		name   string
		change func(*Site)
		want   string
	}{
		{"no voxels", func(s *Site) { s.Voxels = nil }, "has no voxels"},
		{"empty voxels", func(s *Site) { s.Voxels = &terrain.Voxels{} }, "has no voxels"},
		{"obstacle without voxels", func(s *Site) { s.Findings.Obstacles[0].Voxels = nil }, "bulge-1 has no voxels"},
		{"patch beyond", func(s *Site) { s.Findings.Patches[1].Voxels[0] = 1 << 30 }, "patch-2: voxel 1073741824"},
		{"zone before", func(s *Site) { s.Findings.Zones[0].Voxels[0] = -1 }, "zone-1: voxel -1"},
	}
	for _, tt := range tests {
		s := testSite(t, 0.1, 600000, 5200000, 20)
		tt.change(s)
		if _, err := Tables(s); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: error %v, want %q in it", tt.name, err, tt.want)
		}
	}
}

// Level ground looks nowhere, and where nothing stands there is no clearance to
// be unsure of: no number would say so.
func TestTablesNull(t *testing.T) {
	s := testSite(t, 0.1, 600000, 5200000, 20)
	f := &s.Findings
	up := r3.Vec{Z: 1}
	f.Obstacles[0].Face.Normal, f.Patches[0].Plane.Normal, f.Zones[0].InclinationDeg = up, up, 0
	tables, err := Tables(s)
	if err != nil {
		t.Fatal(err)
	}
	values := func(name string) (of [3]any) {
		for n, table := range tables[:3] {
			for i, field := range table.Fields {
				if field.Name == name {
					of[n] = table.Features[0].Values[i]
				}
			}
		}
		return of
	}
	if got := values("dip_direction_deg"); got != [3]any{} {
		t.Errorf("dip directions of level ground %v, want null", got)
	}
	if got := values("clearance_sigma_m"); got != [3]any{} {
		t.Errorf("uncertainty %v of the clearance without obstacles, want null", got[1])
	}
	f.Obstacles[0].Face.Normal, f.Patches[0].Plane.Normal, f.Zones[0].InclinationDeg = r3.Vec{X: -0.6, Z: 0.8}, r3.Vec{Y: -1}, 30
	f.Zones[0].DipDirectionDeg = 45
	f.Patches[0].ClearanceM, f.Patches[0].ClearanceSigmaM = 2, 0.05
	if tables, err = Tables(s); err != nil {
		t.Fatal(err)
	}
	for n, want := range [3]float64{270, 180, 45} {
		if got, ok := values("dip_direction_deg")[n].(float64); !ok || math.Abs(got-want) > 1e-9 {
			t.Errorf("%s: dip direction %v, want %g", tables[n].Name, values("dip_direction_deg")[n], want)
		}
	}
	if got := values("clearance_sigma_m")[1]; got != 0.05 {
		t.Errorf("uncertainty of the clearance %v, want 0.05", got)
	}
}
