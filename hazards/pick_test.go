package hazards

import (
	"context"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
)

// The picked set is what the definition gives when every pair is looked at:
// best first, ties by cell, none nearer than two radii to one before.
func TestPickAgainstDefinition(t *testing.T) {
	g, obstacles := rubble(t, 1.5)
	p, _ := Example("ledge")
	j := newJudge(g.surface, g.planes, obstacles, &p)
	scores, err := j.scores(context.Background(), fit.Work{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	coarse := make([]float64, len(scores)) // many ties
	for i, s := range scores {
		coarse[i] = float64(int(4*s+0.999)) / 4
	}
	for name, scores := range map[string][]float64{"scores": scores, "tied": coarse} {
		var order []int32
		for v, s := range scores {
			if s > 0 {
				order = append(order, int32(v))
			}
		}
		slices.SortStableFunc(order, func(a, b int32) int {
			switch {
			case scores[a] > scores[b]:
				return -1
			case scores[a] < scores[b]:
				return 1
			}
			return g.surface.Voxels.Cells[a].Compare(g.surface.Voxels.Cells[b])
		})
		var want []int32
		for _, v := range order {
			free := true
			for _, w := range want {
				free = free && r3.Norm(r3.Sub(j.centre(int(v)), j.centre(int(w)))) >= 2*p.FootprintRadiusM
			}
			if free {
				want = append(want, v)
			}
		}
		got, err := j.pick(context.Background(), scores)
		if err != nil {
			t.Fatal(err)
		}
		if len(want) < 3 || !slices.Equal(got, want) {
			t.Errorf("%s: picked %v, want %v", name, got, want)
		}
	}
}

func TestPickCancelled(t *testing.T) {
	g, _ := rubble(t, 0.6)
	p, _ := Example("ledge")
	j := newJudge(g.surface, g.planes, nil, &p)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	scores := make([]float64, g.surface.Voxels.Len())
	for i := range scores {
		scores[i] = 1
	}
	if _, err := j.pick(ctx, scores); err == nil {
		t.Error("not cancelled")
	}
	if _, err := j.zones(ctx, scores, nil); err == nil {
		t.Error("not cancelled")
	}
}
