package survey

import (
	"fmt"
	"slices"
	"strconv"

	"ledgework/terrain"
)

// A Filter says which points a run leaves out beside those whose coordinates
// aren't finite. The zero value keeps all others.
type Filter struct {
	ExcludeClasses []uint8 // LAS classes to drop: 7 and 18 are noise
	DropWithheld   bool    // drop points that are flagged as deleted
	Crop           *Crop   // keep what lies in it; nil keeps all
}

// A Drop says how many points were left out for one reason.
type Drop struct {
	Reason string `json:"reason"`
	Count  int64  `json:"count"`
}

// reasons index the counts of a sieve; classes follow them.
const (
	notFinite = iota
	withheld
	noPlace
	tooFar
	outside
	firstClass
	reasonCount = firstClass + 256
)

// dropCounts are the points dropped for each reason.
type dropCounts [reasonCount]int64

// A sieve drops points from batches and counts why. It is for one goroutine.
type sieve struct {
	exclude  [256]bool
	classes  bool
	withheld bool
	crop     *Crop
	dropped  dropCounts
}

func newSieve(f Filter) *sieve {
	s := &sieve{withheld: f.DropWithheld, crop: f.Crop, classes: len(f.ExcludeClasses) > 0}
	for _, c := range f.ExcludeClasses {
		s.exclude[c] = true
	}
	return s
}

// needs are the columns that the sieve looks at.
func (s *sieve) needs() terrain.Columns {
	if s.classes || s.withheld {
		return terrain.Class
	}
	return 0
}

// raw drops what can be told before the coordinates are transformed.
func (s *sieve) raw(b *terrain.Batch) {
	classed := s.needs() != 0 && len(b.Class) == len(b.X)
	n := 0
	for i, x := range b.X {
		if classed {
			if s.withheld && b.Flags[i]&terrain.Withheld != 0 {
				s.dropped[withheld]++
				continue
			}
			if c := b.Class[i]; s.exclude[c] {
				s.dropped[firstClass+int(c)]++
				continue
			}
		}
		if !finite(x, b.Y[i], b.Z[i]) {
			s.dropped[notFinite]++
			continue
		}
		if n != i {
			b.Move(n, i)
		}
		n++
	}
	b.Resize(n)
}

// placed drops what has no place in the working CRS, lies beyond the bounds of
// any site, or lies outside the crop, and grows extent by what is left.
func (s *sieve) placed(b *terrain.Batch, bounds terrain.Extent, extent *terrain.Extent) {
	n := 0
	for i, x := range b.X {
		y, z := b.Y[i], b.Z[i]
		switch {
		case x >= bounds.Min[0] && x <= bounds.Max[0] && y >= bounds.Min[1] && y <= bounds.Max[1] &&
			z >= bounds.Min[2] && z <= bounds.Max[2]:
		case !finite(x, y, z):
			s.dropped[noPlace]++
			continue
		default:
			s.dropped[tooFar]++
			continue
		}
		if s.crop != nil && !s.crop.Contains(x, y) {
			s.dropped[outside]++
			continue
		}
		extent.Add(x, y, z)
		if n != i {
			b.Move(n, i)
		}
		n++
	}
	b.Resize(n)
}

// add adds the counts of o to c.
func (c *dropCounts) add(o *dropCounts) {
	for i, n := range o {
		c[i] += n
	}
}

// list returns the counts that aren't zero, in the order of the reasons.
func (c *dropCounts) list() []Drop {
	list := []Drop{}
	for i, n := range c {
		if n == 0 {
			continue
		}
		var reason string
		switch i {
		case notFinite:
			reason = "coordinate is not finite"
		case withheld:
			reason = "withheld"
		case noPlace:
			reason = "no place in the working CRS"
		case tooFar:
			reason = fmt.Sprintf("more than %.0f km outside the extent that the headers tell", strayM/1000)
		case outside:
			reason = "outside the crop"
		default:
			reason = "class " + strconv.Itoa(i-firstClass)
		}
		list = append(list, Drop{reason, n})
	}
	return list
}

// addDefects adds the defects of b to those of a, by reason.
func addDefects(a, b []terrain.Defect) []terrain.Defect {
	for _, d := range b {
		i := slices.IndexFunc(a, func(x terrain.Defect) bool { return x.Reason == d.Reason })
		if i < 0 {
			a = append(a, d)
			continue
		}
		a[i].Count += d.Count
	}
	return a
}
