package scheduler

import (
	"fmt"
	"slices"

	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
)

// shares works out each program's part of the scaled exposure time, planned and
// given, and whether its bounds hold to within one visit.
func shares(p *model.Problem, plan *model.Plan) []model.ShareOutcome {
	sv := p.Survey
	time := make([]float64, len(sv.Programs))
	var all float64
	for i, s := range p.GivenSeconds {
		time[i] += s
		all += s
	}
	for i := range plan.Exposures {
		e := &plan.Exposures[i]
		s := model.Sec(e.End - e.Start)
		time[sv.Fields[e.Field].Program] += s
		all += s
	}
	longest := p.LongestVisits()
	out := make([]model.ShareOutcome, len(sv.Programs))
	for i := range sv.Programs {
		pr := &sv.Programs[i]
		o := model.ShareOutcome{Program: int32(i), Min: pr.ShareMin, Max: pr.ShareMax}
		if all > 0 {
			o.Share = time[i] / all
		}
		visit := 0.0
		if all > 0 {
			visit = longest[i] / all
		}
		switch {
		case o.Share < o.Min-visit:
			o.Breach = o.Min - o.Share
			o.Why = fmt.Sprintf("program %s has too little time that its fields can use", pr.Name)
		case o.Share > o.Max+visit:
			o.Breach = o.Share - o.Max
			o.Why = fmt.Sprintf("the other programs can't use enough time beside program %s", pr.Name)
		}
		out[i] = o
	}
	return out
}

// missed reports whether some share is out of its bounds.
func missed(told []model.ShareOutcome) bool {
	return slices.ContainsFunc(told, func(s model.ShareOutcome) bool { return s.Breach > 0 })
}

// relaxedCeiling bounds the plans that keep share bounds as far as a plan does
// that misses some. The multipliers of those were sought for a bound out of
// reach and are too great: each part of them gives a ceiling, and the least
// counts. The relaxation is convex along the way, so the search ends where it
// rises again.
func (c *conductor) relaxedCeiling(ascent *dual.Ascent, kept dual.Kept, told []model.ShareOutcome) float64 {
	best := 1.0
	for i, part := range []float64{0, 0.1, 0.3, 0.6, 1} {
		ascent.Restore(kept)
		for _, s := range told {
			if s.Breach > 0 {
				ascent.Relax(int(s.Program), s.Share)
				ascent.Damp(int(s.Program), part)
			}
		}
		b := ascent.CeilingWithin(c.ctx, c.effort.ceilingBin)
		if i > 0 && b > best {
			break
		}
		best = min(best, b)
	}
	return best
}
