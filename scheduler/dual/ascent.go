package dual

import (
	"context"
	"math"
	"math/rand/v2"

	"nightwright/scheduler/model"
)

// Level is one stage of the price search on the proving oracle: slots move by
// their relative excess demand.
type Level struct {
	Steps   int
	Eta     float64 // first step size
	EtaLast float64
	Memory  float64 // part of the old direction kept each step
}

// block says how slots are grouped.
type block struct {
	nights  int     // nights a block spans; 0: all
	hours   float64 // sidereal hours it spans; 0: single slots; 24: whole nights
	network bool    // over all telescopes
	gain    float64
}

// parents are the coarser groups whose excess moves every price below them
// too. Load answers a price that rises everywhere much less than one that
// rises in a single slot, so the coarser the group, the greater its gain.
var parents = []block{
	{nights: 0, hours: 24, network: true, gain: 4},
	{nights: 7, hours: 24, network: true, gain: 1},
	{nights: 1, hours: 24, network: true, gain: 0.5},
	{nights: 1, hours: 24, gain: 0.5},
}

// networks is how many of the parents are groups over all telescopes.
const networks = 3

// Ascent finds prices that bring the bound down, coarse to fine.
type Ascent struct {
	p      *model.Problem
	prices *Prices
	oracle *Oracle
	scale  float64 // C per second: a typical price
	loads  [][]float32
	times  [][]float64 // [chunk][program] exposure time of the picks, s
	shares *shareState
	softs  []softLoad // [chunk] of a soft sweep
	base   []float64  // [scope*Nights + night] the night's own price under those of its slots, where keep_free asks for one
	pace   []float64  // [rate index] last soft step
	unit   []float64  // [rate index] C per second: what a visit there is worth
	rank   []int      // a shuffle of the fields, for sampling
}

// chunks is the fixed number of parts the fields are worked in; loads merge
// in this order, so that sums don't depend on the number of workers.
const chunks = 16

// NewAscent starts from zero prices.
func NewAscent(p *model.Problem) *Ascent {
	pr := NewPrices(p)
	a := &Ascent{p: p, prices: pr, oracle: NewOracle(p, pr)}
	var value, time float64
	for i := range p.Wants {
		w := &p.Wants[i]
		if len(w.Scopes) == 0 {
			continue
		}
		value += float64(w.Visits) * w.Value
		for k := range w.Steps {
			time += float64(w.Visits) * model.Sec(p.Length(&w.Steps[k], w.Scopes[0])+p.Scopes[w.Scopes[0]].LeastGap)
		}
	}
	if time > 0 {
		a.scale = 0.2 * value / time
	}
	a.rank = rand.New(rand.NewPCG(1, 0)).Perm(len(p.FieldWant) - 1)
	a.base = make([]float64, len(pr.nights))
	a.unit = make([]float64, len(pr.rate))
	for k := range a.unit {
		a.unit[k] = a.scale
	}
	a.shares = newShareState(p)
	a.times = make([][]float64, chunks)
	for i := range a.times {
		a.times[i] = make([]float64, len(p.Survey.Programs))
	}
	a.loads = make([][]float32, chunks)
	for i := range a.loads {
		a.loads[i] = make([]float32, len(pr.rate))
	}
	return a
}

// Prices returns the current prices.
func (a *Ascent) Prices() *Prices { return a.prices }

// Oracle returns the oracle with its multipliers.
func (a *Ascent) Oracle() *Oracle { return a.oracle }

// Run takes the steps of one level, and ends at the best prices met. progress
// may be nil.
func (a *Ascent) Run(ctx context.Context, lv Level, progress func(step, of int, bound float64)) {
	if lv.Steps == 0 || a.scale == 0 {
		return
	}
	a.oracle.Fine(fineBin)
	best := math.Inf(1)
	var kept Kept
	groups := []*group{a.group(block{nights: 1, gain: 1}, lv.Memory)}
	for _, pb := range parents {
		groups = append(groups, a.group(pb, 0.5*lv.Memory))
	}
	load := make([]float64, len(a.prices.rate))
	for step := range lv.Steps {
		if ctx.Err() != nil {
			break
		}
		eta := lv.Eta * math.Pow(lv.EtaLast/lv.Eta, float64(step)/math.Max(1, float64(lv.Steps-1)))
		a.oracle.Refresh()
		bound := a.sweep(ctx)
		if ctx.Err() != nil {
			break
		}
		bound += a.capacityValue() - a.keepFreeValue() + a.shares.slack(a.oracle.Share)
		if bound < best {
			best, kept = bound, a.Keep()
		}
		clear(load)
		for _, l := range a.loads {
			for s, x := range l {
				load[s] += float64(x)
			}
		}
		for _, g := range groups {
			g.move(load)
		}
		a.shares.move(a.programTime(), eta*a.scale)
		a.shares.rates(a.oracle.Share)
		a.move(groups, eta)
		if progress != nil {
			progress(step+1, lv.Steps, bound)
		}
	}
	if !math.IsInf(best, 1) {
		a.Restore(kept)
	}
	a.round()
}

// fineBin is the width of the start bins of fine levels, s.
const fineBin = 600

// Kept is a state of the prices that Restore goes back to.
type Kept struct{ rate, base, mu, low, high []float64 }

// Keep returns the present prices and count multipliers.
func (a *Ascent) Keep() Kept {
	return Kept{append([]float64(nil), a.prices.rate...), append([]float64(nil), a.base...), append([]float64(nil), a.oracle.Mu...),
		append([]float64(nil), a.shares.low...), append([]float64(nil), a.shares.high...)}
}

// Restore goes back to kept prices, and to the least gaps that a proof needs.
func (a *Ascent) Restore(k Kept) {
	a.oracle.soft = nil
	copy(a.prices.rate, k.rate)
	copy(a.base, k.base)
	copy(a.oracle.Mu, k.mu)
	copy(a.shares.low, k.low)
	copy(a.shares.high, k.high)
	a.shares.rates(a.oracle.Share)
	for t := range a.oracle.shapes {
		for i := range a.oracle.shapes[t] {
			a.oracle.shapes[t][i].busy = a.oracle.shapes[t][i].length + a.p.Scopes[t].LeastGap
		}
	}
	a.prices.integrate()
}

// Steer turns the prices into ones for a plan search: visits are charged the
// gap a plan will really need on the telescope, not the least. What it leaves
// proves nothing; take List before.
func (a *Ascent) Steer(ctx context.Context, st Soft, steps int, progress func(step, of int, bound float64)) {
	o := a.oracle
	for t := range o.shapes {
		extra := max(0, a.p.Scopes[t].TypicalGap-a.p.Scopes[t].LeastGap)
		for i := range o.shapes[t] {
			o.shapes[t][i].busy = o.shapes[t][i].length + a.p.Scopes[t].LeastGap + extra
		}
	}
	o.soft = nil
	st.Steps, st.Tau = steps, 4*st.TauLast
	a.Soften(ctx, st, progress)
}

// keepFactor returns, per telescope, the part of the open time that keep_free leaves.
func (a *Ascent) keepFactor() []float64 {
	out := make([]float64, len(a.p.Scopes))
	for t := range out {
		out[t] = 1 - a.p.Scopes[t].KeepFree
	}
	return out
}

// capacityValue is what the priced time is worth at the current prices.
func (a *Ascent) capacityValue() float64 {
	var sum float64
	for s, c := range a.prices.capacity {
		sum += c * a.prices.rate[s]
	}
	return sum
}

// sweep solves every field and leaves the loads; it returns the sum of the wants' bounds.
func (a *Ascent) sweep(ctx context.Context) float64 {
	sums := make([]float64, chunks)
	o := a.oracle
	fields := len(a.p.FieldWant) - 1
	pool := newPool(a.p.Workers, o.newScratch)
	model.Parallel(a.p.Workers, chunks, func(c int) {
		sc := pool.get()
		defer pool.put(sc)
		load := a.loads[c]
		clear(load)
		clear(a.times[c])
		for f := c * fields / chunks; f < (c+1)*fields/chunks; f++ {
			if f%32 == 0 && ctx.Err() != nil {
				return
			}
			sums[c] += o.field(sc, f, func(wi int, picks []pick) { a.addLoad(c, wi, picks) })
		}
	})
	var sum float64
	for _, s := range sums {
		sum += s
	}
	return sum
}

// programTime sums the picks' exposure time by program.
func (a *Ascent) programTime() []float64 {
	out := make([]float64, len(a.p.Survey.Programs))
	for _, t := range a.times {
		for i, x := range t {
			out[i] += x
		}
	}
	return out
}

// addLoad adds the time of the picks to the slots.
func (a *Ascent) addLoad(chunk, wi int, picks []pick) {
	load := a.loads[chunk]
	w := &a.p.Wants[wi]
	for i := range picks {
		pk := &picks[i]
		s := pk.at
		for k := range w.Steps {
			if k > 0 {
				s += w.Steps[k].After
			}
			sh := a.oracle.shapes[pk.scope][a.oracle.shapeOf[a.oracle.kinds[wi][k]][pk.scope]]
			a.times[chunk][w.Program] += model.Sec(sh.length)
			a.prices.charge(load, int(pk.scope), int(pk.night), s, s+sh.busy)
		}
	}
}
