package search

import (
	"cmp"
	"context"
	"slices"

	"nightwright/scheduler/model"
)

// SetRates gives each program's second of exposure a worth beside its credit,
// C per second: the multipliers of the share bounds.
func (x *Search) SetRates(rates []float64) { copy(x.s.rates, rates) }

// shareSteps is how often the shares' multipliers are turned up and another
// sweep taken while a minimum is missed.
const shareSteps = 3

// KeepShares mends shares that the search left out of bounds: a program over
// its maximum gives up its least worthy time, one under its minimum is given
// a higher worth and another sweep. What can't be mended stays and is told.
func (x *Search) KeepShares(ctx context.Context, report func(done, of int)) {
	longest := x.p.LongestVisits()
	for range shareSteps {
		low := false
		for p := range x.s.rates {
			pr := &x.p.Survey.Programs[p]
			all := x.s.allSeconds()
			if lack := pr.ShareMin*all - longest[p] - model.Sec(x.s.time[p]); lack > 0 && all > 0 {
				low = true
				x.s.rates[p] += x.density() * (0.2 + 2*lack/all)
			}
		}
		if !low || ctx.Err() != nil {
			break
		}
		x.Sweep(ctx, 0, report)
	}
	x.Trim()
}

// density is the plan's coverage per second of exposure.
func (x *Search) density() float64 {
	if t := x.s.allSeconds(); t > 0 {
		return x.Coverage() / t
	}
	return 0
}

// allSeconds is the plan's exposure time.
func (s *state) allSeconds() float64 {
	var t int64
	for _, x := range s.time {
		t += x
	}
	return model.Sec(t)
}

// trim drops a program's visits of the least credit per second until its
// share is at most its maximum and one visit, and reports whether any was.
func (x *Search) trim(p int32, longest float64) bool {
	s := x.s
	most := x.p.Survey.Programs[p].ShareMax
	over := func() bool { return model.Sec(s.time[p]) > most*s.allSeconds()+longest }
	if most >= 1 || !over() {
		return false
	}
	dropped := false
	type item struct {
		id   int32
		rate float64
	}
	var items []item
	for id := range s.visits {
		v := &s.visits[id]
		if v.alive && !v.fixed && x.p.Wants[v.want].Program == p {
			items = append(items, item{int32(id), float64(v.credit) / s.visitSeconds(v)})
		}
	}
	slices.SortFunc(items, func(a, b item) int { return cmp.Or(cmp.Compare(a.rate, b.rate), cmp.Compare(a.id, b.id)) })
	for _, it := range items {
		if !over() {
			break
		}
		dropped = true
		s.begin()
		s.remove(it.id)
		s.commit()
	}
	return dropped
}
