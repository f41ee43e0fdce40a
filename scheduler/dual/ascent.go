package dual

import (
	"context"
	"math"

	"nightwright/scheduler/model"
)

// Level is one stage of the price search: prices move in blocks of slots, on
// a sample of the fields.
type Level struct {
	Nights  int     // nights a block spans
	Hours   float64 // sidereal hours a block spans; 0: single slots
	Steps   int
	Sample  int     // every Sample-th field, changing with the step
	Eta     float64 // first step size
	EtaLast float64
	Bin     float64 // start bins, s
}

// Ascent finds prices that bring the bound down, coarse to fine.
type Ascent struct {
	p      *model.Problem
	prices *Prices
	oracle *Oracle
	peaks  *Peaks
	scale  float64 // C per second: a typical price
	loads  [][]float32
}

// chunks is the fixed number of parts the fields are worked in; loads merge
// in this order, so that sums don't depend on the number of workers.
const chunks = 16

// NewAscent starts from zero prices.
func NewAscent(p *model.Problem, peaks *Peaks) *Ascent {
	pr := NewPrices(p)
	a := &Ascent{p: p, prices: pr, peaks: peaks, oracle: NewOracle(p, pr, peaks)}
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

// Run takes the steps of one level. progress may be nil.
func (a *Ascent) Run(ctx context.Context, lv Level, progress func(step, of int, bound float64)) {
	if lv.Steps == 0 || a.scale == 0 {
		return
	}
	a.oracle.SetBins(lv.Bin, false)
	block, blocks := a.blocks(lv)
	capacity := make([]float64, blocks)
	keep := a.keepFactor()
	for s, c := range a.prices.capacity {
		if c > 0 {
			capacity[block[s]] += c * keep[s/a.prices.n]
		}
	}
	velocity := make([]float64, blocks)
	load := make([]float64, blocks)
	for step := range lv.Steps {
		if ctx.Err() != nil {
			return
		}
		eta := lv.Eta * math.Pow(lv.EtaLast/lv.Eta, float64(step)/math.Max(1, float64(lv.Steps-1)))
		a.oracle.Refresh()
		a.peaks.SetPrices(a.prices)
		bound := a.sweep(lv.Sample, step%lv.Sample)
		clear(load)
		for _, l := range a.loads {
			for s, x := range l {
				if x != 0 {
					load[block[s]] += float64(x)
				}
			}
		}
		for b := range load {
			if capacity[b] <= 0 {
				continue
			}
			x := (load[b]*float64(lv.Sample) - capacity[b]) / capacity[b]
			x = math.Max(-1, math.Min(1.5, x))
			velocity[b] = 0.5*velocity[b] + 0.5*x
		}
		for s, c := range a.prices.capacity {
			if c > 0 {
				a.prices.rate[s] = math.Max(0, a.prices.rate[s]+eta*a.scale*velocity[block[s]])
			}
		}
		if progress != nil {
			progress(step+1, lv.Steps, bound*float64(lv.Sample)+a.capacityValue())
		}
	}
	a.prices.integrate()
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

// sweep solves every sample-th field from offset and leaves the loads; it
// returns the sum of the wants' bounds.
func (a *Ascent) sweep(sample, offset int) float64 {
	sums := make([]float64, chunks)
	o := a.oracle
	fields := len(a.p.FieldWant) - 1
	pool := newPool(a.p.Workers, o.newScratch)
	model.Parallel(a.p.Workers, chunks, func(c int) {
		sc := pool.get()
		defer pool.put(sc)
		load := a.loads[c]
		clear(load)
		var picks []pick
		for f := c * fields / chunks; f < (c+1)*fields/chunks; f++ {
			if f%sample != offset {
				continue
			}
			for wi := a.p.FieldWant[f]; wi < a.p.FieldWant[f+1]; wi++ {
				var b float64
				b, picks = o.best(sc, int(wi), picks[:0])
				sums[c] += b
				a.addLoad(load, int(wi), picks)
			}
		}
	})
	var sum float64
	for _, s := range sums {
		sum += s
	}
	return sum
}

// addLoad adds the time of the picks to the slots.
func (a *Ascent) addLoad(load []float32, wi int, picks []pick) {
	w := &a.p.Wants[wi]
	for i := range picks {
		pk := &picks[i]
		s := pk.at
		for k := range w.Steps {
			if k > 0 {
				s += w.Steps[k].After
			}
			sh := a.oracle.shapes[pk.scope][a.oracle.shapeOf[a.oracle.kinds[wi][k]][pk.scope]]
			for t, end := s, s+sh.busy; t < end; {
				slot := floorDiv(t, a.prices.slot)
				next := min(end, (slot+1)*a.prices.slot)
				if j := slot - a.prices.first; j >= 0 && j < int64(a.prices.n) {
					load[int(pk.scope)*a.prices.n+int(j)] += float32(model.Sec(next - t))
				}
				t = next
			}
		}
	}
}

// blocks assigns each slot to its block of the level: telescope, group of
// nights, and sidereal hours.
func (a *Ascent) blocks(lv Level) (block []int32, n int) {
	pr := a.prices
	block = make([]int32, len(pr.rate))
	if lv.Hours == 0 && lv.Nights <= 1 {
		for s := range block {
			block[s] = int32(s)
		}
		return block, len(block)
	}
	perDay := int(math.Ceil(24 / lv.Hours))
	groups := (a.p.Nights+2)/lv.Nights + 2
	for t := range a.p.Scopes {
		lon := a.p.Survey.Sites[a.p.Scopes[t].Site].Longitude
		for s := range pr.n {
			us := (pr.first+int64(s))*pr.slot + pr.slot/2
			local := model.Sec(us) - 43200 + lon/(2*math.Pi)*86400
			night := int(math.Floor(local/86400)) - int(a.p.Survey.FirstNight) + 1
			group := min(max(night/lv.Nights, 0), groups-1)
			// Sidereal time to a minute or so is enough to group slots.
			lst := math.Mod(model.Sec(us)/86164.0905+lon/(2*math.Pi), 1)
			if lst < 0 {
				lst++
			}
			h := min(int(lst*24/lv.Hours), perDay-1)
			block[t*pr.n+s] = int32((t*groups+group)*perDay + h)
		}
	}
	return block, len(a.p.Scopes) * groups * perDay
}

// pool hands scratch memory to workers.
type pool struct{ free chan *scratch }

func newPool(workers int, make_ func() *scratch) *pool {
	p := &pool{free: make(chan *scratch, max(1, workers))}
	for range max(1, workers) {
		p.free <- make_()
	}
	return p
}

func (p *pool) get() *scratch  { return <-p.free }
func (p *pool) put(s *scratch) { p.free <- s }
