package fit

import (
	"container/heap"
	"context"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// Which side of a surface is air cannot be read off the surface itself. The
// evidence, weakest last:
//
//   - sensors: the side that the nearest scanner stands on;
//   - free space: the side on which a line along the normal meets no surface;
//   - ground faces up more often than down.
const (
	sureCosine      = 0.35 // |cos| to the parent's normal above which a finer voxel inherits its side: 70°
	freeSpaceCells  = 10   // length of the line along ±normal
	freeSpaceStart  = 2    // cells passed over next to the surface itself
	freeSpaceWeight = 0.5  // of one voxel's free space against one voxel facing straight up
	graphReach      = 2    // cells: neighbours of the propagation graph, with gaps of one cell

	// A piece is what steps of up to 60° connect: a step any sharper may lead
	// over the few stray points of a scan line, whose plane is anything.
	pieceCosine = 0.5
	// A piece decides for itself with a mean vote of 0.3, which ground
	// inclined up to 72° gives by facing up; a steeper one rather follows the
	// pieces it touches.
	decidedVote = 0.3
	// A voxel speaks up with a vote of 0.5, which ground inclined up to 60° gives
	// by facing up, or a steeper face with free space on one side; a piece is
	// sure if a tenth of it does, on balance. A lone steep face may as well be
	// the underside of something.
	strongVote  = 0.5
	strongShare = 0.1
)

// OrientCoarse turns the normals of planes, fitted at the voxels of x, to the
// air side. Within smoothly connected pieces the side is propagated over the
// neighbour graph, nearest orientation first (Hoppe et al. 1992, SIGGRAPH
// 26:71–78); each piece as a whole is decided by the evidence at all its voxels;
// and pieces with little evidence, sheer walls for instance, take their side
// from decided ones by the same propagation across the edges between. Sensors
// are scanner positions in the working CRS and may be nil.
//
// It returns the share of the surface that is connected to no piece with strong
// evidence: its side is a guess.
func OrientCoarse(ctx context.Context, x *terrain.Index, planes *LocalPlanes, sensors []r3.Vec) (guessedShare float64, err error) {
	known := make([]bool, x.Voxels().Len())
	pieces, err := settle(ctx, x, planes, known, sensors)
	if err != nil {
		return 0, err
	}
	clear(known)
	var fitted int
	var decided, sure []int32
	for _, p := range pieces {
		fitted += len(p.voxels)
		if p.vote >= decidedVote {
			decided = append(decided, p.voxels...)
		}
		// A sensor's word is enough.
		if p.strong >= strongShare || len(sensors) > 0 && p.vote >= decidedVote {
			sure = append(sure, p.voxels...)
		}
	}
	if fitted == 0 {
		return 0, nil
	}
	for _, i := range decided {
		known[i] = true
	}
	if _, err := propagate(ctx, x, planes, known, decided, 0); err != nil {
		return 0, err
	}
	return 1 - float64(countConnected(x, planes, sure))/float64(fitted), nil
}

// countConnected counts the fitted voxels that steps between neighbours connect
// to one of the seeds, and the seeds.
func countConnected(x *terrain.Index, planes *LocalPlanes, seeds []int32) int {
	seen := make([]bool, x.Voxels().Len())
	next := append([]int32(nil), seeds...)
	for _, i := range seeds {
		seen[i] = true
	}
	count := 0
	for ; len(next) > 0; count++ {
		i := next[len(next)-1]
		next = next[:len(next)-1]
		neighbours(x, int(i), func(j int) {
			if !seen[j] && planes.Fitted(j) {
				seen[j] = true
				next = append(next, int32(j))
			}
		})
	}
	return count
}

// A piece is a smoothly connected set of voxels, turned to the side that its
// evidence speaks for, with the mean vote for that side and the share of strong
// votes for it, less those against it.
type piece struct {
	voxels       []int32
	vote, strong float64
}

// settle splits the fitted voxels that are not known into pieces, turns each to
// the side that its evidence speaks for and marks it known.
func settle(ctx context.Context, x *terrain.Index, planes *LocalPlanes, known []bool, sensors []r3.Vec) ([]piece, error) {
	var pieces []piece
	for start := range known {
		if known[start] || !planes.Fitted(start) {
			continue
		}
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		known[start] = true
		voxels, err := propagate(ctx, x, planes, known, []int32{int32(start)}, pieceCosine)
		if err != nil {
			return nil, err
		}
		p := piece{voxels: voxels}
		for _, i := range voxels {
			vote := evidence(x, planes.Normal[i], int(i), sensors)
			p.vote += vote
			if math.Abs(vote) >= strongVote {
				p.strong += math.Copysign(1, vote)
			}
		}
		if p.vote < 0 {
			p.vote, p.strong = -p.vote, -p.strong
			for _, i := range voxels {
				flip(planes, int(i))
			}
		}
		p.vote /= float64(len(voxels))
		p.strong /= float64(len(voxels))
		pieces = append(pieces, p)
	}
	return pieces, nil
}

func flip(p *LocalPlanes, i int) {
	p.Normal[i] = r3.Scale(-1, p.Normal[i])
	p.Offset[i] = -p.Offset[i]
}

// evidence is positive where n points into the air, of order 1.
func evidence(x *terrain.Index, n r3.Vec, i int, sensors []r3.Vec) float64 {
	p := x.Mean(i)
	if len(sensors) > 0 {
		var sum, total float64
		for _, s := range sensors {
			d := r3.Sub(s, p)
			w := 1 / max(r3.Norm2(d), 1)
			total += w
			sum += w * r3.Dot(n, d) / max(r3.Norm(d), 1e-9)
		}
		return sum / total
	}
	behind, before := blocked(x, p, r3.Scale(-1, n)), blocked(x, p, n)
	vote := n.Z
	switch {
	case behind && !before:
		vote += freeSpaceWeight
	case before && !behind:
		vote -= freeSpaceWeight
	}
	return vote
}

// blocked reports whether a line from p along the unit vector n meets an
// occupied cell.
func blocked(x *terrain.Index, p, n r3.Vec) bool {
	l := x.Voxels().Lattice
	g := l.SpacingM()
	for t := float64(freeSpaceStart); t <= freeSpaceCells; t += 0.5 {
		if x.Find(l.CellOf(r3.Add(p, r3.Scale(t*g, n)))) >= 0 {
			return true
		}
	}
	return false
}

// OrientFrom turns the normals of planes, fitted at the voxels of x, by those
// of a coarser level: parent gives each voxel's voxel there. A normal within
// 70° of the parent's, either way round, takes its side; the others, on the
// underside of a block for instance, take it from their neighbours, nearest
// orientation first. Pieces without any such neighbour, where points are too
// few for a coarse plane, decide for themselves as in OrientCoarse.
func OrientFrom(ctx context.Context, x *terrain.Index, planes, coarse *LocalPlanes, parent []int32, sensors []r3.Vec) error {
	n := x.Voxels().Len()
	known := make([]bool, n)
	for i := range n {
		if !planes.Fitted(i) {
			continue
		}
		d := r3.Dot(planes.Normal[i], coarse.Normal[parent[i]])
		if d < 0 {
			flip(planes, i)
		}
		known[i] = math.Abs(d) >= sureCosine
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	if _, err := propagate(ctx, x, planes, known, besideUnknown(x, planes, known), 0); err != nil {
		return err
	}
	_, err := settle(ctx, x, planes, known, sensors)
	return err
}

// besideUnknown lists the known voxels next to fitted ones that are not known.
func besideUnknown(x *terrain.Index, planes *LocalPlanes, known []bool) []int32 {
	listed := make([]bool, len(known))
	var list []int32
	for i := range known {
		if known[i] || !planes.Fitted(i) {
			continue
		}
		neighbours(x, i, func(j int) {
			if known[j] && !listed[j] {
				listed[j] = true
				list = append(list, int32(j))
			}
		})
	}
	return list
}

// neighbours calls f for the voxels within graphReach cells of voxel i.
func neighbours(x *terrain.Index, i int, f func(j int)) {
	c := x.Voxels().Cells[i]
	for k := c.K - graphReach; k <= c.K+graphReach; k++ {
		for j := c.J - graphReach; j <= c.J+graphReach; j++ {
			start, end := x.Row(j, k, c.I-graphReach, c.I+graphReach)
			for n := start; n < end; n++ {
				if n != i {
					f(n)
				}
			}
		}
	}
}

// propagate spreads the side of the seeds, which are known, to every fitted
// voxel connected to them, along the steps between most nearly parallel normals
// first and none with a cosine below least, turning planes on the way. It
// returns the seeds and all it reached.
func propagate(ctx context.Context, x *terrain.Index, planes *LocalPlanes, known []bool, seeds []int32, least float64) ([]int32, error) {
	var steps stepHeap
	push := func(from int) {
		neighbours(x, from, func(to int) {
			if !known[to] && planes.Fitted(to) {
				if c := math.Abs(r3.Dot(planes.Normal[from], planes.Normal[to])); c >= least {
					heap.Push(&steps, step{c, int32(from), int32(to)})
				}
			}
		})
	}
	reached := append([]int32(nil), seeds...)
	for _, s := range seeds {
		push(int(s))
	}
	for len(steps) > 0 {
		s := heap.Pop(&steps).(step)
		if known[s.to] {
			continue
		}
		known[s.to] = true
		if r3.Dot(planes.Normal[s.from], planes.Normal[s.to]) < 0 {
			flip(planes, int(s.to))
		}
		reached = append(reached, s.to)
		if len(reached)%contextEvery == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		push(int(s.to))
	}
	return reached, nil
}

// A step leads from a voxel whose side is known to a neighbour; cosine is that
// of the angle between their normals, as lines.
type step struct {
	cosine   float64
	from, to int32
}

// stepHeap is a max-heap on cosine; ties go to the lower voxel, so that the
// result is unique.
type stepHeap []step

func (h stepHeap) Len() int { return len(h) }
func (h stepHeap) Less(a, b int) bool {
	switch {
	case h[a].cosine != h[b].cosine:
		return h[a].cosine > h[b].cosine
	case h[a].to != h[b].to:
		return h[a].to < h[b].to
	}
	return h[a].from < h[b].from
}
func (h stepHeap) Swap(a, b int) { h[a], h[b] = h[b], h[a] }
func (h *stepHeap) Push(x any)   { *h = append(*h, x.(step)) }
func (h *stepHeap) Pop() any {
	old := *h
	s := old[len(old)-1]
	*h = old[:len(old)-1]
	return s
}
