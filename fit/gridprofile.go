package fit

import "math"

// A GridProfile sums up how steep and rugged an elevation grid is, row by row,
// in memory that does not grow with the grid. The zero value is empty.
type GridProfile struct {
	slopes     [90 * slopeBins]int64
	ruggedness []int64 // by millimetre, then by ever coarser steps: see ruggedBin
	cells      int64
}

const (
	slopeBins = 100 // to a degree
	// Ruggedness is binned in steps of 1 %, from 1 mm.
	ruggedStart = 0.001
	ruggedStep  = 1.01
)

// Add takes the cells of row here that have all eight neighbours, in rows above
// (north of it, or on its other side throughout) and below. Heights and the
// cell's size along and across the row are metres; NaN is no data. No height is
// invented at edges and holes: cells there do not count.
func (p *GridProfile) Add(above, here, below []float64, along, across float64) {
	for i := 1; i+1 < len(here); i++ {
		w := Window{above[i-1], above[i], above[i+1], here[i-1], here[i], here[i+1], below[i-1], below[i], below[i+1]}
		east, north := w.Horn(1)
		slope := GradientSlopeDeg(east/along, north/across)
		rugged := w.RuggednessRiley()
		if math.IsNaN(rugged) {
			continue
		}
		p.cells++
		p.slopes[min(int(slope*slopeBins), len(p.slopes)-1)]++
		bin := ruggedBin(rugged)
		for len(p.ruggedness) <= bin {
			p.ruggedness = append(p.ruggedness, 0)
		}
		p.ruggedness[bin]++
	}
}

func ruggedBin(v float64) int {
	return max(0, int(math.Ceil(math.Log(v/ruggedStart)/math.Log(ruggedStep))))
}

// Cells is the number of cells that counted.
func (p *GridProfile) Cells() int64 { return p.cells }

// SlopeDeg is the slope that the share q of the cells does not exceed, by Horn's
// method, in degrees and to 0.01°. It is not ok without cells.
func (p *GridProfile) SlopeDeg(q float64) (deg float64, ok bool) {
	n, ok := quantileBin(p.slopes[:], p.cells, q)
	return float64(n+1) / slopeBins, ok
}

// SteeperThan is the share of the cells that are steeper than deg, to 0.01°.
func (p *GridProfile) SteeperThan(deg float64) float64 {
	if p.cells == 0 {
		return 0
	}
	var n int64
	for i := min(max(int(deg*slopeBins), 0), len(p.slopes)); i < len(p.slopes); i++ {
		n += p.slopes[i]
	}
	return float64(n) / float64(p.cells)
}

// RuggednessM is the ruggedness index of Riley, DeGloria & Elliot 1999 that the
// share q of the cells does not exceed, in metres and to 1 %.
func (p *GridProfile) RuggednessM(q float64) (m float64, ok bool) {
	n, ok := quantileBin(p.ruggedness, p.cells, q)
	return ruggedStart * math.Pow(ruggedStep, float64(n)), ok
}

// quantileBin is the first bin up to which the share q of total lies.
func quantileBin(bins []int64, total int64, q float64) (bin int, ok bool) {
	var sum int64
	for i, n := range bins {
		sum += n
		if sum > 0 && float64(sum) >= q*float64(total) {
			return i, true
		}
	}
	return 0, false
}
