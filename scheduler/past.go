package scheduler

import (
	"nightwright/scheduler/model"
)

// Past is what happened to a survey so far.
type Past struct {
	// From is the instant (UTC, Unix us) before which nothing can be planned
	// any more; 0: none.
	From int64
	// Exposures were done: their State is Done and their Quality the ledger's.
	// Visit and Set are those of the plan that they followed, as far as known.
	Exposures []model.Exposure
	Visits    []PastVisit // of these
}

// PastVisit is one visit that was done.
type PastVisit struct {
	model.GivenVisit
	Exposures []int32 // indices into Past.Exposures, by start
}

// given says what of the past binds a problem. Exposures of nights that go on
// after From keep their telescope from what follows.
func (h *Past) given(p *model.Problem) model.Given {
	g := model.Given{From: h.From}
	for i := range h.Visits {
		g.Visits = append(g.Visits, h.Visits[i].GivenVisit)
	}
	for i := range h.Exposures {
		e := &h.Exposures[i]
		if e.Night < 0 || int(e.Night) >= p.Nights {
			continue
		}
		site := p.Survey.Telescopes[e.Telescope].Site
		if model.MicroOf(p.Calendar.Night(site, int(e.Night)).To) > h.From {
			g.Busy = append(g.Busy, *e)
		}
	}
	return g
}

// merge joins what was done with what is planned: ids of visits and sets are
// numbered afresh, by start.
func (h *Past) merge(plan *model.Plan) *model.Plan {
	var all []model.Exposure
	group := make([]int32, len(h.Exposures)) // visit of each exposure
	for v := range h.Visits {
		for _, i := range h.Visits[v].Exposures {
			group[i] = int32(v)
		}
	}
	most := int64(0)
	for _, e := range plan.Exposures {
		most = max(most, e.Set)
	}
	for i, e := range h.Exposures {
		// Sets apart from those of the plan; single exposures have none.
		if e.Set != 0 {
			e.Set = most + 1 + int64(group[i])
		}
		all = append(all, e)
	}
	all = append(all, plan.Exposures...)
	return model.NewPlan(all)
}
