package dual

import (
	"context"
	"math"

	"nightwright/scheduler/model"
)

// Soft is one stage of the smoothed price search.
type Soft struct {
	Steps        int
	Tau, TauLast float64 // smoothing, part of a visit's value
	Slot, Night  float64 // damping of Newton's steps
	Most         float64 // bound of a step, in units that make a set e times less likely
	Network      float64 // gain of the groups over the network
	Memory       float64 // part of the last step taken again
}

// Soften takes the steps of one stage. progress may be nil.
func (a *Ascent) Soften(ctx context.Context, st Soft, progress func(step, of int, bound float64)) {
	if st.Steps == 0 || a.scale == 0 {
		return
	}
	a.layLoads(a.oracle.softCells())
	var groups []*group
	for _, pb := range parents[:networks] {
		groups = append(groups, a.group(pb, 0.5))
	}
	load := make([]float64, len(a.prices.rate))
	give := make([]float64, len(a.prices.rate))
	along := func(from, to float64, step int) float64 {
		return from * math.Pow(to/from, float64(step)/math.Max(1, float64(st.Steps-1)))
	}
	if a.pace == nil {
		a.pace = make([]float64, len(a.prices.rate))
	}
	fall := math.Pow(st.TauLast/st.Tau, 1/math.Max(1, float64(st.Steps-1)))
	for step := range st.Steps {
		if ctx.Err() != nil {
			return
		}
		a.prices.integrate()
		a.oracle.least = a.prices.leastRates(a.oracle.least)
		a.oracle.softCosts()
		tau := along(st.Tau, st.TauLast, step)
		sample := a.sample(tau, st.Steps-step)
		bound := a.softSweep(ctx, tau, sample, step%sample)
		if ctx.Err() != nil {
			break
		}
		a.sumLoads(load, give, float64(sample))
		bound += a.capacityValue() - a.keepFreeValue() + a.shares.slack(a.oracle.Share)
		for _, g := range groups {
			g.move(load)
		}
		a.moveSoft(st, fall, groups, load, give, tau, float64(sample))
		if progress != nil {
			progress(step+1, st.Steps, bound)
		}
	}
	a.round()
}

// round takes what is left of prices that were on their way to nothing for
// nothing. Any prices make a ceiling.
func (a *Ascent) round() {
	for k, r := range a.prices.rate {
		if r < leastPrice*a.unit[k] {
			a.prices.rate[k] = 0
		}
	}
	a.prices.integrate()
}

// leastPrice is the least price there is, in parts of what a visit is worth.
const leastPrice = 1e-4

// sample says which part of the fields (one in so many) a step looks at: the
// more smoothing there is, the fewer show where the load is. The last steps look
// at all.
func (a *Ascent) sample(tau float64, left int) int {
	enough := 1500
	switch {
	case left <= 2:
		return 1
	case tau >= 0.02:
		enough = 250
	case tau >= 0.005:
		enough = 500
	}
	return max(1, (len(a.p.FieldWant)-1)/enough)
}

func (a *Ascent) layLoads(n int) {
	if a.softs == nil || len(a.softs[0].mass) != n {
		a.softs = make([]softLoad, softChunks)
		for c := range a.softs {
			a.softs[c] = softLoad{
				mass: make([]float32, n), give: make([]float32, n),
				night: make([]float64, len(a.prices.nights)), time: make([]float64, len(a.p.Survey.Programs)),
			}
		}
	}
}

// sumLoads merges the parts' starts, in their order, into the slots' loads and
// what each slot's load gives way to its price.
func (a *Ascent) sumLoads(load, give []float64, scale float64) {
	clear(load)
	clear(give)
	pr := a.prices
	for i := range a.oracle.soft {
		pn := &pr.nights[i]
		for s := range a.oracle.soft[i] {
			c := &a.oracle.soft[i][s]
			busy := a.oracle.shapes[i/a.p.Nights][s].busy
			for k, at := range c.at {
				var m, g float64
				for x := range a.softs {
					m += float64(a.softs[x].mass[c.first+k])
					g += float64(a.softs[x].give[c.first+k])
				}
				if m > 0 {
					pr.spreadOver(pn, at, at+busy, m*scale, g*scale, load, give)
				}
			}
		}
	}
	for c := 1; c < len(a.softs); c++ {
		for i, x := range a.softs[c].night {
			a.softs[0].night[i] += x
		}
		for i, x := range a.softs[c].time {
			a.softs[0].time[i] += x
		}
	}
}

// spreadOver adds m visits that take [from, to) to the loads.
func (pr *Prices) spreadOver(pn *priceNight, from, to int64, m, g float64, load, give []float64) {
	last := len(pn.knots) - 1
	from, to = max(from, pn.knots[0]), min(to, pn.knots[last])
	if from >= to {
		return
	}
	for k := int(pn.index[floorDiv(from, pr.slot)-pn.base]); k < last && pn.knots[k] < to; k++ {
		x, y := max(from, pn.knots[k]), min(to, pn.knots[k+1])
		if y > x && pn.open[k] {
			sec := model.Sec(y - x)
			load[pn.slots[k]] += m * sec
			give[pn.slots[k]] += g * sec * sec
		}
	}
}

// moveSoft moves the prices: each slot and each telescope-night by Newton's
// step, damped and bounded, groups over the network by their excess.
func (a *Ascent) moveSoft(st Soft, fall float64, groups []*group, load, give []float64, tau, scale float64) {
	pr := a.prices
	keep := a.keepFactor()
	usual := 5 * tau * a.scale
	for i := range pr.nights {
		pn := &pr.nights[i]
		t := i / a.p.Nights
		var use, room, yield float64
		for j, k := range pn.slots {
			if pn.open[j] {
				use += load[k]
				yield += give[k]
				room += pr.capacity[k] * keep[t]
			}
		}
		if room == 0 {
			continue
		}
		// One unit of price here: what makes a set e times less likely.
		unit := usual
		if yield > 0 && use > 0 {
			unit = use / yield
		}
		whole := answer(use, room, a.softs[0].night[i]*scale, st.Night, st.Most*unit)
		base := a.base[i]
		if keep[t] < 1 {
			a.base[i] = math.Max(0, base+whole+st.Network*unit*drift(groups, pn, use < room))
		}
		for j, k := range pn.slots {
			c := pr.capacity[k]
			if !pn.open[j] || c <= 0 {
				continue
			}
			own := unit
			if give[k] > 0 && load[k] > 0 {
				own = load[k] / give[k]
			}
			a.unit[k] = own / (5 * tau)
			d := answer(load[k], c, give[k], st.Slot, st.Most*own)
			if keep[t] == 1 {
				d += whole
				for _, g := range groups {
					if v := g.velocity[g.of[k]]; v > 0 || load[k] < c {
						d += st.Network * own * g.step[g.of[k]] * v
					}
				}
			}
			old := pr.rate[k] - base
			next := math.Max(0, old+st.Memory*a.pace[k]*fall+d)
			pr.rate[k], a.pace[k] = a.base[i]+next, next-old
		}
	}
	a.shares.move(a.softs[0].time, 5*tau*a.scale)
	a.shares.rates(a.oracle.Share)
}

// drift is what groups over the network add to a whole night's price.
func drift(groups []*group, pn *priceNight, idle bool) float64 {
	var d float64
	for _, g := range groups {
		if v := g.velocity[g.of[pn.slots[0]]]; v > 0 || idle {
			d += g.step[g.of[pn.slots[0]]] * v
		}
	}
	return d
}

// answer is the change of price that brings a load to its capacity: load falls
// by give for a unit of price, at first; by exp(-give/load x price) beyond, as
// the sets' weights do. It is at most most.
func answer(load, capacity, give, damp, most float64) float64 {
	if load <= 1e-3*capacity || give <= 0 {
		return -most
	}
	return math.Max(-most, math.Min(most, damp*load/give*math.Log(load/capacity)))
}
