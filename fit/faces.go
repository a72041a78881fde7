package fit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"ledgework/terrain"
)

// What makes a set of members within the reference radius R a face. Areas are
// shares of the disc πR².
const (
	// majorShare keeps a block of up to about 0.69 R square (3.4 m at R = 5 m)
	// an object on the face instead of a face of its own.
	majorShare = 0.15

	// A narrow strip in another direction, a ledge's tread for instance, is a
	// face as well if it runs across the disc.
	minorShare   = 0.035
	minorCosine  = 0.866 // at least 30° from every major face
	minorLengthR = 0.6

	maxFaces = 6

	seedCosine  = 0.866 // members within 30° of a seed support it
	faceCosine  = 0.766 // and within 40° of the face may belong to it
	seedMisfit  = 0.7   // distance from a seed's plane, in ProudM
	minMisfit   = 0.5   // bounds of the biweight's cutoff, in ProudM: below,
	maxMisfit   = 1.5   // noise would be an outlier; above, what is looked for would not
	seedsTried  = 40
	seedMembers = 500 // members that vote for a seed
	refinements = 8
)

// A neighbourhood is what lies within the reference radius of a centre:
// members relative to it, with outward normals and the surface area that each
// stands for.
type neighbourhood struct {
	pos, normal []r3.Vec
	area        []float64
	face        []int8 // face a member was taken by, -1 none
}

// A face is a smooth piece of reference surface near a centre.
type face struct {
	plane   facePlane
	surface quadric
	area    float64 // of its inliers, m²
	nearest float64 // distance of its nearest inlier from the centre, m
	major   bool
}

// facePlane is n·x = d relative to the neighbourhood's centre.
type facePlane struct {
	n r3.Vec
	d float64
}

func (p facePlane) signed(x r3.Vec) float64 { return r3.Dot(p.n, x) - p.d }

// findFaces takes the faces out of the neighbourhood one by one, best supported
// first, and returns them sorted by the distance of their nearest inlier.
func (h *neighbourhood) findFaces(faces []face, radiusM, proudM float64) []face {
	faces = faces[:0]
	disc := math.Pi * radiusM * radiusM
	for i := range h.face {
		h.face[i] = -1
	}
	for n := range maxFaces {
		p, ok := h.bestSeed(proudM)
		if !ok {
			break
		}
		p, cutoff, ok := h.refine(p, proudM)
		if !ok {
			break
		}
		f := h.take(p, cutoff, int8(n))
		switch {
		case f.area >= majorShare*disc:
			f.major = true
		case f.area >= minorShare*disc && h.isStrip(&f, int8(n), faces, radiusM):
		default:
			// Leave its members marked, so that the next seed is another.
			f.area = 0
		}
		if f.area > 0 {
			f.surface = h.fitQuadric(p, int8(n), cutoff, radiusM)
			f.plane = p
		}
		faces = append(faces, f)
	}
	// Marks refer to the order of extraction: settle relations need them, so
	// rejected pieces keep their place until here.
	return faces
}

// bestSeed is the plane through a member, along its normal, that most area
// among the members not taken yet agrees with.
func (h *neighbourhood) bestSeed(proudM float64) (facePlane, bool) {
	stride := max(1, len(h.pos)/seedMembers)
	seedStride := max(1, len(h.pos)/seedsTried)
	var best facePlane
	var most float64
	for s := seedStride / 2; s < len(h.pos); s += seedStride {
		if h.face[s] >= 0 || h.normal[s] == (r3.Vec{}) {
			continue
		}
		p := facePlane{h.normal[s], r3.Dot(h.normal[s], h.pos[s])}
		var sum float64
		for i := s % stride; i < len(h.pos); i += stride {
			if h.face[i] < 0 && math.Abs(p.signed(h.pos[i])) < seedMisfit*proudM && r3.Dot(p.n, h.normal[i]) > seedCosine {
				sum += h.area[i]
			}
		}
		if sum > most {
			best, most = p, sum
		}
	}
	return best, most > 0
}

// refine fits the plane to the members around it by iterated total least
// squares with Tukey's biweight (Beaton & Tukey 1974, Technometrics 16:147),
// scaled by the median absolute residual. Members whose normals are more than
// 40° off take no part, nor do those that an earlier face took.
func (h *neighbourhood) refine(p facePlane, proudM float64) (facePlane, float64, bool) {
	cutoff := maxMisfit * proudM
	residuals := make([]float64, 0, len(h.pos))
	for range refinements {
		residuals = residuals[:0]
		var m momentSum
		for i, x := range h.pos {
			if h.face[i] >= 0 || r3.Dot(p.n, h.normal[i]) < faceCosine {
				continue
			}
			d := p.signed(x)
			if math.Abs(d) >= cutoff {
				continue
			}
			residuals = append(residuals, math.Abs(d))
			m.add(x, h.area[i]*tukeyWeight(d/cutoff))
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
		p = facePlane{n, r3.Dot(n, centroid)}
		slices.Sort(residuals)
		scale := madToSigma * residuals[len(residuals)/2]
		cutoff = min(max(tukeyCutoff*scale, minMisfit*proudM), maxMisfit*proudM)
	}
	return p, cutoff, true
}

// take marks the members of the face around p and measures it.
func (h *neighbourhood) take(p facePlane, cutoff float64, mark int8) face {
	f := face{plane: p, nearest: math.Inf(1)}
	for i, x := range h.pos {
		if h.face[i] >= 0 || r3.Dot(p.n, h.normal[i]) < faceCosine || math.Abs(p.signed(x)) >= cutoff {
			continue
		}
		h.face[i] = mark
		f.area += h.area[i]
		f.nearest = min(f.nearest, r3.Norm(x))
	}
	return f
}

// isStrip reports whether the face with the given mark runs across the disc in
// a direction of its own.
func (h *neighbourhood) isStrip(f *face, mark int8, others []face, radiusM float64) bool {
	for i := range others {
		if others[i].major && r3.Dot(others[i].plane.n, f.plane.n) > minorCosine {
			return false
		}
	}
	var m momentSum
	for i, x := range h.pos {
		if h.face[i] == mark {
			m.add(x, h.area[i])
		}
	}
	c, _, ok := m.covariance()
	if !ok {
		return false
	}
	lambda, _ := EigenSym3(c)
	// A uniform strip of length L has variance L²/12 along it.
	return math.Sqrt(12*lambda[2]) >= minorLengthR*radiusM
}

// meanSigned is the mean signed distance of the members marked with mark from
// the plane p.
func (h *neighbourhood) meanSigned(p facePlane, mark int8) float64 {
	var sum, area float64
	for i, x := range h.pos {
		if h.face[i] == mark {
			sum += h.area[i] * p.signed(x)
			area += h.area[i]
		}
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
