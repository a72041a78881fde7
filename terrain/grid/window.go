package grid

// windowCells is how many cells are read at a time: two megabytes of values,
// enough to drown the cost of a call, and a tile of 512 × 512.
const windowCells = 1 << 18

// windows walks a raster in windows of at most windowCells cells, so that no
// stored block is decoded twice: blocks row by row, and within a group of
// blocks (or a part of a large one) cell rows from the top.
type windows struct {
	width, height  int // of the raster
	groupW, groupH int // of the group of whole blocks
	windowW, stepH int // of a window
	x, y, dx, dy   int // group, and window inside it
	started        bool
}

func newWindows(width, height, blockW, blockH int) windows {
	w := windows{width: width, height: height}
	w.groupW, w.groupH = min(max(blockW, 1), width), min(max(blockH, 1), height)
	// Small blocks are taken several at a time, first along the row.
	if n := windowCells / (w.groupW * w.groupH); n > 1 {
		w.groupW = min(w.groupW*n, width)
	}
	if n := windowCells / (w.groupW * w.groupH); n > 1 && w.groupW == width {
		w.groupH = min(w.groupH*n, height)
	}
	// Large ones are taken in parts, from GDAL's block cache.
	w.windowW = min(w.groupW, windowCells)
	w.stepH = min(w.groupH, max(windowCells/w.windowW, 1))
	return w
}

// next moves to the next window and returns it; ok is false after the last.
func (w *windows) next() (x, y, width, height int, ok bool) {
	groupW, groupH := min(w.groupW, w.width-w.x), min(w.groupH, w.height-w.y)
	if w.started {
		w.dx += w.windowW
		if w.dx >= groupW {
			w.dx, w.dy = 0, w.dy+w.stepH
		}
		if w.dy >= groupH {
			w.dy, w.x = 0, w.x+w.groupW
			if w.x >= w.width {
				w.x, w.y = 0, w.y+w.groupH
			}
			if w.y >= w.height {
				w.y = w.height
				return 0, 0, 0, 0, false
			}
			groupW, groupH = min(w.groupW, w.width-w.x), min(w.groupH, w.height-w.y)
		}
	}
	w.started = true
	return w.x + w.dx, w.y + w.dy, min(w.windowW, groupW-w.dx), min(w.stepH, groupH-w.dy), true
}
