package terrain

import "math/bits"

// sortPairs sorts keys ascending and refs with them, by a least significant
// digit radix sort over the bits in which keys differ. It returns the sorted
// slices, which may be other memory than was passed in; what was passed in is
// scratch afterwards. Equal keys keep their order.
func sortPairs(keys []uint64, refs []uint32) ([]uint64, []uint32) {
	if len(keys) == 0 {
		return keys, refs
	}
	differ := uint64(0)
	for _, k := range keys {
		differ |= k ^ keys[0]
	}
	const digit = 11
	otherKeys, otherRefs := make([]uint64, len(keys)), make([]uint32, len(refs))
	for shift := 0; shift < bits.Len64(differ); shift += digit {
		if differ>>shift&(1<<digit-1) == 0 {
			continue
		}
		var count [1 << digit]int
		for _, k := range keys {
			count[k>>shift&(1<<digit-1)]++
		}
		sum := 0
		for d, n := range count {
			count[d], sum = sum, sum+n
		}
		for i, k := range keys {
			d := k >> shift & (1<<digit - 1)
			otherKeys[count[d]], otherRefs[count[d]] = k, refs[i]
			count[d]++
		}
		keys, otherKeys, refs, otherRefs = otherKeys, keys, otherRefs, refs
	}
	return keys, refs
}
