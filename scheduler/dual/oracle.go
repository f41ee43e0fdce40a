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
// with Q the upper profile of visibility.UpperProfile, linear between frames.
// Cost and Q are linear in s between the break points of starts.go, so
// evaluating these (and the stretch's ends) is exact for the bound Q.
// Two visits whose starts are at least gap apart lie in bins a < b with
// (b - a) >= ceil(gap / width) - 1 ... the programme allows every such pair:
// starts in bins a and b differ by less than (b - a + 1) widths, so
// gap <= (b-a+1) width is necessary and the condition never forbids a legal
// pair. At most `visits` are taken through a multiplier mu >= 0:
// n mu + max over sets of sum (worth - mu) bounds the best of at most n.
type Oracle struct {
	p        *model.Problem
	prices   *Prices
	peaks    *Peaks
	shapes   [][]shape // [scope]
	shapeOf  [][]int32 // [want step kind][scope]: index into shapes[scope]
	kinds    [][]int32 // [want][step] -> kind
	bin      int64     // width of a start bin, us
	firstBin int64
	bins     int
	fine     bool
	starts   [][]starts // [scope*Nights + night][shape]
	// Mu is each want's count multiplier, kept between calls.
	Mu []float64
	// Share is the value added per second of scaled exposure, by program: the
	// share bounds' multipliers.
	Share []float64
}

// NewOracle prepares the oracle; peaks may be nil (no pruning).
func NewOracle(p *model.Problem, prices *Prices, peaks *Peaks) *Oracle {
	o := &Oracle{p: p, prices: prices, peaks: peaks, Mu: make([]float64, len(p.Wants)), Share: make([]float64, len(p.Survey.Programs))}
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

// SetBins sets the width of the start bins, s, and whether all break points
// are kept.
func (o *Oracle) SetBins(width float64, fine bool) {
	o.bin = model.MicroOf(width)
	o.firstBin = floorDiv(o.prices.first*o.prices.slot, o.bin)
	o.bins = int(floorDiv((o.prices.first+int64(o.prices.n))*o.prices.slot, o.bin)-o.firstBin) + 1
	o.table(fine)
}

// Refresh takes changed prices in.
func (o *Oracle) Refresh() {
	o.prices.integrate()
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
	up      []float64 // node values of the upper profile
	step    [][]binBest
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
	if o.peaks != nil {
		limit := o.peaks.limit(o.p, w, t, n)
		for i := range w.Steps {
			limit += o.stepValue(w, i, t)
		}
		if limit <= floor {
			return
		}
	}
	if len(w.Steps) == 1 {
		base := o.stepValue(w, 0, t)
		o.scan(sc, wi, w, 0, t, n, base, func(s int64, bin int32, worth float64) {
			if worth > floor && worth > sc.worth[bin] {
				if math.IsInf(sc.worth[bin], -1) {
					sc.dirty = append(sc.dirty, bin)
					sc.mark[bin/dayBlock] = true
				}
				sc.worth[bin], sc.scope[bin], sc.night[bin], sc.at[bin] = worth, t, int32(n), s
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
// telescope-night, in ascending order within each window and open interval.
func (o *Oracle) scan(sc *scratch, wi int, w *model.Want, step int, t int32, n int, base float64, found func(s int64, bin int32, worth float64)) {
	scope := &o.p.Scopes[t]
	kind := o.kinds[wi][step]
	si := o.shapeOf[kind][t]
	sh := o.shapes[t][si]
	st := &o.starts[int(t)*o.p.Nights+n][si]
	pn := &o.prices.nights[int(t)*o.p.Nights+n]
	g := o.p.Grid(int(scope.Site), n)
	gridFrom, gridStep := model.MicroOf(g.From), model.MicroOf(g.Step)
	value := w.Value / float64(len(w.Steps))
	c := o.p.Sky.Direction(int(w.Field), g.From+g.Step*float64(len(g.Frames)/2))
	open := o.p.OpenOuter(int(t), n)
	sc.windows = o.p.Outer(sc.windows[:0], w.Unit, scope.Class, n)
	for _, win := range sc.windows {
		for k, span := range open {
			lo, hi := max(win.From, span.From), min(win.To, span.To)-sh.length
			if hi < lo {
				continue
			}
			first := int((lo + sh.length/2 - gridFrom) / gridStep)
			last := int((hi + sh.length/2 - gridFrom) / gridStep)
			up := o.profile(sc, g, first, last, int(w.Steps[step].Filter), c)
			worth := func(e *start) float64 {
				i := int(e.cell) - first
				q := up[i] + float64(e.frac)*(up[i+1]-up[i])
				return value*q + base - e.cost
			}
			edge := o.startAt(pn, gridFrom, gridStep, sh, lo)
			found(lo, edge.bin, worth(&edge))
			list := st.list[st.from[k]:st.from[k+1]]
			for i := lowerBound(list, lo); i < len(list) && list[i].at <= hi; i++ {
				e := &list[i]
				v := worth(e)
				found(e.at, e.bin, v)
				if e.at == (int64(e.bin)+o.firstBin)*o.bin && e.bin > 0 && e.at > lo {
					// The bin before ends here.
					found(e.at, e.bin-1, v)
				}
			}
			edge = o.startAt(pn, gridFrom, gridStep, sh, hi)
			found(hi, edge.bin, worth(&edge))
		}
	}
}

// profile fills sc.up with node values such that quality in cell k of
// first..last is at most the line between up[k-first] and up[k-first+1].
func (o *Oracle) profile(sc *scratch, g *visibility.FrameGrid, first, last, filter int, c ephemeris.Vec) []float64 {
	n := last - first + 2
	if cap(sc.up) < n {
		sc.up = make([]float64, n+64)
	}
	up := sc.up[:n]
	up[0] = 0
	for k := first; k <= last; k++ {
		l, r := o.p.Sky.UpperProfile(g, k, filter, c)
		i := k - first
		if l > up[i] {
			up[i] = l
		}
		up[i+1] = r
	}
	return up
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

// gatherSet bounds the worth of a whole set by the bin of its first step:
// each later step may start anywhere within its tolerance after the one
// before.
func (o *Oracle) gatherSet(sc *scratch, wi int, w *model.Want, t int32, n int, floor float64) {
	base, size, ok := o.setBins(sc, wi, w, t, n)
	if !ok {
		return
	}
	for i := range size {
		b := &sc.step[0][i]
		bin := int32(base + i)
		if b.worth > floor && b.worth > sc.worth[bin] {
			if math.IsInf(sc.worth[bin], -1) {
				sc.dirty = append(sc.dirty, bin)
				sc.mark[bin/dayBlock] = true
			}
			sc.worth[bin], sc.scope[bin], sc.night[bin], sc.at[bin] = b.worth, t, int32(n), b.at
		}
	}
}

// setBins leaves in sc.step[j] the bound of steps j.. by the start bin of step j.
func (o *Oracle) setBins(sc *scratch, wi int, w *model.Want, t int32, n int) (base, size int, ok bool) {
	open := o.p.OpenOuter(int(t), n)
	base = int(floorDiv(open[0].From, o.bin) - o.firstBin)
	size = int(floorDiv(open[len(open)-1].To, o.bin)-o.firstBin) - base + 1
	for len(sc.step) < len(w.Steps) {
		sc.step = append(sc.step, nil)
	}
	for j := range w.Steps {
		if cap(sc.step[j]) < size {
			sc.step[j] = make([]binBest, size+64)
		}
		row := sc.step[j][:size]
		for i := range row {
			row[i] = binBest{math.Inf(-1), 0}
		}
		sc.step[j] = row
		any := false
		o.scan(sc, wi, w, j, t, n, o.stepValue(w, j, t), func(s int64, bin int32, worth float64) {
			if i := int(bin) - base; i >= 0 && i < size && worth > row[i].worth {
				row[i] = binBest{worth, s}
				any = true
			}
		})
		if !any {
			return base, size, false
		}
	}
	for j := len(w.Steps) - 2; j >= 0; j-- {
		st := &w.Steps[j+1]
		lo := int(floorDiv(st.After-st.Tolerance, o.bin))
		hi := int(floorDiv(st.After+st.Tolerance, o.bin)) + 1
		row, next := sc.step[j], sc.step[j+1]
		for i := range row {
			best := math.Inf(-1)
			for m := max(0, i+lo); m <= min(size-1, i+hi); m++ {
				best = math.Max(best, next[m].worth)
			}
			row[i].worth += best
		}
	}
	return base, size, true
}
