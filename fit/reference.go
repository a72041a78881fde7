package fit

import (
	"context"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// Relief is how far each voxel of a survey stands out of its reference face.
type Relief struct {
	// Height is the signed distance of the voxel's mean from the face, outward
	// positive, in metres; NaN where no face was found within the radius.
	Height []float64
	// Normal is the face's outward unit normal there, the zero vector where
	// there is no face.
	Normal []r3.Vec
}

// A ReliefInput is what FindRelief works from: three views of one survey.
type ReliefInput struct {
	At *terrain.Voxels // where relief is wanted

	Members *terrain.Index // coarser voxels that faces are fitted to
	Planes  *LocalPlanes   // at Members, outward

	Centres *terrain.Voxels // still coarser: faces are found around each of their means
	Centre  []int32         // for each voxel of At, its voxel in Centres

	RadiusM float64 // R: how far around a voxel its face is looked for
	ProudM  float64 // smallest relief that matters, for the robust fits' scale
}

// FindRelief finds the reference faces around each centre and measures the
// voxels of At against them.
//
// A plain plane through everything within R would call every corner of a slope
// a bulge. So the neighbourhood is split into faces first: planes with enough
// members that agree in position and direction, each refined by a robust fit
// (Tukey biweight) and a quadratic term, so that a gently curved wall is no
// bulge either. Where two faces meet, relief is the distance from the solid
// that they bound: the larger of the two distances at an outer corner or crest,
// the smaller at an inner corner or foot; on the step between two parallel
// faces it is zero. A voxel that lies on a face is measured against that alone.
//
// The result does not depend on how the work is shared; progress counts voxels
// of At.
func FindRelief(ctx context.Context, in *ReliefInput, work Work) (*Relief, error) {
	n := in.At.Len()
	out := &Relief{Height: make([]float64, n), Normal: make([]r3.Vec, n)}
	children, starts := groupBy(in.Centre, in.Centres.Len())
	size := func(i int) int { return int(starts[i+1] - starts[i]) }
	err := work.Each(ctx, in.Centres.Len(), size, func() func(int) error {
		w := &reliefWorker{in: in, out: out}
		return func(i int) error {
			w.around(i, children[starts[i]:starts[i+1]])
			return nil
		}
	})
	if err != nil {
		return nil, err
	}
	return out, nil
}

// groupBy returns the indices of group sorted by their group, and where each of
// the n groups starts in them.
func groupBy(group []int32, n int) (members []int32, starts []int32) {
	starts = make([]int32, n+1)
	for _, g := range group {
		starts[g+1]++
	}
	for i := range n {
		starts[i+1] += starts[i]
	}
	members = make([]int32, len(group))
	next := slices.Clone(starts[:n])
	for i, g := range group {
		members[next[g]] = int32(i)
		next[g]++
	}
	return members, starts
}

type reliefWorker struct {
	in     *ReliefInput
	out    *Relief
	near   []int32
	hood   neighbourhood
	faces  []face
	chosen []chosenFace
	close  []int32 // members near the centre's cell
}

// A chosenFace bounds the solid near a centre, in relation to the first.
type chosenFace struct {
	*face
	meets meeting
}

// meeting is how a face meets the primary one.
type meeting uint8

const (
	outer  meeting = iota // corner or crest: the solid is what lies behind both
	inner                 // inner corner or foot: the solid is what lies behind either
	offset                // the surface runs from one to the other
)

func (w *reliefWorker) around(centre int, voxels []int32) {
	c := w.in.Centres.Mean(centre)
	w.gather(c)
	w.faces = w.hood.findFaces(w.faces, w.in.RadiusM, w.in.ProudM)
	w.choose()
	w.gatherClose(w.in.Centres.Lattice.Centre(w.in.Centres.Cells[centre]), c)
	for _, v := range voxels {
		if len(w.chosen) == 0 {
			w.out.Height[v] = math.NaN()
			continue
		}
		x := r3.Sub(w.in.At.Mean(int(v)), c)
		if d, n, ok := w.onFace(x); ok {
			w.out.Height[v], w.out.Normal[v] = d, n
			continue
		}
		w.out.Height[v], w.out.Normal[v] = w.relief(x)
	}
}

// A voxel lies on a face if a member of the face is within onFaceCells members'
// spacings and the face passes within its cutoff. Its own normal is not asked:
// on an edge it is neither face's.
const onFaceCells = 2

// gatherClose lists the members of accepted faces near the centre's cell, whose
// own centre is cell, for the voxels in it.
func (w *reliefWorker) gatherClose(cell, c r3.Vec) {
	w.close = w.close[:0]
	half := w.in.Centres.Lattice.SpacingM()/2 + onFaceCells*w.hood.spacing
	offset := r3.Sub(cell, c)
	for i := range w.hood.members {
		m := &w.hood.members[i]
		d := r3.Sub(m.pos, offset)
		if m.face >= 0 && w.faces[m.face].accepted &&
			math.Abs(d.X) <= half && math.Abs(d.Y) <= half && math.Abs(d.Z) <= half {
			w.close = append(w.close, int32(i))
		}
	}
}

// onFace returns the distance of x from the face that it lies on, the nearest
// if there are several.
func (w *reliefWorker) onFace(x r3.Vec) (float64, r3.Vec, bool) {
	reach := onFaceCells * w.hood.spacing
	var seen uint32
	best, found := math.Inf(1), false
	var n r3.Vec
	for _, i := range w.close {
		m := &w.hood.members[i]
		if seen>>m.face&1 != 0 || r3.Norm2(r3.Sub(m.pos, x)) > reach*reach {
			continue
		}
		seen |= 1 << m.face
		f := &w.faces[m.face]
		d, fn := f.surface.at(x)
		if math.Abs(d) < f.cutoff && math.Abs(d) < math.Abs(best) {
			best, n, found = d, fn, true
		}
	}
	return best, n, found
}

func (w *reliefWorker) gather(c r3.Vec) {
	w.near = w.in.Members.Within(w.near[:0], c, w.in.RadiusM)
	h := &w.hood
	h.members = h.members[:0]
	h.spacing = w.in.Members.Voxels().Lattice.SpacingM()
	for _, i := range w.near {
		n := w.in.Planes.Normal[i]
		h.members = append(h.members, hoodMember{r3.Sub(w.in.Members.Mean(int(i)), c), n, CellArea(h.spacing, n), -1})
	}
}

// CellArea is the surface area in m² that one occupied voxel of edge g stands
// for, on a surface with unit normal n: g²/(|nx|+|ny|+|nz|). A plane crosses
// (|nx|+|ny|+|nz|)/g² cells per unit of its area on average, one for each face
// it passes (Cauchy's projection formula). For the zero vector, which has no
// direction, it is the average over all directions, 2g²/3.
func CellArea(g float64, n r3.Vec) float64 {
	s := math.Abs(n.X) + math.Abs(n.Y) + math.Abs(n.Z)
	if s == 0 {
		s = 1.5 // mean of |nx|+|ny|+|nz| over the sphere
	}
	return g * g / s
}

// choose picks the faces that bound the solid near the centre: the one with the
// nearest member, and those that come about as near.
func (w *reliefWorker) choose() {
	w.chosen = w.chosen[:0]
	primary := -1
	for i := range w.faces {
		if f := &w.faces[i]; f.accepted && (primary < 0 || f.nearest < w.faces[primary].nearest) {
			primary = i
		}
	}
	if primary < 0 {
		return
	}
	p := &w.faces[primary]
	w.chosen = append(w.chosen, chosenFace{face: p})
	// A voxel lies within a centre's cell, up to 0.87 edges from its mean.
	reach := p.nearest + 1.25*w.in.Centres.Lattice.SpacingM()
	for i := range w.faces {
		f := &w.faces[i]
		if i == primary || !f.accepted || f.nearest > reach {
			continue
		}
		w.chosen = append(w.chosen, chosenFace{f, w.meeting(primary, i)})
	}
	slices.SortStableFunc(w.chosen[1:], func(a, b chosenFace) int {
		switch {
		case a.nearest < b.nearest:
			return -1
		case a.nearest > b.nearest:
			return 1
		}
		return 0
	})
}

// meeting tells from which side of each other the members of two faces lie.
func (w *reliefWorker) meeting(a, b int) meeting {
	ofB := w.hood.meanSigned(w.faces[a].plane, b)
	ofA := w.hood.meanSigned(w.faces[b].plane, a)
	switch {
	case ofA < 0 && ofB < 0:
		return outer
	case ofA > 0 && ofB > 0:
		return inner
	}
	return offset
}

// relief measures x, relative to the centre, against the chosen faces.
func (w *reliefWorker) relief(x r3.Vec) (float64, r3.Vec) {
	d, n := w.chosen[0].surface.at(x)
	for i := 1; i < len(w.chosen); i++ {
		e, m := w.chosen[i].surface.at(x)
		switch w.chosen[i].meets {
		case outer:
			if e > d {
				d, n = e, m
			}
		case inner:
			if e < d {
				d, n = e, m
			}
		case offset:
			switch {
			case d*e <= 0:
				if math.Abs(e) < math.Abs(d) {
					n = m
				}
				d = 0
			case math.Abs(e) < math.Abs(d):
				d, n = e, m
			}
		}
	}
	return d, n
}
