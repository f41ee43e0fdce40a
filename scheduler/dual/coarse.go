package dual

import (
	"math"

	"nightwright/scheduler/model"
)

// The coarse oracle: the first open start of each ShelfStep slot, qualities
// from the shelf, costs tabulated per telescope-night and shape. It runs some
// hundred times while prices are looked for.

const shelfUS = model.ShelfStep * model.Micro

// openingEase is how long after the first open moment a window may begin and
// still be taken to begin with it, us.
const openingEase = 60 * model.Micro

// coarseCosts tabulates the cost of a start on each slot edge.
func (o *Oracle) coarseCosts() {
	if len(o.costs) != len(o.prices.nights) {
		o.costs = make([][][]coarseStart, len(o.prices.nights))
	}
	model.Parallel(o.p.Workers, len(o.costs), func(i int) {
		open := o.p.Open(i/o.p.Nights, i%o.p.Nights)
		if len(open) == 0 {
			return
		}
		pn := &o.prices.nights[i]
		shapes := o.shapes[i/o.p.Nights]
		base, n := coarseSpan(open)
		if o.costs[i] == nil {
			o.costs[i] = make([][]coarseStart, len(shapes))
			for s := range shapes {
				o.costs[i][s] = make([]coarseStart, n)
			}
		}
		for s, sh := range shapes {
			row := o.costs[i][s]
			for k := range row {
				row[k] = o.slotStart(pn, open, (base+int64(k))*shelfUS, sh)
			}
		}
	})
}

// coarseSpan returns the first slot edge number and the count that cover the
// open time.
func coarseSpan(open []model.Span) (base int64, n int) {
	base = floorDiv(open[0].From, shelfUS)
	return base, int(floorDiv(open[len(open)-1].To, shelfUS)-base) + 1
}

// slotStart is the cheapest of a slot's starts that the coarse oracle knows:
// the first at which an exposure lies in one open interval, and the last of an
// open interval, so that the ends of open time are used (and priced) too.
func (o *Oracle) slotStart(pn *priceNight, open []model.Span, edge int64, sh shape) coarseStart {
	best := coarseStart{cost: math.Inf(1)}
	for _, s := range open {
		for _, at := range [2]int64{max(edge, s.From), s.To - sh.length} {
			if at < edge || at >= edge+shelfUS || at < s.From || at+sh.length > s.To {
				continue
			}
			if c := o.prices.until(pn, at+sh.busy) - o.prices.until(pn, at); c < best.cost {
				best = coarseStart{c, at}
			}
		}
	}
	return best
}

// coarseStart is the start that stands for a slot.
type coarseStart struct {
	cost float64 // +Inf when there is none
	at   int64
}

// coarseNight gathers the starts of one telescope-night.
func (o *Oracle) coarseNight(sc *scratch, wi int, w *model.Want, t int32, n int, floor float64) {
	open := o.p.Open(int(t), n)
	if len(open) == 0 {
		return
	}
	base, size := coarseSpan(open)
	bin0 := int32(base - o.firstBin)
	if len(w.Steps) == 1 {
		add := o.stepValue(w, 0, t)
		o.atEdges(wi, w, 0, t, n, func(at int64, worth float64) {
			worth += add
			if b := int32(floorDiv(at, o.bin) - o.firstBin); worth > floor && worth > sc.worth[b] {
				sc.keep(b, worth, t, int32(n), at)
			}
		})
		o.coarseScan(wi, w, 0, t, n, func(k int, at int64, worth float64) {
			worth += add
			if b := bin0 + int32(k); worth > floor && worth > sc.worth[b] {
				sc.keep(b, worth, t, int32(n), at)
			}
		})
		return
	}
	for len(sc.step) < len(w.Steps) {
		sc.step = append(sc.step, nil)
	}
	for j := range w.Steps {
		row := grow(sc.step[j], size)
		sc.step[j] = row
		for i := range row {
			row[i].worth = math.Inf(-1)
		}
		add := o.stepValue(w, j, t)
		o.coarseScan(wi, w, j, t, n, func(k int, at int64, worth float64) {
			row[k] = binBest{worth + add, at}
		})
		o.atEdges(wi, w, j, t, n, func(at int64, worth float64) {
			if k := int(floorDiv(at, shelfUS) - base); k >= 0 && k < size && worth+add > row[k].worth {
				row[k] = binBest{worth + add, at}
			}
		})
	}
	o.joinSteps(sc, w, size)
	for k := range size {
		b := &sc.step[0][k]
		if i := bin0 + int32(k); b.worth > floor && b.worth > sc.worth[i] {
			sc.keep(i, b.worth, t, int32(n), b.at)
		}
	}
}

// coarseScan calls found for every slot edge at which a step may start, with
// its worth.
func (o *Oracle) coarseScan(wi int, w *model.Want, step int, t int32, n int, found func(k int, at int64, worth float64)) {
	scope := &o.p.Scopes[t]
	st := &w.Steps[step]
	first, q := o.p.Shelf.Row(scope.Class, n, st.Row)
	if len(q) == 0 {
		return
	}
	si := o.shapeOf[o.kinds[wi][step]][t]
	sh := o.shapes[t][si]
	costs := o.costs[int(t)*o.p.Nights+n][si]
	base, _ := coarseSpan(o.p.Open(int(t), n))
	value := w.Value / float64(len(w.Steps)) / 255
	shift := int(sh.length / 2 / shelfUS)
	b := float64(sh.length/2-int64(shift)*shelfUS) / shelfUS
	a := 1 - b
	for _, win := range o.p.Windows.Of(int(w.Unit), int(scope.Class), n) {
		wf, wt := o.p.Inward(win)
		k0 := max(int(floorDiv(wf, shelfUS)-base), 0)
		k1 := min(int(floorDiv(wt-sh.length, shelfUS)-base), len(costs)-1)
		// Byte of the middle's slot for start k.
		at := int(base) + shift - int(first)
		for k := max(k0, -at); k <= k1 && k+at+1 < len(q); k++ {
			c := &costs[k]
			// Where open time begins, windows begin a moment later.
			s := c.at
			if s < wf && wf-s <= openingEase {
				s = wf
			}
			if math.IsInf(c.cost, 1) || s < wf || s+sh.length > wt {
				continue
			}
			found(k, s, value*(a*float64(q[k+at])+b*float64(q[k+at+1]))-c.cost)
		}
	}
}

// atEdges calls found with the starts whose middle falls just on the dark side
// of a moonrise or moonset: full quality for time that is half cheap.
func (o *Oracle) atEdges(wi int, w *model.Want, step int, t int32, n int, found func(at int64, worth float64)) {
	scope := &o.p.Scopes[t]
	edges := o.p.MoonEdges(int(scope.Site), n)
	if len(edges) == 0 {
		return
	}
	sh := o.shapes[t][o.shapeOf[o.kinds[wi][step]][t]]
	pn := &o.prices.nights[int(t)*o.p.Nights+n]
	filter := int(w.Steps[step].Filter)
	for _, e := range edges {
		mid := e.Dark()
		at := model.MicroOf(mid) - sh.length/2
		if !o.legal(w, scope, n, at, sh.length) {
			continue
		}
		fr := o.p.Sky.Frame(int(scope.Site), mid)
		q := o.p.Sky.Quality(&fr, filter, o.p.Sky.Direction(int(w.Field), mid))
		found(at, w.Value/float64(len(w.Steps))*q-(o.prices.until(pn, at+sh.busy)-o.prices.until(pn, at)))
	}
}

// legal reports whether an exposure lies in one window and one open interval.
func (o *Oracle) legal(w *model.Want, scope *model.Scope, n int, at, length int64) bool {
	in := false
	for _, s := range o.p.Open(int(scope.ID), n) {
		in = in || at >= s.From && at+length <= s.To
	}
	if !in {
		return false
	}
	for _, win := range o.p.Windows.Of(int(w.Unit), int(scope.Class), n) {
		if f, to := o.p.Inward(win); at >= f && at+length <= to {
			return true
		}
	}
	return false
}
