package dual

import (
	"cmp"
	"context"
	"math"
	"slices"

	"nightwright/scheduler/model"
)

// The soft oracle steers prices: in place of its one best set of visits, a want
// spreads its visits over all good sets, a set of worth W with weight
// exp(W/tau) (the entropy smoothing of a Lagrangian; Nesterov 2005). The load
// then answers a change of price smoothly, where the best set's load jumps, and
// how much it answers is known: prices move by Newton's step. tau falls from
// step to step. What the soft oracle returns proves nothing.

// softChunks is the fixed number of parts of a soft sweep.
const softChunks = 8

// softLoad is what a part of a sweep leaves.
type softLoad struct {
	mass  []float32 // [start] expected visits
	give  []float32 // [start] what mass loses for a unit of C more in its price alone
	night []float64 // [scope*Nights + night] seconds lost for a price of 1 C/s more all night
	time  []float64 // [program] exposure, s
	value float64
}

// piece is a part of a telescope-night that may hold one visit of a want.
type piece struct {
	at           int64   // start of its best moment
	soft         float64 // tau log sum exp(worth/tau)
	scope, night int32
	from, to     int // weights in sc.weight
	first        int // index of the first start
}

type softScratch struct {
	pieces []piece
	weight []float64
	row    []float64
	rows   [][]float64
	best   [][]int32
	f, b   []float64
	prev   []int32
	next   []int32
	prob   []float64
}

// shortPiece is the least width of a piece, us; day is more than any night.
const (
	shortPiece = 1200 * model.Micro
	day        = 24 * 3600 * model.Micro
)

// pieceWidth returns how telescope-nights are cut for a want: whole where no
// two visits fit one.
func pieceWidth(w *model.Want) int64 {
	width := w.Spacing
	if w.PerNight > 0 {
		width = max(width, 12*3600*model.Micro/int64(w.PerNight))
	}
	if width >= 12*3600*model.Micro {
		return day
	}
	return max(width, shortPiece)
}

// softSweep solves every sample-th field from offset at tau (a part of each
// want's value) and fills the loads.
func (a *Ascent) softSweep(ctx context.Context, tau float64, sample, offset int) float64 {
	o := a.oracle
	fields := len(a.p.FieldWant) - 1
	pool := make(chan *softScratch, a.p.Workers)
	for range a.p.Workers {
		pool <- &softScratch{}
	}
	model.Parallel(a.p.Workers, softChunks, func(c int) {
		sc := <-pool
		defer func() { pool <- sc }()
		ld := &a.softs[c]
		clear(ld.mass)
		clear(ld.give)
		clear(ld.night)
		clear(ld.time)
		ld.value = 0
		for f := c * fields / softChunks; f < (c+1)*fields/softChunks; f++ {
			if a.rank[f]%sample != offset {
				continue
			}
			if f%32 == 0 && ctx.Err() != nil {
				return
			}
			for wi := a.p.FieldWant[f]; wi < a.p.FieldWant[f+1]; wi++ {
				ld.value += o.softWant(sc, ld, int(wi), tau)
			}
		}
	})
	var sum float64
	for c := range a.softs {
		sum += a.softs[c].value
	}
	return sum * float64(sample)
}

// softWant spreads a want's visits and adds them to the load. It leaves the
// count multiplier in Mu and returns the want's smoothed value.
func (o *Oracle) softWant(sc *softScratch, ld *softLoad, wi int, part float64) float64 {
	w := &o.p.Wants[wi]
	if w.Visits == 0 || len(w.Scopes) == 0 {
		return 0
	}
	tau := part * w.Value
	width := pieceWidth(w)
	n := float64(w.Visits)
	floor := o.Mu[wi] - 8*tau
	var mu, value float64
	for {
		floor = math.Max(floor, -3*tau)
		sc.gather(o, wi, w, tau, floor, width)
		mu, value = sc.spread(w, n, tau, o.Mu[wi])
		if mu-5*tau >= floor || floor <= -3*tau {
			break
		}
		floor = math.Min(mu-8*tau, floor-8*tau)
	}
	o.Mu[wi] = mu
	sc.load(o, ld, wi, w, tau)
	return n*mu + value
}

// gather lists the pieces whose soft worth is above floor, by time.
func (sc *softScratch) gather(o *Oracle, wi int, w *model.Want, tau, floor float64, width int64) {
	sc.pieces, sc.weight = sc.pieces[:0], sc.weight[:0]
	for _, t := range w.Scopes {
		for n := range o.p.Nights {
			if len(o.soft[int(t)*o.p.Nights+n]) == 0 || o.limit(w, t, n) <= floor {
				continue
			}
			var from, to int
			var top float64
			if len(w.Steps) == 1 {
				sc.row, from, to, top = sc.fillRow(o, wi, w, 0, t, n, sc.row)
			} else {
				from, to, top = sc.fillSet(o, wi, w, t, n)
			}
			if top <= floor-2*tau {
				continue
			}
			at := o.soft[int(t)*o.p.Nights+n][o.shapeOf[o.kinds[wi][0]][t]].at
			for from < to {
				end := to
				if width < day {
					cut := (floorDiv(at[from], width) + 1) * width
					end = from
					for end < to && at[end] < cut {
						end++
					}
				}
				sc.add(at, from, end, t, int32(n), tau, floor)
				from = end
			}
		}
	}
	slices.SortFunc(sc.pieces, func(x, y piece) int {
		return cmp.Or(cmp.Compare(x.at, y.at), cmp.Compare(x.scope, y.scope))
	})
}

// add appends the piece of the starts [from, to).
func (sc *softScratch) add(at []int64, from, to int, scope, night int32, tau, floor float64) {
	top, best := math.Inf(-1), from
	for k := from; k < to; k++ {
		if sc.row[k] > top {
			top, best = sc.row[k], k
		}
	}
	if !(top > floor-2*tau) {
		return
	}
	first := len(sc.weight)
	sum := 0.0
	for k := from; k < to; k++ {
		x := (sc.row[k] - top) / tau
		e := 0.0
		if x > -12 {
			e = math.Exp(x)
		}
		sum += e
		sc.weight = append(sc.weight, e)
	}
	soft := top + tau*math.Log(sum)
	if soft <= floor {
		sc.weight = sc.weight[:first]
		return
	}
	for k := first; k < len(sc.weight); k++ {
		sc.weight[k] /= sum
	}
	sc.pieces = append(sc.pieces, piece{at[best], soft, scope, night, first, len(sc.weight), from})
}

// spread finds the count multiplier at which n visits are expected, or 0, and
// leaves each piece's probability in sc.prob. value is tau times the log of the
// partition sum.
func (sc *softScratch) spread(w *model.Want, n, tau, guess float64) (mu, value float64) {
	m := len(sc.pieces)
	sc.f, sc.b, sc.prob = grow(sc.f, m+1), grow(sc.b, m+1), grow(sc.prob, m)
	sc.prev, sc.next = grow(sc.prev, m), grow(sc.next, m)
	if m == 0 {
		return 0, 0
	}
	gap := max(w.Spacing, 1)
	p, q := 0, 0
	for i := range sc.pieces {
		for sc.pieces[i].at-sc.pieces[p].at >= gap {
			p++
		}
		for q < m && sc.pieces[q].at-sc.pieces[i].at < gap {
			q++
		}
		sc.prev[i], sc.next[i] = int32(p), int32(q)
	}
	mu = math.Max(0, guess)
	lo, hi := 0.0, math.Inf(1)
	for try := range 12 {
		var count, vary float64
		count, vary, value = sc.partition(mu, tau)
		if math.Abs(count-n) < 0.005*n || mu == 0 && count <= n {
			break
		}
		if count > n {
			lo = mu
		} else {
			hi = mu
		}
		if try == 11 {
			break
		}
		step := tau * (count - n) / math.Max(vary, 0.05*n)
		next := mu + math.Max(-8*tau, math.Min(8*tau, step))
		if next <= lo || next >= hi {
			if math.IsInf(hi, 1) {
				next = lo + 4*tau
			} else {
				next = (lo + hi) / 2
			}
		}
		mu = math.Max(0, next)
		if lo == 0 && hi < 1e-3*tau {
			mu = 0
		}
	}
	return mu, value
}

// partition runs the interval programme forwards and backwards over sums of
// weights in place of maxima.
func (sc *softScratch) partition(mu, tau float64) (count, vary, value float64) {
	m := len(sc.pieces)
	sc.f[0], sc.b[m] = 0, 0
	for i := range m {
		sc.f[i+1] = logAdd(sc.f[i], sc.f[sc.prev[i]]+(sc.pieces[i].soft-mu)/tau)
	}
	for i := m - 1; i >= 0; i-- {
		sc.b[i] = logAdd(sc.b[i+1], sc.b[sc.next[i]]+(sc.pieces[i].soft-mu)/tau)
	}
	for i := range m {
		x := sc.f[sc.prev[i]] + (sc.pieces[i].soft-mu)/tau + sc.b[sc.next[i]] - sc.f[m]
		p := math.Exp(math.Min(0, x))
		sc.prob[i] = p
		count += p
		vary += p * (1 - p)
	}
	return count, vary, tau * sc.f[m]
}

// logAdd is log(exp(a) + exp(b)).
func logAdd(a, b float64) float64 {
	if b > a {
		a, b = b, a
	}
	if b < a-30 {
		return a
	}
	return a + math.Log1p(math.Exp(b-a))
}

// load adds the want's expected visits.
func (sc *softScratch) load(o *Oracle, ld *softLoad, wi int, w *model.Want, tau float64) {
	for i := range sc.pieces {
		prob := sc.prob[i]
		if prob < 1e-5 {
			continue
		}
		pc := &sc.pieces[i]
		night := int(pc.scope)*o.p.Nights + int(pc.night)
		if len(w.Steps) > 1 {
			sc.loadSet(o, ld, wi, w, pc, prob, tau)
		} else {
			si := o.shapeOf[o.kinds[wi][0]][pc.scope]
			sh := o.shapes[pc.scope][si]
			at := o.soft[night][si].first + pc.first
			for k, x := range sc.weight[pc.from:pc.to] {
				p := prob * x
				ld.mass[at+k] += float32(p)
				ld.give[at+k] += float32(p * math.Max(1-p, leastYield) / tau)
			}
			ld.time[w.Program] += prob * model.Sec(sh.length)
			busy := model.Sec(sh.busy)
			ld.night[night] += prob * math.Max(1-prob, leastYield) / tau * busy * busy
		}
	}
}

// leastYield keeps Newton's steps finite where a visit is all but certain.
const leastYield = 0.2
