package survey

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"math/bits"
	"strings"

	"ledgework/terrain"
)

// A census counts what Inspect reports.
type census struct {
	columns terrain.Columns
	grid    bool
	place   *Transformer // nil when the file can't be worked with
	sample  *sample

	points, notFinite int64
	raw, working      terrain.Extent
	classes           [256]int64
	returns           [16][16]int64
	flags             [4]int64 // in the order of the bits
	intensity         [2]uint16
	cells             planCells
}

func newCensus(h *terrain.Header) *census {
	return &census{
		columns: h.Columns, grid: h.Cell > 0,
		raw: terrain.EmptyExtent(), working: terrain.EmptyExtent(),
		intensity: [2]uint16{math.MaxUint16, 0},
		cells:     planCells{blocks: make(map[[2]int32]block)},
	}
}

// read counts all points of r.
func (c *census) read(ctx context.Context, r terrain.Reader) error {
	b := terrain.NewBatch(terrain.BatchPoints, c.columns&^terrain.Color)
	filter := newSieve(Filter{})
	for {
		if err := ctx.Err(); err != nil {
			return err
		}
		err := r.Read(b)
		if errors.Is(err, io.EOF) {
			c.notFinite = filter.dropped[notFinite]
			return nil
		}
		if err != nil {
			return err
		}
		c.points += int64(b.Len())
		c.attributes(b)
		filter.raw(b)
		for i, x := range b.X {
			c.raw.Add(x, b.Y[i], b.Z[i])
		}
		if c.place == nil {
			continue
		}
		if err := c.place.Apply(b); err != nil {
			return err
		}
		filter.raw(b)
		for i, x := range b.X {
			c.working.Add(x, b.Y[i], b.Z[i])
		}
		if !c.grid {
			c.sample.add(b)
			c.cells.add(b)
		}
	}
}

// attributes counts the columns of b, of all its points.
func (c *census) attributes(b *terrain.Batch) {
	for _, v := range b.Intensity {
		c.intensity[0], c.intensity[1] = min(c.intensity[0], v), max(c.intensity[1], v)
	}
	for i, v := range b.Class {
		c.classes[v]++
		for f := uint(b.Flags[i]) & 15; f != 0; f &= f - 1 {
			c.flags[bits.TrailingZeros(f)]++
		}
	}
	for i, v := range b.Return {
		c.returns[v&15][b.Returns[i]&15]++
	}
}

// fill writes the counts into s. legacy says that classes are those of LAS
// point formats 0 to 5.
func (c *census) fill(s *Summary, legacy bool) {
	s.Points, s.NotFinite = c.points, c.notFinite
	if !c.raw.Empty() {
		s.Min, s.Max = c.raw.Min, c.raw.Max
	}
	if !c.working.Empty() {
		s.Working.Min, s.Working.Max = c.working.Min, c.working.Max
	}
	for class, n := range c.classes {
		if n > 0 {
			s.Classes = append(s.Classes, ClassCount{uint8(class), className(uint8(class), legacy), n})
		}
	}
	for r, row := range c.returns {
		for of, n := range row {
			if n > 0 {
				s.Returns = append(s.Returns, ReturnCount{uint8(r), uint8(of), n})
			}
		}
	}
	s.Flags = FlagCounts{c.flags[0], c.flags[1], c.flags[2], c.flags[3]}
	if c.columns.Has(terrain.Intensity) && c.points > 0 {
		s.Intensity = &c.intensity
	}
	switch {
	case c.place == nil:
	case c.grid:
		s.Spacing = s.CellM
		if s.CellM > 0 {
			s.Density = 1 / (s.CellM * s.CellM)
		}
		if n := gridCells(s.Format); n > 0 {
			s.NodataShare = 1 - float64(c.points)/n
		}
	default:
		s.Spacing = c.sample.median()
		s.Density = c.cells.density()
	}
}

// gridCells is the number of cells of a grid, from its format as the grid
// package has it: "elevation grid (GTiff, 129 × 67)"; 0 if it isn't there.
func gridCells(format string) float64 {
	var w, h int
	at := strings.LastIndex(format, ", ")
	if at < 0 {
		return 0
	}
	if _, err := fmt.Sscanf(format[at:], ", %d × %d)", &w, &h); err != nil {
		return 0
	}
	return float64(w) * float64(h)
}

// planCells count points and occupied plan cells of 1 m, in blocks of 8 × 8.
// When there are too many blocks half of them are given up, by a hash of their
// place, so that what is left is still a fair sample.
type planCells struct {
	blocks map[[2]int32]block
	level  uint
}

// A block is 8 × 8 plan cells: a bit for each that is occupied, and its points.
type block struct {
	occupied uint64
	points   int64
}

// maxBlocks bounds planCells to about 64 MB: a million blocks, or 64 km².
const maxBlocks = 1 << 20

func (c *planCells) add(b *terrain.Batch) {
	for i, x := range b.X {
		e, n := int64(math.Floor(x)), int64(math.Floor(b.Y[i]))
		key := [2]int32{int32(e >> 3), int32(n >> 3)}
		if !c.selects(key) {
			continue
		}
		k := c.blocks[key]
		k.occupied |= 1 << (uint(e&7) | uint(n&7)<<3)
		k.points++
		c.blocks[key] = k
		for len(c.blocks) > maxBlocks {
			c.level++
			for key := range c.blocks {
				if !c.selects(key) {
					delete(c.blocks, key)
				}
			}
		}
	}
}

func (c *planCells) selects(key [2]int32) bool {
	return c.level == 0 || cubeHash(place{float64(key[0]), float64(key[1]), 0}, 1)&(1<<c.level-1) == 0
}

// density is the number of points per m² of occupied cells, 0 without any.
func (c *planCells) density() float64 {
	var cells, points int64
	for _, k := range c.blocks {
		cells += int64(bits.OnesCount64(k.occupied))
		points += k.points
	}
	if cells == 0 {
		return 0
	}
	return float64(points) / float64(cells)
}
