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
		left := map[[2]int]int{} // cells still to come of a block that was begun
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
					if tt.blockW == 0 {
						continue
					}
					b := [2]int{c / tt.blockW, r / tt.blockH}
					if _, begun := left[b]; !begun {
						left[b] = min(tt.blockW, tt.width-b[0]*tt.blockW) * min(tt.blockH, tt.height-b[1]*tt.blockH)
					}
					if left[b]--; left[b] == 0 {
						delete(left, b)
					}
				}
			}
			most = max(most, len(left))
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
