package model

import (
	"math"
	"slices"
)

// Given is what a plan has to take as it is: visits that were done, and visits
// that may not be moved.
type Given struct {
	// From is the instant (UTC, Unix us) before which nothing more can be
	// planned; 0: no bound.
	From   int64
	Visits []GivenVisit
	// Busy lists the exposures of given visits that share a telescope-night
	// with what is still to be planned: the search goes round them.
	Busy []Exposure
	Held bool // the busy exposures lie ahead: their time is no capacity for others
}

// GivenVisit is one visit that a plan has to take as it is.
type GivenVisit struct {
	Field, Demand int32
	Night         int32   // label, as index from the survey's first night; may lie outside the period
	Start         int64   // of its first exposure, UTC, Unix us
	Quality       float64 // mean over its exposures
	Counts        bool    // it earns, and is one of those that are wanted
	Binds         bool    // gap.min and per_night hold against it
	Seconds       float64 // scaled exposure time inside the period
	// Maybe marks one that is under way: a plan may go on with it or not. A
	// bound then holds for both: it earns, and takes nothing from what is wanted.
	Maybe bool
}

// bound is a given visit as cadence sees it.
type bound struct {
	start int64
	night int32
}

// Take returns the problem that is left when something is given: fewer visits
// wanted, cadence against what is given, no time before From. The parts that
// don't change are shared. It may be called on what it returned.
func (p *Problem) Take(g Given) *Problem {
	q := *p
	q.Wants = slices.Clone(p.Wants)
	q.bonus = slices.Clone(p.bonus)
	q.GivenSeconds = make([]float64, len(p.Survey.Programs))
	copy(q.GivenSeconds, p.GivenSeconds)
	q.Busy = append(slices.Clip(p.Busy), g.Busy...)
	left := make([]int32, len(p.bonus)) // visits that a field still lacked
	for i := range q.Wants {
		left[q.Wants[i].Field] += q.Wants[i].Visits
		q.Wants[i].bounds = slices.Clone(q.Wants[i].bounds)
	}
	for i := range g.Visits {
		v := &g.Visits[i]
		w := &q.Wants[q.WantOf(v.Field, v.Demand)]
		if v.Maybe {
			q.Earned += w.Value*v.Quality + q.bonus[v.Field]
			continue
		}
		q.GivenSeconds[w.Program] += v.Seconds
		if v.Binds {
			w.bounds = append(w.bounds, bound{v.Start, v.Night})
		}
		if v.Counts && w.Visits > 0 {
			w.Visits--
			q.Earned += w.Value * v.Quality
		}
	}
	for i := range q.Wants {
		slices.SortFunc(q.Wants[i].bounds, func(a, b bound) int { return int(min(1, max(-1, a.start-b.start))) })
	}
	for f := range q.bonus {
		if left[f] > 0 && q.Remaining(f) == 0 {
			q.Earned += q.bonus[f]
			q.bonus[f] = 0
		}
	}
	q.cutOpen(&g)
	return &q
}

// WantOf returns the index of a field's demand among the wants.
func (p *Problem) WantOf(field, demand int32) int32 { return p.FieldWant[field] + demand }

// Remaining returns how many visits of a field are still to be planned.
func (p *Problem) Remaining(f int) int32 {
	var n int32
	for i := p.FieldWant[f]; i < p.FieldWant[f+1]; i++ {
		n += p.Wants[i].Visits
	}
	return n
}

// cutOpen takes the time before From out of the open time, and the time of busy
// exposures that lie ahead out of the ceiling's. A busy exposure and the least
// gap after it meet no other exposure with its own least gap, so that their time
// is no capacity for others.
func (p *Problem) cutOpen(g *Given) {
	p.open, p.outer = slices.Clone(p.open), slices.Clone(p.outer)
	if g.From != 0 {
		for i := range p.open {
			p.open[i] = after(p.open[i], g.From)
			p.outer[i] = after(p.outer[i], g.From-outerSlack)
		}
	}
	if !g.Held {
		return
	}
	for i := range g.Busy {
		e := &g.Busy[i]
		if e.Night < 0 || int(e.Night) >= p.Nights {
			continue
		}
		k := int(e.Telescope)*p.Nights + int(e.Night)
		p.outer[k] = without(p.outer[k], Span{e.Start, e.End + p.Scopes[e.Telescope].LeastGap})
	}
}

// after returns what of the spans lies at or after an instant.
func after(spans []Span, from int64) []Span {
	if len(spans) == 0 || spans[0].From >= from {
		return spans
	}
	var out []Span
	for _, s := range spans {
		if s.From = max(s.From, from); s.To > s.From {
			out = append(out, s)
		}
	}
	return out
}

// without takes a span out of others.
func without(spans []Span, cut Span) []Span {
	var out []Span
	for _, s := range spans {
		if cut.To <= s.From || cut.From >= s.To {
			out = append(out, s)
			continue
		}
		if s.From < cut.From {
			out = append(out, Span{s.From, cut.From})
		}
		if s.To > cut.To {
			out = append(out, Span{cut.To, s.To})
		}
	}
	return out
}

// Barred reports whether no visit of a want may start in a telescope-night
// because of what is given: all of its open time lies within gap.min of a given
// visit, or per_night's count is full. The rounding is such that no legal start
// is barred.
func (p *Problem) Barred(w *Want, scope int32, night int) bool {
	if len(w.bounds) == 0 {
		return false
	}
	spans := p.outer[int(scope)*p.Nights+night]
	if len(spans) == 0 {
		return true
	}
	gap := w.GapMin - Micro // well inside
	from, to := spans[0].From, spans[len(spans)-1].To
	for _, b := range w.bounds {
		if from > b.start-gap && to < b.start+gap {
			return true
		}
	}
	return w.PerNight > 0 && w.GivenIn(int32(night)) >= w.PerNight
}

// Given reports whether some visit of the want is given.
func (w *Want) Given() bool { return len(w.bounds) > 0 }

// GivenIn counts the given visits with a night's label.
func (w *Want) GivenIn(night int32) int32 {
	n := int32(0)
	for _, b := range w.bounds {
		if b.night == night {
			n++
		}
	}
	return n
}

// Near reports whether a start breaks the cadence with what is given.
func (w *Want) Near(start int64, night int32) bool {
	for _, b := range w.bounds {
		if start-b.start < w.Spacing && b.start-start < w.Spacing {
			return true
		}
	}
	return w.PerNight > 0 && w.GivenIn(night) >= w.PerNight
}

// Slack returns how far a start may be shifted, down and up, before it breaks
// the cadence with what is given: lo <= 0 <= hi for a start that Near clears.
func (w *Want) Slack(start int64) (lo, hi int64) {
	lo, hi = math.MinInt64/4, math.MaxInt64/4
	for _, b := range w.bounds {
		if b.start <= start {
			lo = max(lo, b.start+w.Spacing-start)
		} else {
			hi = min(hi, b.start-w.Spacing-start)
		}
	}
	return lo, hi
}
