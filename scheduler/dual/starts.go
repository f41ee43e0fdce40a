package dual

import (
	"math"
	"slices"

	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// shape is what two steps must share to have the same cost and middle on a
// telescope: their length there.
type shape struct {
	length int64 // exposure, us
	busy   int64 // length and the least gap after it, us
}

// start is one instant at which a step of some shape may begin, with the
// price of the time it takes and where its middle lies in the night's frames.
type start struct {
	at   int64
	cost float64
	cell int32
	frac float32 // of the cell, 0..1
	bin  int32   // start bin of the season
}

// starts holds, for one telescope-night and shape, the break points of the
// step's value as a function of its start, ascending. Between neighbours the
// cost is linear and the middle stays in one cell, so the value's bound is
// linear too: its maximum over a stretch is at a break point or at the
// stretch's ends.
type starts struct {
	list []start
	// span k of the open time holds list[from[k]:from[k+1]].
	from []int32
}

// table builds the starts of every telescope-night and shape.
func (o *Oracle) table() {
	o.starts = make([][]starts, len(o.prices.nights))
	model.Parallel(o.p.Workers, len(o.starts), func(i int) {
		scope, night := i/o.p.Nights, i%o.p.Nights
		o.starts[i] = make([]starts, len(o.shapes[scope]))
		for s, sh := range o.shapes[scope] {
			o.starts[i][s] = o.nightStarts(scope, night, sh)
		}
	})
}

func (o *Oracle) nightStarts(scope, night int, sh shape) starts {
	var out starts
	g := o.bounds[int(o.p.Scopes[scope].Site)*o.p.Nights+night]
	pn := &o.prices.nights[scope*o.p.Nights+night]
	var at []int64
	for _, span := range o.p.OpenOuter(scope, night) {
		out.from = append(out.from, int32(len(out.list)))
		lo, hi := span.From, span.To-sh.length
		if hi < lo {
			continue
		}
		at = append(at[:0], lo, hi)
		at = multiples(at, lo, hi, 0, o.bin)
		for _, k := range pn.knots {
			at = within(at, k, lo, hi)
			at = within(at, k-sh.busy, lo, hi)
		}
		for i := range g.Frames {
			at = within(at, model.MicroOf(g.Frames[i].T)-sh.length/2, lo, hi)
		}
		slices.Sort(at)
		at = slices.Compact(at)
		for _, s := range at {
			out.list = append(out.list, o.startAt(pn, g, sh, s))
		}
	}
	out.from = append(out.from, int32(len(out.list)))
	return out
}

// startAt prices one start.
func (o *Oracle) startAt(pn *priceNight, g *visibility.BoundGrid, sh shape, s int64) start {
	mid := model.Sec(s + sh.length/2)
	cell := g.Cell(mid)
	from, to := g.Frames[cell].T, g.Frames[cell+1].T
	frac := math.Max(0, math.Min(1, (mid-from)/(to-from)))
	// Within the rounding of instants of an edge both cells count.
	if mid-from < 1e-6 {
		frac = 0
	} else if to-mid < 1e-6 {
		frac = 1
	}
	return start{
		at:   s,
		cost: o.prices.until(pn, s+sh.busy) - o.prices.until(pn, s),
		cell: int32(cell),
		frac: float32(frac),
		bin:  int32(floorDiv(s, o.bin) - o.firstBin),
	}
}

// within appends v when lo <= v <= hi.
func within(list []int64, v, lo, hi int64) []int64 {
	if v >= lo && v <= hi {
		list = append(list, v)
	}
	return list
}

// multiples appends offset + k step for all k that fall in [lo, hi].
func multiples(list []int64, lo, hi, offset, step int64) []int64 {
	for v := offset + -floorDiv(offset-lo, step)*step; v <= hi; v += step {
		if v >= lo {
			list = append(list, v)
		}
	}
	return list
}
