package survey

import "ledgework/terrain"

// What separates degrees from metres in a file that doesn't say which.
const (
	// A survey in degrees is at most this wide: nobody scans a continent for
	// landing places. Metres of a small site may be as few.
	maxDegreeSpan = 30.0

	// A grid whose heights range over more than this many times its own
	// width has a cell of degrees: in metres it would stand at 79° from rim to
	// rim. A grid of 1° × 1° on nearly flat ground (50 m of relief) has 50.
	minGridRelief = 5.0

	// Points may well stand as a chimney or a shaft, 1 m wide and 60 m tall.
	// In degrees a site of 1 km (0.01°) with 10 m of relief has 1000, one of
	// 10 km has 100.
	minPointRelief = 100.0

	// Local coordinates of points lie about their own origin; no survey in
	// degrees lies within this distance of 0° N 0° E, in the Gulf of Guinea.
	minDegreeOffset = 1.0
)

// looksLikeDegrees reports whether the coordinates of a file are longitude and
// latitude in degrees beside heights in metres. It goes by the extent alone:
// the ranges of degrees, a span no wider than maxDegreeSpan, and heights that
// range over far more than the plan is wide, which in metres would be a wall.
// Ground without relief can't be told from metres, and is not.
func looksLikeDegrees(e terrain.Extent, grid bool) bool {
	if e.Empty() {
		return false
	}
	if e.Min[0] < -180 || e.Max[0] > 180 || e.Min[1] < -90 || e.Max[1] > 90 {
		return false
	}
	wide := max(e.Max[0]-e.Min[0], e.Max[1]-e.Min[1])
	relief := e.Max[2] - e.Min[2]
	if wide > maxDegreeSpan {
		return false
	}
	if grid {
		return relief > minGridRelief*wide
	}
	off := max(abs(e.Min[0]+e.Max[0]), abs(e.Min[1]+e.Max[1])) / 2
	return off > minDegreeOffset && relief > minPointRelief*wide && wide > 0
}

// fitsDegrees reports whether coordinates can be longitude (-180..360) and
// latitude in degrees at all.
func fitsDegrees(e terrain.Extent) bool {
	return e.Min[0] >= -180 && e.Max[0] <= 360 && e.Min[1] >= -90 && e.Max[1] <= 90
}

func abs(v float64) float64 { return max(v, -v) }
