package dual

import (
	"math"
	"sort"

	"nightwright/scheduler/model"
)

// Prices is what a second of open time costs on each telescope in each slot
// of the survey's grid: the ceiling's multipliers, in C per second. They are
// never below 0.
type Prices struct {
	p     *model.Problem
	slot  int64 // us
	first int64 // slot number (since 1970) of index 0
	n     int   // slots
	// parts are the pieces of slots cut at a moonrise or moonset, where the
	// worth of time jumps: their prices stand behind those of the slots.
	parts []int32   // [rate index - scopes*n] the slot's rate index
	rate  []float64 // [scope*n + slot]
	// capacity in seconds: open time of the telescope inside the slot.
	capacity []float64
	nights   []priceNight // [scope*Nights + night]
}

// priceNight is the running integral of the price over one telescope-night's
// open time, piecewise linear between its knots.
type priceNight struct {
	knots []int64
	open  []bool    // is (knot i, knot i+1) open time
	slots []int32   // price index of (knot i, knot i+1)
	sum   []float64 // integral from knots[0] to knots[i], C
	index []int32   // by slot since the first knot's: last knot at or before its start
	base  int64     // slot number of index[0]
}

// NewPrices returns prices of zero.
func NewPrices(p *model.Problem) *Prices {
	pr := &Prices{p: p, slot: model.MicroOf(p.Survey.Slot)}
	lo, hi := int64(1<<62), int64(-1<<62)
	for t := range p.Scopes {
		for n := range p.Nights {
			for _, o := range p.OpenOuter(t, n) {
				lo, hi = min(lo, o.From), max(hi, o.To)
			}
		}
	}
	if hi < lo {
		lo, hi = 0, 0
	}
	pr.first = floorDiv(lo, pr.slot)
	pr.n = int(floorDiv(hi, pr.slot)-pr.first) + 2
	pr.rate = make([]float64, len(p.Scopes)*pr.n)
	pr.capacity = make([]float64, len(p.Scopes)*pr.n)
	pr.nights = make([]priceNight, len(p.Scopes)*p.Nights)
	for t := range p.Scopes {
		for n := range p.Nights {
			pr.nights[t*p.Nights+n] = pr.layout(t, n)
		}
	}
	return pr
}

// edgeReach is how far about a moonrise or moonset prices have pieces of their
// own, us: half a usual exposure, whose middle may be dark while its other
// half is cheap.
const edgeReach = 120 * model.Micro

// layout sets the knots of a telescope-night and adds its capacity.
func (pr *Prices) layout(scope, night int) priceNight {
	var pn priceNight
	open := pr.p.OpenOuter(scope, night)
	if len(open) == 0 {
		return pn
	}
	var cuts []int64
	for _, e := range pr.p.MoonEdges(int(pr.p.Scopes[scope].Site), night) {
		t := model.MicroOf(e.T)
		cuts = append(cuts, t-edgeReach, t, t+edgeReach)
	}
	for i, o := range open {
		if i > 0 && o.From > open[i-1].To {
			pn.knots = append(pn.knots, open[i-1].To)
			pn.open = append(pn.open, false)
			pn.slots = append(pn.slots, 0)
		}
		from := o.From
		if i > 0 {
			from = max(from, open[i-1].To)
		}
		for t := from; t < o.To; {
			s := floorDiv(t, pr.slot)
			end := min((s+1)*pr.slot, o.To)
			k := scope*pr.n + int(s-pr.first)
			part := false
			for _, c := range cuts {
				if c > s*pr.slot && c < (s+1)*pr.slot {
					part = true
					if c > t {
						end = min(end, c)
					}
				}
			}
			if part {
				pr.parts = append(pr.parts, int32(k))
				pr.rate = append(pr.rate, 0)
				pr.capacity = append(pr.capacity, 0)
				k = len(pr.rate) - 1
			}
			pn.knots = append(pn.knots, t)
			pn.open = append(pn.open, true)
			pn.slots = append(pn.slots, int32(k))
			pr.capacity[k] += model.Sec(end - t)
			t = end
		}
	}
	pn.knots = append(pn.knots, open[len(open)-1].To)
	pn.sum = make([]float64, len(pn.knots))
	pn.base = floorDiv(pn.knots[0], pr.slot)
	last := floorDiv(pn.knots[len(pn.knots)-1], pr.slot)
	for s := pn.base; s <= last; s++ {
		i := sort.Search(len(pn.knots), func(i int) bool { return pn.knots[i] > s*pr.slot }) - 1
		pn.index = append(pn.index, int32(max(i, 0)))
	}
	return pn
}

// integrate refreshes the running integrals after the rates changed.
func (pr *Prices) integrate() {
	pr.meanParts()
	model.Parallel(pr.p.Workers, len(pr.nights), func(i int) {
		pn := &pr.nights[i]
		for k := range pn.open {
			d := 0.0
			if pn.open[k] {
				d = pr.rate[pn.slots[k]] * model.Sec(pn.knots[k+1]-pn.knots[k])
			}
			pn.sum[k+1] = pn.sum[k] + d
		}
	})
}

// Range returns the least and the greatest price in each telescope-night's open
// time, C per second, by telescope and night.
func (pr *Prices) Range() (least, most []float64) {
	most = make([]float64, len(pr.nights))
	for i := range pr.nights {
		for j, k := range pr.nights[i].slots {
			if pr.nights[i].open[j] {
				most[i] = math.Max(most[i], pr.rate[k])
			}
		}
	}
	return pr.leastRates(nil), most
}

// leastRates returns the least price in each telescope-night's open time.
func (pr *Prices) leastRates(out []float64) []float64 {
	out = grow(out, len(pr.nights))
	for i := range pr.nights {
		pn := &pr.nights[i]
		least := math.Inf(1)
		for k := range pn.open {
			if pn.open[k] {
				least = math.Min(least, pr.rate[pn.slots[k]])
			}
		}
		if math.IsInf(least, 1) {
			least = 0
		}
		out[i] = least
	}
	return out
}

// until returns the integral of the price over open time from the night's
// first knot to an instant; constant outside the knots.
func (pr *Prices) until(pn *priceNight, us int64) float64 {
	if len(pn.knots) == 0 || us <= pn.knots[0] {
		return 0
	}
	last := len(pn.knots) - 1
	if us >= pn.knots[last] {
		return pn.sum[last]
	}
	k := int(pn.index[floorDiv(us, pr.slot)-pn.base])
	for pn.knots[k+1] <= us {
		k++
	}
	if !pn.open[k] {
		return pn.sum[k]
	}
	return pn.sum[k] + pr.rate[pn.slots[k]]*model.Sec(us-pn.knots[k])
}

// meanParts gives every slot that is cut the mean price of its pieces.
func (pr *Prices) meanParts() {
	base := len(pr.p.Scopes) * pr.n
	weight := make(map[int32]float64, len(pr.parts))
	for i, k := range pr.parts {
		c := pr.capacity[base+i] + 1e-9
		pr.rate[k] = (pr.rate[k]*weight[k] + pr.rate[base+i]*c) / (weight[k] + c)
		weight[k] += c
	}
}

// openSeconds returns a slot's open time on a telescope, pieces included.
func (pr *Prices) openSeconds() []float64 {
	base := len(pr.p.Scopes) * pr.n
	out := append([]float64(nil), pr.capacity[:base]...)
	for i, k := range pr.parts {
		out[k] += pr.capacity[base+i]
	}
	return out
}

// slotOf returns the slot's rate index of a rate index.
func (pr *Prices) slotOf(k int) int {
	if base := len(pr.p.Scopes) * pr.n; k >= base {
		return int(pr.parts[k-base])
	}
	return k
}

// charge adds busy seconds [from, to) of a telescope-night to the loads by
// rate index.
func (pr *Prices) charge(load []float32, scope, night int, from, to int64) {
	pn := &pr.nights[scope*pr.p.Nights+night]
	if len(pn.knots) == 0 {
		return
	}
	last := len(pn.knots) - 1
	from, to = max(from, pn.knots[0]), min(to, pn.knots[last])
	if from >= to {
		return
	}
	k := int(pn.index[floorDiv(from, pr.slot)-pn.base])
	for ; k < last && pn.knots[k] < to; k++ {
		a, b := max(from, pn.knots[k]), min(to, pn.knots[k+1])
		if b > a && pn.open[k] {
			load[pn.slots[k]] += float32(model.Sec(b - a))
		}
	}
}

// Cost returns the price of the open time of a telescope-night inside
// [from, to), in C.
func (pr *Prices) Cost(scope, night int, from, to int64) float64 {
	pn := &pr.nights[scope*pr.p.Nights+night]
	return pr.until(pn, to) - pr.until(pn, from)
}

// At returns the price at an instant, C per second; 0 outside the period.
func (pr *Prices) At(scope int, us int64) float64 {
	s := floorDiv(us, pr.slot) - pr.first
	if s < 0 || s >= int64(pr.n) {
		return 0
	}
	return pr.rate[scope*pr.n+int(s)]
}

// List returns the prices of all slots with open time, for the tables.
func (pr *Prices) List() []model.Price {
	var out []model.Price
	open := pr.openSeconds()
	for t := range pr.p.Scopes {
		for s := range pr.n {
			if open[t*pr.n+s] > 0 {
				out = append(out, model.Price{
					Telescope: int32(t),
					SlotStart: (pr.first + int64(s)) * pr.slot / model.Micro,
					PerHour:   3600 * pr.rate[t*pr.n+s],
				})
			}
		}
	}
	return out
}

// floorDiv divides rounding towards minus infinity.
func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b != 0 && (a < 0) != (b < 0) {
		q--
	}
	return q
}
