package hazards

import (
	"cmp"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/fit"
	"ledgework/terrain"
)

// nearness finds the obstacle ellipsoid nearest to a point: a binary tree of
// boxes over the ellipsoids' bounding boxes, halved along its
// longest side by their centres. It is read-only once built.
type nearness struct {
	ellipsoids []fit.Ellipsoid
	nodes      []nearNode
}

// A nearNode is a leaf if it holds an ellipsoid. Otherwise its first child
// follows it and other is its second.
type nearNode struct {
	box       terrain.Extent
	ellipsoid int // or -1
	other     int
}

// newNearness indexes the ellipsoids of obstacles, as found and not inflated.
func newNearness(obstacles []Obstacle) *nearness {
	n := &nearness{ellipsoids: make([]fit.Ellipsoid, len(obstacles))}
	at := make([]int, len(obstacles))
	for i := range obstacles {
		n.ellipsoids[i] = obstacles[i].Ellipsoid
		at[i] = i
	}
	if len(at) > 0 {
		n.build(at)
	}
	return n
}

func (n *nearness) build(at []int) {
	self := len(n.nodes)
	box := n.ellipsoids[at[0]].BoundingBox()
	for _, i := range at[1:] {
		box.Union(n.ellipsoids[i].BoundingBox())
	}
	n.nodes = append(n.nodes, nearNode{box: box, ellipsoid: -1})
	if len(at) == 1 {
		n.nodes[self].ellipsoid = at[0]
		return
	}
	dx, dy, dz := box.Max[0]-box.Min[0], box.Max[1]-box.Min[1], box.Max[2]-box.Min[2]
	along := func(v r3.Vec) float64 { return v.X }
	switch {
	case dz > dx && dz > dy:
		along = func(v r3.Vec) float64 { return v.Z }
	case dy > dx:
		along = func(v r3.Vec) float64 { return v.Y }
	}
	slices.SortStableFunc(at, func(a, b int) int {
		return cmp.Compare(along(n.ellipsoids[a].Centre), along(n.ellipsoids[b].Centre))
	})
	n.build(at[:len(at)/2])
	n.nodes[self].other = len(n.nodes)
	n.build(at[len(at)/2:])
}

// distance is that from p to the nearest ellipsoid, 0 inside one, but no more
// than limit: +Inf asks for the true distance, which is +Inf without obstacles.
func (n *nearness) distance(p r3.Vec, limit float64) float64 {
	if len(n.nodes) == 0 {
		return limit
	}
	// Halving keeps the depth within the bits of an int; on each level one
	// sibling waits.
	var stack [64]int
	top := 1 // the root, node 0
	for top > 0 && limit > 0 {
		top--
		node := &n.nodes[stack[top]]
		if boxDistance(node.box, p) >= limit {
			continue
		}
		if node.ellipsoid >= 0 {
			limit = min(limit, n.ellipsoids[node.ellipsoid].DistanceTo(p))
			continue
		}
		near, far := stack[top]+1, node.other
		if boxDistance(n.nodes[far].box, p) < boxDistance(n.nodes[near].box, p) {
			near, far = far, near
		}
		stack[top], stack[top+1] = far, near
		top += 2
	}
	return limit
}

// boxDistance is the distance from p to b, 0 inside.
func boxDistance(b terrain.Extent, p r3.Vec) float64 {
	dx := max(b.Min[0]-p.X, p.X-b.Max[0], 0)
	dy := max(b.Min[1]-p.Y, p.Y-b.Max[1], 0)
	dz := max(b.Min[2]-p.Z, p.Z-b.Max[2], 0)
	return math.Sqrt(dx*dx + dy*dy + dz*dz)
}
