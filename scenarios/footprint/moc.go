package footprint

import (
	"cmp"
	"math"
	"slices"

	"nightwright/visibility/ephemeris"
)

// span is a half-open range of cells of order 29.
type span struct{ from, to int64 }

// MOC is a set of the sky as HEALPix cells of several orders: a multi-order
// coverage map. The zero value is the empty set of order 0. It is always in
// canonical form: no overlaps, sorted, four siblings as their parent.
type MOC struct {
	order int // no cell is smaller than this order's
	spans []span
}

// below is how many cells of order 29 a cell of an order holds.
func below(order int) int64 { return 1 << (2 * (MaxOrder - order)) }

// NewMOC returns the set of the given cells, which may overlap and stand in
// any order. A cell deeper than order counts as the cell of that order around
// it.
func NewMOC(order int, cells []Cell) MOC {
	m := MOC{order: order}
	for _, c := range cells {
		if c.Order > order {
			c = Cell{order, c.Index >> (2 * (c.Order - order))}
		}
		b := below(c.Order)
		m.spans = append(m.spans, span{c.Index * b, (c.Index + 1) * b})
	}
	m.spans = merged(m.spans)
	return m
}

// merged sorts spans and joins those that touch.
func merged(spans []span) []span {
	slices.SortFunc(spans, func(a, b span) int { return cmp.Or(cmp.Compare(a.from, b.from), cmp.Compare(a.to, b.to)) })
	out := spans[:0]
	for _, s := range spans {
		if n := len(out); n > 0 && s.from <= out[n-1].to {
			out[n-1].to = max(out[n-1].to, s.to)
		} else if s.to > s.from {
			out = append(out, s)
		}
	}
	return out
}

// Order is the map's order: how fine it is, even where its cells are large.
func (m MOC) Order() int { return m.order }

// Empty reports whether nothing is in the map.
func (m MOC) Empty() bool { return len(m.spans) == 0 }

// Area is the map's area, sr.
func (m MOC) Area() float64 {
	var n float64
	for _, s := range m.spans {
		n += float64(s.to - s.from)
	}
	return n * CellArea(MaxOrder)
}

// Cells returns the canonical cells, by order, then index.
func (m MOC) Cells() []Cell {
	var out []Cell
	for _, s := range m.spans {
		for at := s.from; at < s.to; {
			order := m.order
			for order > 0 && at%below(order-1) == 0 && at+below(order-1) <= s.to {
				order--
			}
			out = append(out, Cell{order, at / below(order)})
			at += below(order)
		}
	}
	slices.SortFunc(out, func(a, b Cell) int { return cmp.Or(cmp.Compare(a.Order, b.Order), cmp.Compare(a.Index, b.Index)) })
	return out
}

// Holds reports whether a direction is in the map.
func (m MOC) Holds(v ephemeris.Vec) bool {
	in := CellAt(MaxOrder, v).Index
	k, found := slices.BinarySearchFunc(m.spans, in, func(s span, in int64) int { return cmp.Compare(s.from, in) })
	return found || k > 0 && in < m.spans[k-1].to
}

// Union returns what is in either map, at the finer order of the two: it
// loses nothing of either.
func (m MOC) Union(o MOC) MOC {
	return MOC{max(m.order, o.order), merged(slices.Concat(m.spans, o.spans))}
}

// covers says how much of [from, to) is in the map: 0 nothing, 1 a part, 2
// all.
func (m MOC) covers(from, to int64) int {
	k, found := slices.BinarySearchFunc(m.spans, from, func(s span, from int64) int { return cmp.Compare(s.from, from) })
	if !found && k > 0 && m.spans[k-1].to > from {
		k--
	}
	switch {
	case k == len(m.spans) || m.spans[k].from >= to:
		return 0
	case m.spans[k].from <= from && m.spans[k].to >= to:
		return 2
	}
	return 1
}

// Circle is a cap of the sky: a centre (unit vector) and a radius, rad.
type Circle struct {
	Centre ephemeris.Vec
	Radius float64
}

// CoverCircles returns the map of the cells of an order whose centre lies in
// one of the circles: as much is too much as is missing, so that its area is
// right.
func CoverCircles(order int, circles []Circle) MOC {
	m := MOC{order: order}
	for _, c := range circles {
		for face := range int64(12) {
			m.spans = coverCircle(m.spans, Cell{0, face}, order, &c)
		}
		if len(m.spans) > 1<<20 { // keep what fields have in common once
			m.spans = merged(m.spans)
		}
	}
	m.spans = slices.Clip(merged(m.spans))
	return m
}

// coverCircle adds what a circle takes of a cell.
func coverCircle(out []span, at Cell, order int, c *Circle) []span {
	d := separation(at.Centre(), c.Centre)
	reach := cellReach[at.Order]
	switch {
	case d > c.Radius+reach:
		return out
	case d+reach <= c.Radius || at.Order == order && d <= c.Radius:
		b := below(at.Order)
		s := span{at.Index * b, (at.Index + 1) * b}
		if n := len(out); n > 0 && out[n-1].to == s.from {
			out[n-1].to = s.to
			return out
		}
		return append(out, s)
	case at.Order == order:
		return out
	}
	for k := range int64(4) {
		out = coverCircle(out, Cell{at.Order + 1, at.Index*4 + k}, order, c)
	}
	return out
}

// OrderFor returns the coarsest order whose cells are at most size wide, rad;
// MaxOrder when none is.
func OrderFor(size float64) int {
	for order := range MaxOrder {
		if CellSize(order) <= size {
			return order
		}
	}
	return MaxOrder
}

// Coverage returns the map of circles with cells of an eighth of the smallest
// circle's diameter or finer, but no finer than order 12 (51"), which keeps
// the map of a whole survey small.
func Coverage(circles []Circle) MOC {
	least := math.Pi
	for _, c := range circles {
		least = min(least, c.Radius)
	}
	return CoverCircles(min(12, OrderFor(least/4)), circles)
}
