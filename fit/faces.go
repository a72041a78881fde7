package fit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// What makes a set of members within the reference radius R a face. Areas are
// shares of the disc πR².
const (
	// majorShare keeps a block of up to about 0.59 R square (2.9 m at R = 5 m)
	// an object on the face instead of a face of its own.
	majorShare = 0.11

	// A smaller piece is a face as well if it is long and either joins two
	// faces, as a ledge's tread joins the wall above and the wall below, or lies
	// between two parallel ones, as the wall between two ledges does. The side of
	// a block touches one face only; its front has nothing before it.
	minorShare   = 0.02
	minorLengthR = 0.4
	minorTouch   = 0.4 // share of its length along which each of the two touches it
	minorCosine  = 0.9 // at least 25° from the faces it joins

	maxFaces = 8

	seedCosine  = 0.866 // members within 30° of a seed support it
	faceCosine  = 0.766 // and within 40° of the face may belong to it
	seedMisfit  = 0.7   // distance from a seed's plane, in ProudM
	minMisfit   = 0.4   // bounds of the biweight's cutoff, in ProudM: below,
	maxMisfit   = 0.8   // noise would be an outlier; above, what is looked for would not
	seedsTried  = 30
	seedMembers = 300 // members that vote for a seed
	refinements = 6

	settledRad = 1e-4 // change of the normal at which refinement may stop
)

// A hoodMember is what lies within the reference radius of a centre: its mean
// relative to the centre, its outward normal and the surface area that it
// stands for.
type hoodMember struct {
	pos, normal r3.Vec
	area        float64
	face        int8 // piece that took it, -1 none
}

// A neighbourhood is everything within the reference radius of a centre.
type neighbourhood struct {
	members []hoodMember
	free    []int32           // members that no piece has taken, ascending
	pieces  [maxFaces][]int32 // members of each piece, ascending
	spacing float64           // edge of the members' voxels
}

// A face is a smooth piece of reference surface near a centre. A piece that
// does not qualify keeps its place, with accepted false.
type face struct {
	plane    facePlane
	surface  quadric
	cutoff   float64 // misfit from which a member is an outlier, m
	area     float64 // of its inliers, m²
	nearest  float64 // distance of its nearest inlier from the centre, m
	accepted bool
}

// facePlane is n·x = d relative to the neighbourhood's centre.
type facePlane struct {
	n r3.Vec
	d float64
}

func (p facePlane) signed(x r3.Vec) float64 { return r3.Dot(p.n, x) - p.d }

// findFaces takes smooth pieces out of the neighbourhood one by one, best
// supported first, and accepts those that are faces. Members are marked with
// the index of their piece.
func (h *neighbourhood) findFaces(faces []face, radiusM, proudM float64) []face {
	faces = faces[:0]
	disc := math.Pi * radiusM * radiusM
	h.free = h.free[:0]
	for i := range h.members {
		h.members[i].face = -1
		if h.members[i].normal != (r3.Vec{}) {
			h.free = append(h.free, int32(i))
		}
	}
	for n := range maxFaces {
		p, support := h.bestSeed(proudM)
		// A seed's support is sampled, and refinement gains or loses some.
		if support < minorShare*disc/2 {
			break
		}
		p, cutoff, ok := h.refine(p, proudM)
		if !ok {
			break
		}
		f := h.take(p, cutoff, int8(n))
		f.accepted = f.area >= majorShare*disc
		faces = append(faces, f)
	}
	h.acceptMinor(faces, radiusM)
	for n := range faces {
		if f := &faces[n]; f.accepted {
			f.surface = h.fitQuadric(f.plane, n, f.cutoff, radiusM)
		}
	}
	return faces
}

// acceptMinor accepts the smaller pieces that join two faces, until no more
// do: a bay's end wall may join the wall and another end wall.
func (h *neighbourhood) acceptMinor(faces []face, radiusM float64) {
	least := minorShare * math.Pi * radiusM * radiusM
	for more := true; more; {
		more = false
		for n := range faces {
			f := &faces[n]
			if f.accepted || f.area < least {
				continue
			}
			length := h.length(n)
			if length >= minorLengthR*radiusM && (h.between(faces, n, least) || h.joins(faces, n, length)) {
				f.accepted, more = true, true
			}
		}
	}
}

// bestSeed is the plane through a free member, along its normal, that most area
// among the free members agrees with, and about how much that is.
func (h *neighbourhood) bestSeed(proudM float64) (best facePlane, most float64) {
	stride := max(1, len(h.free)/seedMembers)
	seedStride := max(1, len(h.free)/seedsTried)
	for s := seedStride / 2; s < len(h.free); s += seedStride {
		seed := &h.members[h.free[s]]
		p := facePlane{seed.normal, r3.Dot(seed.normal, seed.pos)}
		var sum float64
		for i := s % stride; i < len(h.free); i += stride {
			m := &h.members[h.free[i]]
			if math.Abs(p.signed(m.pos)) < seedMisfit*proudM && r3.Dot(p.n, m.normal) > seedCosine {
				sum += m.area
			}
		}
		if sum > most {
			best, most = p, sum
		}
	}
	return best, most * float64(stride)
}

// refine fits the plane to the free members around it by iterated total least
// squares with Tukey's biweight (Beaton & Tukey 1974, Technometrics 16:147),
// scaled by the mean absolute residual within the cutoff, which the bounds on
// the cutoff keep from running away. Members whose normals are more than 40° off
// take no part.
func (h *neighbourhood) refine(p facePlane, proudM float64) (facePlane, float64, bool) {
	cutoff := maxMisfit * proudM
	for range refinements {
		var m momentSum
		var misfit, count float64
		for _, i := range h.free {
			x := &h.members[i]
			d := p.signed(x.pos)
			if math.Abs(d) >= cutoff || r3.Dot(p.n, x.normal) < faceCosine {
				continue
			}
			misfit += math.Abs(d)
			count++
			m.add(x.pos, x.area*tukeyWeight(d/cutoff))
		}
		c, centroid, ok := m.covariance()
		if !ok {
			return p, 0, false
		}
		_, axes := EigenSym3(c)
		n := axes[0]
		if r3.Dot(n, p.n) < 0 {
			n = r3.Scale(-1, n)
		}
		turned := r3.Norm(r3.Sub(n, p.n))
		p = facePlane{n, r3.Dot(n, centroid)}
		scale := meanToSigma * misfit / count
		cutoff = min(max(tukeyCutoff*scale, minMisfit*proudM), maxMisfit*proudM)
		if turned < settledRad {
			break
		}
	}
	return p, cutoff, true
}

// take marks the free members of the piece around p and measures it.
func (h *neighbourhood) take(p facePlane, cutoff float64, mark int8) face {
	f := face{plane: p, cutoff: cutoff, nearest: math.Inf(1)}
	left := h.free[:0]
	piece := h.pieces[mark][:0]
	for _, i := range h.free {
		m := &h.members[i]
		if math.Abs(p.signed(m.pos)) >= cutoff || r3.Dot(p.n, m.normal) < faceCosine {
			left = append(left, i)
			continue
		}
		m.face = mark
		piece = append(piece, i)
		f.area += m.area
		f.nearest = min(f.nearest, r3.Norm(m.pos))
	}
	h.free, h.pieces[mark] = left, piece
	return f
}

// length is that of a uniform strip with the variance of piece n along it,
// which is L²/12.
func (h *neighbourhood) length(n int) float64 {
	var m momentSum
	for _, i := range h.pieces[n] {
		m.add(h.members[i].pos, h.members[i].area)
	}
	c, _, _ := m.covariance()
	lambda, _ := EigenSym3(c)
	return math.Sqrt(12 * lambda[2])
}

// between reports whether piece n stands before an accepted face and behind
// another piece, all about parallel.
func (h *neighbourhood) between(faces []face, n int, leastM2 float64) bool {
	before, behind := false, false
	for k := range faces {
		f := &faces[k]
		if k == n || f.area < leastM2 || r3.Dot(f.plane.n, faces[n].plane.n) < minorCosine {
			continue
		}
		switch d := h.meanSigned(f.plane, n); {
		case d > f.cutoff && f.accepted:
			before = true
		case d < -f.cutoff:
			behind = true
		}
	}
	return before && behind
}

// joins reports whether piece n, of the given length, runs along two accepted
// faces that point elsewhere.
func (h *neighbourhood) joins(faces []face, n int, length float64) bool {
	touched := 0
	for k := range faces {
		if faces[k].accepted && r3.Dot(faces[k].plane.n, faces[n].plane.n) < minorCosine &&
			h.touching(n, k) >= minorTouch*length {
			touched++
		}
	}
	return touched >= 2
}

// touchCells is the distance, in members' spacings, up to which members of two
// pieces touch: those on the edge between, whose normals belong to neither,
// are left out of both.
const touchCells = 3.5

// touching is about the length along which piece n lies next to piece k.
func (h *neighbourhood) touching(n, k int) float64 {
	reach := touchCells * h.spacing
	count := 0
	for _, i := range h.pieces[n] {
		p := h.members[i].pos
		for _, j := range h.pieces[k] {
			if r3.Norm2(r3.Sub(h.members[j].pos, p)) <= reach*reach {
				count++
				break
			}
		}
	}
	// About touchCells−1 rows of members lie within reach of an edge.
	return float64(count) * h.spacing / (touchCells - 1)
}

// meanSigned is the mean signed distance of piece n from the plane p.
func (h *neighbourhood) meanSigned(p facePlane, n int) float64 {
	var sum, area float64
	for _, i := range h.pieces[n] {
		m := &h.members[i]
		sum += m.area * p.signed(m.pos)
		area += m.area
	}
	return sum / area
}

// momentSum sums weighted positions near the origin.
type momentSum struct {
	w, x, y, z             float64
	xx, xy, xz, yy, yz, zz float64
}

func (m *momentSum) add(p r3.Vec, w float64) {
	m.w += w
	m.x += w * p.X
	m.y += w * p.Y
	m.z += w * p.Z
	m.xx += w * p.X * p.X
	m.xy += w * p.X * p.Y
	m.xz += w * p.X * p.Z
	m.yy += w * p.Y * p.Y
	m.yz += w * p.Y * p.Z
	m.zz += w * p.Z * p.Z
}

// covariance is that of the sum, with its mean; not ok without weight.
func (m *momentSum) covariance() (c terrain.Covariance, mean r3.Vec, ok bool) {
	if m.w <= 0 {
		return c, mean, false
	}
	s := 1 / m.w
	x, y, z := m.x*s, m.y*s, m.z*s
	return terrain.Covariance{
		XX: m.xx*s - x*x, XY: m.xy*s - x*y, XZ: m.xz*s - x*z,
		YY: m.yy*s - y*y, YZ: m.yz*s - y*z, ZZ: m.zz*s - z*z,
	}, r3.Vec{X: x, Y: y, Z: z}, true
}
