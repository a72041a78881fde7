package grid

import "testing"

func TestWindowsCoverOnce(t *testing.T) {
	tests := []struct{ width, height, blockW, blockH int }{
		{1, 1, 1, 1},
		{129, 67, 129, 1},
		{344, 333, 344, 5},
		{327, 468, 327, 468},
		{1000, 900, 256, 256},
		{1100, 1010, 1000, 1000}, // a tile larger than a window, not a multiple of one
		{3, 270000, 1, 270000},   // tiles of one column
		{300000, 2, 300000, 1},   // a row larger than a window
		{700, 700, 0, 0},
		{1500, 600, 16, 16},
	}
	for _, tt := range tests {
		w := newWindows(tt.width, tt.height, tt.blockW, tt.blockH)
		seen := make([]uint8, tt.width*tt.height)
		// Cells read of each stored block, and how many blocks are begun but
		// not done.
		blockW, blockH := max(tt.blockW, 1), max(tt.blockH, 1)
		across := (tt.width + blockW - 1) / blockW
		read := make([]int, across*((tt.height+blockH-1)/blockH))
		begun := 0
		most := 0
		for {
			x, y, dx, dy, ok := w.next()
			if !ok {
				break
			}
			if dx < 1 || dy < 1 || dx*dy > windowCells || dx*dy > w.windowW*w.stepH || x+dx > tt.width || y+dy > tt.height {
				t.Fatalf("%+v: window %d,%d %d × %d", tt, x, y, dx, dy)
			}
			for r := y; r < y+dy; r++ {
				for c := x; c < x+dx; c++ {
					seen[r*tt.width+c]++
					x0, y0 := c/blockW, r/blockH
					n := &read[y0*across+x0]
					if *n++; *n == 1 {
						begun++
					}
					if *n == min(blockW, tt.width-x0*blockW)*min(blockH, tt.height-y0*blockH) {
						begun--
					}
				}
			}
			most = max(most, begun)
		}
		for i, n := range seen {
			if n != 1 {
				t.Fatalf("%+v: cell %d is read %d times", tt, i, n)
			}
		}
		// Only a block that is itself larger than a window stays open between
		// windows, so that none is decoded twice.
		if most > 1 {
			t.Errorf("%+v: %d blocks are open at once", tt, most)
		}
		if _, _, _, _, ok := w.next(); ok {
			t.Errorf("%+v: a window after the last", tt)
		}
	}
}
