package terrain

import (
	"cmp"
	"fmt"
	"slices"
	"sync"
)

// A shard holds the voxels of the bricks that hash to it. Its methods other
// than add are for one goroutine.
type shard struct {
	mu     sync.Mutex
	table  []int32 // open addressing on the brick key: brick number + 1
	bricks arena[brick]
	count  int // bricks
	voxels int

	moments   arena[Moments]
	intensity arena[uint64]
	colour    arena[[3]uint64]
	classes   arena[classSlots]
	more      map[classKey]int64 // classes past the slots
	columns   Columns
	limit     int64 // points of one voxel
}

// A brick is a cube of cells; place is the number of the cell's voxel + 1 in
// the shard's arenas, 0 where the cell is empty.
type brick struct {
	key   uint64
	place [brickCells]uint32
}

// classSlots counts the first classes met in a voxel in place, which holds
// nearly every voxel of a survey; a map takes the rest.
type classSlots struct {
	class [3]uint8
	used  uint8
	n     [3]uint32
}

type classKey struct {
	voxel uint32
	class uint8
}

func (s *shard) init(a *Accumulator) {
	s.table = make([]int32, 64)
	s.bricks, s.moments = arena[brick]{}, arena[Moments]{}
	s.intensity, s.colour, s.classes = arena[uint64]{}, arena[[3]uint64]{}, arena[classSlots]{}
	s.more = nil
	s.count, s.voxels, s.columns, s.limit = 0, 0, a.columns, a.lattice.MaxPoints()
}

func (s *shard) add(points []located, b *Batch) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	var last *brick
	for i := range points {
		p := &points[i]
		if last == nil || last.key != p.brick {
			last = s.find(p.brick)
		}
		at := last.place[p.cell]
		if at == 0 {
			at = s.newVoxel()
			last.place[p.cell] = at
		}
		m := s.moments.at(at - 1)
		if m.N >= s.limit {
			return fmt.Errorf("terrain: more than %d points in one voxel; give a smaller spacing", s.limit)
		}
		m.AddPoint(int64(p.x), int64(p.y), int64(p.z))
		if s.columns != 0 {
			s.addAttributes(at-1, b, int(p.point))
		}
	}
	return nil
}

func (s *shard) newVoxel() uint32 {
	s.moments.grow(s.voxels)
	if s.columns.Has(Intensity) {
		s.intensity.grow(s.voxels)
	}
	if s.columns.Has(Color) {
		s.colour.grow(s.voxels)
	}
	if s.columns.Has(Class) {
		s.classes.grow(s.voxels)
	}
	s.voxels++
	return uint32(s.voxels)
}

func (s *shard) addAttributes(at uint32, b *Batch, i int) {
	if s.columns.Has(Intensity) && len(b.Intensity) > 0 {
		*s.intensity.at(at) += uint64(b.Intensity[i])
	}
	if s.columns.Has(Color) && len(b.Red) > 0 {
		c := s.colour.at(at)
		c[0] += uint64(b.Red[i])
		c[1] += uint64(b.Green[i])
		c[2] += uint64(b.Blue[i])
	}
	if s.columns.Has(Class) && len(b.Class) > 0 {
		s.countClass(at, b.Class[i])
	}
}

func (s *shard) countClass(at uint32, class uint8) {
	c := s.classes.at(at)
	for n := range c.used {
		if c.class[n] == class && c.n[n] < 1<<32-1 {
			c.n[n]++
			return
		}
	}
	if int(c.used) < len(c.class) && !slices.Contains(c.class[:c.used], class) {
		c.class[c.used], c.n[c.used] = class, 1
		c.used++
		return
	}
	if s.more == nil {
		s.more = make(map[classKey]int64)
	}
	s.more[classKey{at, class}]++
}

func (s *shard) appendClasses(dst []ClassCount, voxel int32, at uint32) []ClassCount {
	start := len(dst)
	c := s.classes.at(at)
	for n := range c.used {
		dst = append(dst, ClassCount{voxel, c.class[n], int64(c.n[n]) + s.more[classKey{at, c.class[n]}]})
	}
	if len(s.more) > 0 {
		for class := range 256 {
			n := s.more[classKey{at, uint8(class)}]
			if n > 0 && !slices.Contains(c.class[:c.used], uint8(class)) {
				dst = append(dst, ClassCount{voxel, uint8(class), n})
			}
		}
	}
	slices.SortFunc(dst[start:], func(a, b ClassCount) int { return cmp.Compare(a.Class, b.Class) })
	return dst
}

// find returns the brick with the given key, made empty if it is new.
func (s *shard) find(key uint64) *brick {
	mask := len(s.table) - 1
	at := int(key*0xD6E8FEB86659FD93>>32) & mask
	for s.table[at] != 0 {
		if b := s.bricks.at(uint32(s.table[at] - 1)); b.key == key {
			return b
		}
		at = (at + 1) & mask
	}
	s.bricks.grow(s.count)
	b := s.bricks.at(uint32(s.count))
	b.key = key
	s.count++
	s.table[at] = int32(s.count)
	if 2*s.count > len(s.table) {
		s.rehash()
	}
	return b
}

func (s *shard) rehash() {
	s.table = make([]int32, 2*len(s.table))
	mask := len(s.table) - 1
	for n := range s.count {
		at := int(s.bricks.at(uint32(n)).key*0xD6E8FEB86659FD93>>32) & mask
		for s.table[at] != 0 {
			at = (at + 1) & mask
		}
		s.table[at] = int32(n) + 1
	}
}

// each calls f with every voxel: its brick's key, its cell in the brick and
// its place in the arenas.
func (s *shard) each(f func(brick uint64, cell int, at uint32)) {
	for n := range s.count {
		b := s.bricks.at(uint32(n))
		for cell, at := range b.place {
			if at != 0 {
				f(b.key, cell, at-1)
			}
		}
	}
}

// An arena is a list that grows without copying: copying would touch fresh
// memory twice, and first touch is the slowest thing that summing does.
type arena[T any] struct {
	chunks [][]T
}

const (
	chunkBits = 11
	chunkMask = 1<<chunkBits - 1
)

func (a *arena[T]) at(i uint32) *T { return &a.chunks[i>>chunkBits][i&chunkMask] }

// grow makes room for element i, the next one.
func (a *arena[T]) grow(i int) {
	if i>>chunkBits == len(a.chunks) {
		a.chunks = append(a.chunks, make([]T, 1<<chunkBits))
	}
}
