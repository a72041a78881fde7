package hazards

import (
	"crypto/sha256"
	"encoding/base32"
	"encoding/binary"
	"slices"
	"strings"

	"ledgework/terrain"
)

// Prefixes of ids, one for each kind of thing.
const (
	bulgePrefix    = "bu" // overhanging ones too: a lip that comes or goes keeps the id
	overhangPrefix = "ov"
	recessPrefix   = "re"
	patchPrefix    = "pa"
	zonePrefix     = "zo"
)

// idDigits is the length of an id's hash: 10 digits of 5 bits. Among n things
// of a kind two share a hash with probability n²/2⁵¹, 4 in a million for
// 100 000 patches; IDs resolves it when it happens.
const idDigits = 10

// ID names the thing of the given kind at cell c of the lattice, as in
// "pa-4vvlnwj5hh". It depends on nothing else, so it is the same in every run
// on the same lattice.
func ID(prefix string, l terrain.Lattice, c terrain.Cell) string {
	return idOf(prefix, l, c, 0)
}

// IDs names many things of a kind, one for each cell, all different. Each gets
// its ID, but where that is taken by a thing whose cell comes earlier in the
// order of Cell.Compare (or earlier in cells, for the same cell) the hash is
// drawn again. The names do not depend on the order of different cells.
func IDs(prefix string, l terrain.Lattice, cells []terrain.Cell) []string {
	order := make([]int, len(cells))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cells[a].Compare(cells[b]) })
	ids := make([]string, len(cells))
	taken := make(map[string]bool, len(cells))
	for _, i := range order {
		id := idOf(prefix, l, cells[i], 0)
		for draw := uint32(1); taken[id]; draw++ {
			id = idOf(prefix, l, cells[i], draw)
		}
		ids[i] = id
		taken[id] = true
	}
	return ids
}

// idOf hashes everything that an id depends on.
func idOf(prefix string, l terrain.Lattice, c terrain.Cell, draw uint32) string {
	b := append(make([]byte, 0, 32), prefix...)
	b = append(b, 0)
	b = binary.LittleEndian.AppendUint64(b, uint64(l.Quanta()))
	for _, v := range [4]uint32{uint32(c.I), uint32(c.J), uint32(c.K), draw} {
		b = binary.LittleEndian.AppendUint32(b, v)
	}
	sum := sha256.Sum256(b)
	return prefix + "-" + strings.ToLower(base32.StdEncoding.EncodeToString(sum[:]))[:idDigits]
}
