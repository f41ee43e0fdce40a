package dual

import (
	"math"

	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Oracle answers, for fixed prices, what is the most a want could earn on its
// own: the inner maximum of the Lagrangian relaxation.
//
// A want's best set of visits is bounded by a dynamic programme over start
// bins of the whole network. The worth of a bin is the greatest, over
// telescopes and starts s inside the bin, of
//
//	value * Q(s + length/2) - integral of the price over [s, s + length + least gap)
//
// with Q the upper profile of visibility.BoundGrid, linear in each cell.
// Cost and Q are linear in s between the break points of starts.go, so
// evaluating these (and the stretch's ends) is exact for the bound Q.
// Starts in bins a <= b differ by less than (b - a + 1) widths, so two visits a
// gap apart lie in bins with (b - a) >= floor(gap / width): the programme asks
// for no more and never forbids a legal pair. At most `visits` are taken through a multiplier mu >= 0:
// n mu + max over sets of sum (worth - mu) bounds the best of at most n.
type Oracle struct {
	p        *model.Problem
	prices   *Prices
	least    []float64 // [scope*Nights + night] least price in open time
	shapes   [][]shape // [scope]
	shapeOf  [][]int32 // [want step kind][scope]: index into shapes[scope]
	kinds    [][]int32 // [want][step] -> kind
	bin      int64     // width of a start bin, us
	firstBin int64
	bins     int
	bounds   []*visibility.BoundGrid // fine: [site*Nights + night]
	starts   [][]starts              // [scope*Nights + night][shape]
	soft     [][]cells               // soft: [scope*Nights + night][shape]
	// Mu is each want's count multiplier, kept between calls.
	Mu []float64
	// Share is the value added per second of scaled exposure, by program: the
	// share bounds' multipliers.
	Share []float64
}

// NewOracle prepares the oracle.
func NewOracle(p *model.Problem, prices *Prices) *Oracle {
	o := &Oracle{p: p, prices: prices, Mu: make([]float64, len(p.Wants)), Share: make([]float64, len(p.Survey.Programs))}
	o.shapes = make([][]shape, len(p.Scopes))
	kindOf := map[float64]int32{}
	var durations []float64
	for i := range p.Wants {
		var ks []int32
		for _, st := range p.Wants[i].Steps {
			k, ok := kindOf[st.Duration]
			if !ok {
				k = int32(len(durations))
				kindOf[st.Duration] = k
				durations = append(durations, st.Duration)
			}
			ks = append(ks, k)
		}
		o.kinds = append(o.kinds, ks)
	}
	for _, d := range durations {
		row := make([]int32, len(p.Scopes))
		for t := range p.Scopes {
			length := p.Length(&model.Step{Duration: d}, int32(t))
			row[t] = int32(len(o.shapes[t]))
			o.shapes[t] = append(o.shapes[t], shape{length, length + p.Scopes[t].LeastGap})
		}
		o.shapeOf = append(o.shapeOf, row)
	}
	return o
}

// Fine makes the oracle prove: start bins of the given width in s and every
// break point.
func (o *Oracle) Fine(width float64) {
	o.setBins(width)
	if o.bounds == nil {
		o.bounds = make([]*visibility.BoundGrid, len(o.p.Survey.Sites)*o.p.Nights)
		model.Parallel(o.p.Workers, len(o.bounds), func(i int) {
			site := i / o.p.Nights
			if g := o.p.Grid(site, i%o.p.Nights); g != nil {
				o.bounds[i] = o.p.Sky.BoundGrid(site, g.From, g.From+g.Step*float64(g.Cells()), model.GridStep)
			}
		})
	}
	o.table()
}

func (o *Oracle) setBins(width float64) {
	o.bin = model.MicroOf(width)
	o.firstBin = floorDiv(o.prices.first*o.prices.slot, o.bin)
	o.bins = int(floorDiv((o.prices.first+int64(o.prices.n))*o.prices.slot, o.bin)-o.firstBin) + 1
}

// Refresh takes changed prices in.
func (o *Oracle) Refresh() {
	o.prices.integrate()
	o.least = o.prices.leastRates(o.least)
	model.Parallel(o.p.Workers, len(o.starts), func(i int) {
		pn := &o.prices.nights[i]
		for s := range o.starts[i] {
			sh := o.shapes[i/o.p.Nights][s]
			list := o.starts[i][s].list
			for k := range list {
				list[k].cost = o.prices.until(pn, list[k].at+sh.busy) - o.prices.until(pn, list[k].at)
			}
		}
	})
}

// pick is one visit of a want's best set.
type pick struct {
	bin   int32
	scope int32
	night int32
	worth float64
	at    int64 // start of its first step
}

// scratch is one worker's memory.
type scratch struct {
	worth   []float64 // by bin
	scope   []int32
	night   []int32
	at      []int64
	dirty   []int32 // touched bins, unsorted
	mark    []bool  // touched days of bins, for ordered scans
	order   []int32
	f       []float64
	n       []int32
	take    []bool
	prev    []int32
	windows []model.Span
	picks   []pick
	up      []cellBound
	step    [][]binBest
	queue   []int32 // of joinSteps
}

type binBest struct {
	worth float64
	at    int64
}

const dayBlock = 256 // bins a mark covers

func (o *Oracle) newScratch() *scratch {
	s := &scratch{
		worth: make([]float64, o.bins), scope: make([]int32, o.bins),
		night: make([]int32, o.bins), at: make([]int64, o.bins),
		mark: make([]bool, o.bins/dayBlock+1),
	}
	for i := range s.worth {
		s.worth[i] = math.Inf(-1)
	}
	return s
}

// keep notes the best of a bin.
func (sc *scratch) keep(bin int32, worth float64, scope, night int32, at int64) {
	if math.IsInf(sc.worth[bin], -1) {
		sc.dirty = append(sc.dirty, bin)
		sc.mark[bin/dayBlock] = true
	}
	sc.worth[bin], sc.scope[bin], sc.night[bin], sc.at[bin] = worth, scope, night, at
}

// limit bounds the worth of any visit of a want in a telescope-night. The
// price is charged for the exposures' own length only: a gap may lie outside
// the open time.
func (o *Oracle) limit(w *model.Want, t int32, night int) float64 {
	var sum float64
	rate := o.least[int(t)*o.p.Nights+night]
	for i := range w.Steps {
		q := o.p.Shelf.Top(o.p.Scopes[t].Class, night, w.Steps[i].Row)
		if q == 0 {
			return math.Inf(-1)
		}
		sum += w.Value/float64(len(w.Steps))*q + o.stepValue(w, i, t) - rate*model.Sec(o.p.Length(&w.Steps[i], t))
	}
	return sum
}

// gather fills the scratch's bins with the worth of every start of the want
// that is above floor.
func (o *Oracle) gather(sc *scratch, wi int, floor float64) {
	w := &o.p.Wants[wi]
	for _, t := range w.Scopes {
		for n := range o.p.Nights {
			o.gatherNight(sc, wi, w, t, n, floor)
		}
	}
}

func (o *Oracle) gatherNight(sc *scratch, wi int, w *model.Want, t int32, n int, floor float64) {
	if len(o.p.OpenOuter(int(t), n)) == 0 {
		return
	}
	if o.limit(w, t, n) <= floor || o.p.Barred(w, t, n) {
		return
	}
	if len(w.Steps) == 1 {
		base := o.stepValue(w, 0, t)
		o.scan(sc, wi, w, 0, t, n, base, func(s int64, bin int32, worth float64, _ bool) {
			if worth > floor && worth > sc.worth[bin] {
				sc.keep(bin, worth, t, int32(n), s)
			}
		})
		return
	}
	o.gatherSet(sc, wi, w, t, n, floor)
}

// stepValue returns what one step adds before quality: the share multiplier's
// part for its exposure time.
func (o *Oracle) stepValue(w *model.Want, step int, t int32) float64 {
	m := o.Share[w.Program]
	if m == 0 {
		return 0
	}
	return m * model.Sec(o.p.Length(&w.Steps[step], t))
}

// scan calls found with every start that bounds the step's worth in the
// telescope-night, in ascending order within each window and open interval,
// whose first is told. Between two starts of one the bound is linear.
func (o *Oracle) scan(sc *scratch, wi int, w *model.Want, step int, t int32, n int, base float64, found func(s int64, bin int32, worth float64, first bool)) {
	scope := &o.p.Scopes[t]
	kind := o.kinds[wi][step]
	si := o.shapeOf[kind][t]
	sh := o.shapes[t][si]
	st := &o.starts[int(t)*o.p.Nights+n][si]
	pn := &o.prices.nights[int(t)*o.p.Nights+n]
	g := o.bounds[int(scope.Site)*o.p.Nights+n]
	value := w.Value / float64(len(w.Steps))
	c := o.p.Sky.Direction(int(w.Field), g.Frames[len(g.Frames)/2].T)
	open := o.p.OpenOuter(int(t), n)
	sc.windows = o.p.Outer(sc.windows[:0], w.Unit, scope.Class, n)
	for _, win := range sc.windows {
		for k, span := range open {
			lo, hi := max(win.From, span.From), min(win.To, span.To)-sh.length
			if hi < lo {
				continue
			}
			first := g.Cell(model.Sec(lo + sh.length/2))
			last := g.Cell(model.Sec(hi + sh.length/2))
			up := o.profile(sc, g, first, last, int(w.Steps[step].Filter), c)
			worth := func(e *start) float64 {
				i := int(e.cell) - first
				q := up[i].left + float64(e.frac)*(up[i].right-up[i].left)
				most := max(up[i].left, up[i].right)
				if e.frac == 0 && i > 0 {
					q, most = max(q, up[i-1].right), max(most, up[i-1].left, up[i-1].right)
				}
				if e.frac == 1 && i+1 < len(up) {
					q, most = max(q, up[i+1].left), max(most, up[i+1].left, up[i+1].right)
				}
				if most < w.MinQuality {
					// No middle in this cell reaches the least quality.
					return math.Inf(-1)
				}
				return value*q + base - e.cost
			}
			edge := o.startAt(pn, g, sh, lo)
			found(lo, edge.bin, worth(&edge), true)
			list := st.list[st.from[k]:st.from[k+1]]
			for i := lowerBound(list, lo); i < len(list) && list[i].at <= hi; i++ {
				e := &list[i]
				v := worth(e)
				found(e.at, e.bin, v, false)
				if e.at == (int64(e.bin)+o.firstBin)*o.bin && e.bin > 0 && e.at > lo {
					// The bin before ends here.
					found(e.at, e.bin-1, v, false)
				}
			}
			edge = o.startAt(pn, g, sh, hi)
			found(hi, edge.bin, worth(&edge), false)
		}
	}
}

// profile fills sc.up with the quality's bounds at the ends of cells
// first..last.
func (o *Oracle) profile(sc *scratch, g *visibility.BoundGrid, first, last, filter int, c ephemeris.Vec) []cellBound {
	up := grow(sc.up, last-first+1)
	sc.up = up
	for k := range up {
		up[k].left, up[k].right = g.Bound(first+k, filter, c)
	}
	return up
}

// cellBound is the quality's bound at the two ends of a cell.
type cellBound struct{ left, right float64 }

// grow returns a slice of length n, keeping the memory; what it holds is not
// defined.
func grow[T any](x []T, n int) []T {
	if cap(x) < n {
		return make([]T, n+n/4+16)[:n]
	}
	return x[:n]
}

// lowerBound returns the index of the first start at or after s.
func lowerBound(list []start, s int64) int {
	lo, hi := 0, len(list)
	for lo < hi {
		m := (lo + hi) / 2
		if list[m].at < s {
			lo = m + 1
		} else {
			hi = m
		}
	}
	return lo
}
