package dual

import (
	"math"
	"slices"

	"nightwright/scheduler/model"
)

// The soft oracle's starts. Between two break points of the price's integral a
// visit's cost is linear in its start, and its quality nearly so: the starts on
// price knots and those whose end (gap and all) falls on one are enough, with
// the ends of open time and the first dark middle at a moonrise or moonset.

// shelfUS is the shelf's step, us.
const shelfUS = model.ShelfStep * model.Micro

// cells are the starts of one telescope-night for exposures of one shape.
type cells struct {
	at    []int64
	cost  []float64 // C, of the exposure and the least gap after it
	node  []int32   // the shelf's node before the middle, in ShelfStep since 1970
	frac  []float32 // how far the middle is from it to the next, 0..1
	first int       // place of the first start in the masses
}

// softCells lays out the starts of all telescope-nights and shapes, and returns
// how many there are.
func (o *Oracle) softCells() int {
	if o.soft == nil {
		o.soft = make([][]cells, len(o.prices.nights))
		model.Parallel(o.p.Workers, len(o.soft), func(i int) {
			scope, night := i/o.p.Nights, i%o.p.Nights
			o.soft[i] = make([]cells, len(o.shapes[scope]))
			for s, sh := range o.shapes[scope] {
				o.soft[i][s] = o.layCells(scope, night, sh)
			}
		})
	}
	n := 0
	for i := range o.soft {
		for s := range o.soft[i] {
			o.soft[i][s].first = n
			n += len(o.soft[i][s].at)
		}
	}
	return n
}

func (o *Oracle) layCells(scope, night int, sh shape) cells {
	var c cells
	pn := &o.prices.nights[scope*o.p.Nights+night]
	edges := o.p.MoonEdges(int(o.p.Scopes[scope].Site), night)
	for _, span := range o.p.Open(scope, night) {
		lo, hi := span.From, span.To-sh.length
		if hi < lo {
			continue
		}
		from := len(c.at)
		c.at = append(c.at, lo, hi)
		for _, k := range pn.knots {
			c.at = within(c.at, k, lo, hi)
			c.at = within(c.at, k-sh.busy, lo, hi)
		}
		for _, e := range edges {
			c.at = within(c.at, model.MicroOf(e.Dark())-sh.length/2, lo, hi)
		}
		slices.Sort(c.at[from:])
		c.at = slices.Compact(c.at)
	}
	c.cost = make([]float64, len(c.at))
	for _, at := range c.at {
		mid := at + sh.length/2
		k := floorDiv(mid, shelfUS)
		u := float64(mid-k*shelfUS) / shelfUS
		for _, e := range edges {
			// The shelf's bytes on either side of a moonrise or moonset don't
			// say what is between: each side keeps its own.
			if t := model.MicroOf(e.T); floorDiv(t, shelfUS) == k {
				u = 0
				if mid >= t {
					u = 1
				}
			}
		}
		c.node = append(c.node, int32(k))
		c.frac = append(c.frac, float32(u))
	}
	return c
}

// softCosts prices the starts afresh.
func (o *Oracle) softCosts() {
	model.Parallel(o.p.Workers, len(o.soft), func(i int) {
		pn := &o.prices.nights[i]
		for s := range o.soft[i] {
			c := &o.soft[i][s]
			busy := o.shapes[i/o.p.Nights][s].busy
			for k, at := range c.at {
				c.cost[k] = o.prices.until(pn, at+busy) - o.prices.until(pn, at)
			}
		}
	})
}

// fillRow fills row with the worths of a step's starts in a telescope-night and
// returns it, the range [from, to) of starts the step may use, and their greatest
// worth; starts between two of its windows are -Inf.
func (sc *softScratch) fillRow(o *Oracle, wi int, w *model.Want, step int, t int32, n int, row []float64) (_ []float64, from, to int, top float64) {
	scope := &o.p.Scopes[t]
	first, q := o.p.Shelf.Row(scope.Class, n, w.Steps[step].Row)
	if len(q) == 0 {
		return row[:0], 0, 0, math.Inf(-1)
	}
	si := o.shapeOf[o.kinds[wi][step]][t]
	sh := o.shapes[t][si]
	c := &o.soft[int(t)*o.p.Nights+n][si]
	row = grow(row, len(c.at))
	value := w.Value / float64(len(w.Steps)) / 255
	add := o.stepValue(w, step, t)
	least := w.MinQuality * 255
	top = math.Inf(-1)
	from, to = len(c.at), 0
	next := 0
	for _, win := range o.p.Windows.Of(int(w.Unit), int(scope.Class), n) {
		wf, wt := o.p.Inward(win)
		k, _ := slices.BinarySearch(c.at, wf)
		if k >= len(c.at) || c.at[k]+sh.length > wt {
			continue
		}
		from = min(from, k)
		for next = max(next, from); next < k; next++ {
			row[next] = math.Inf(-1)
		}
		for ; k < len(c.at) && c.at[k]+sh.length <= wt; k++ {
			i := int(c.node[k] - first)
			v := math.Inf(-1)
			if i >= 0 && i+1 < len(q) {
				u := float64(c.frac[k])
				if x := float64(q[i]) + u*(float64(q[i+1])-float64(q[i])); x >= least {
					v = value*x + add - c.cost[k]
				}
			}
			row[k] = v
			if v > top {
				top = v
			}
		}
		next, to = k, k
	}
	return row, from, to, top
}
