package scheduler

import (
	"math"
	"slices"

	"nightwright/scheduler/model"
	"nightwright/scheduler/search"
)

// decide wins back what was lost. Fields with lost visits, new ones, and those
// that weigh or want more than before are given what they lack: first in the next
// nights, then over the rest of the season; then those whose visits made room;
// then whoever lacks visits, in nights that have opened since. A stability of 0
// leaves nothing where it was for its own sake: every field is placed again.
func (r *replanner) decide(stability float64) {
	r.s.Settle(r.list, stability*r.meanWorth(), 1-stability)
	from, nights := r.nightNow(), r.p.Nights
	report := func(step int, what string) {
		r.par.Progress(model.Progress{Phase: what, Done: step, Total: 4, Coverage: r.s.Coverage()})
	}
	lost := r.claimants()
	report(0, "winning back")
	room := r.s.WinBack(r.ctx, lost, 0, search.Within{From: from, To: from + near})
	report(1, "winning back")
	room = append(room, r.s.WinBack(r.ctx, lost, 0, search.Within{From: from, To: nights})...)
	report(2, "winning back")
	slices.Sort(room)
	r.s.WinBack(r.ctx, r.s.ByWorth(slices.Compact(room)), 0, search.Within{From: from, To: nights})
	report(3, "winning back")
	if only := r.opened(); only != nil {
		r.s.WinBack(r.ctx, r.s.Lacking(), 0, search.Within{From: from, To: nights, Only: only})
	}
	report(4, "winning back")
	if stability == 0 {
		r.s.Sweep(r.ctx, 0, func(done, of int) {
			r.par.Progress(model.Progress{Phase: "sweep", Done: done, Total: of, Coverage: r.s.Coverage()})
		})
	}
	r.s.Trim()
}

// meanWorth is what a planned visit is worth on the whole, C.
func (r *replanner) meanWorth() float64 {
	sum, n := 0.0, 0
	for k := range r.visits {
		if r.visits[k].fate == stands {
			sum += r.visits[k].worth
			n++
		}
	}
	if n == 0 {
		return 0
	}
	return sum / float64(n)
}

// nightNow is the first night that isn't over everywhere.
func (r *replanner) nightNow() int {
	for n := range r.p.Nights {
		for site := range r.in.Survey.Sites {
			if model.MicroOf(r.in.Calendar.Night(site, n).To) > r.in.Past.From {
				return n
			}
		}
	}
	return r.p.Nights
}

// claimants lists the fields that lost visits, are new, or weigh or want more
// than when the earlier plan was made; most valuable time first.
func (r *replanner) claimants() []int {
	is := make([]bool, len(r.in.Survey.Fields))
	for k := range r.visits {
		if v := &r.visits[k]; v.fate == isLost {
			is[r.first(v).Field] = true
		}
	}
	for f := range is {
		fd := &r.in.Survey.Fields[f]
		known := r.old.Weights != nil && !math.IsNaN(r.old.Weights[f])
		is[f] = is[f] || !known || r.in.Survey.WeightOf(fd) > r.old.Weights[f] || int32(r.in.Survey.Wanted(fd)) > r.old.Wanted[f]
	}
	return slices.DeleteFunc(r.s.Lacking(), func(f int) bool { return !is[f] })
}

// opened marks the telescope-nights with more open time than when the earlier
// plan was made; nil: there is none.
func (r *replanner) opened() []bool {
	if r.old.OpenHours == nil {
		return nil
	}
	const more = 60.0 / 3600 // h
	out, any := make([]bool, len(r.old.OpenHours)), false
	for k := range out {
		if now := r.in.Calendar.OpenHours(k/r.p.Nights, k%r.p.Nights); now > r.old.OpenHours[k]+more {
			out[k], any = true, true
		}
	}
	if !any {
		return nil
	}
	return out
}

// frontier tries other stabilities from the same start and goes back to it.
func (r *replanner) frontier(before float64) []FrontierPoint {
	back := r.s.Keep()
	var out []FrontierPoint
	for _, x := range frontierSteps {
		r.decide(x)
		p := FrontierPoint{Stability: x, Coverage: r.s.Coverage(), WonC: r.s.Coverage() - before}
		t := r.placed().tally(r)
		p.Moved, p.New = t.Moved+t.Dropped, t.New
		out = append(out, p)
		back()
	}
	return out
}
