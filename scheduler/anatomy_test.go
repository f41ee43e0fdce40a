package scheduler_test

import (
	"math"
	"testing"

	"nightwright/scenarios/starter"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
)

// TestPartsSumToTheGap: none but the last can be below 0, and slews and filter
// changes cost nothing where they take no time.
func TestPartsSumToTheGap(t *testing.T) {
	for seed := range uint64(rounds(12, 200)) {
		k := build(t, trial.Survey(seed+4000), 2)
		o := solve(t, k, 2, "quick", seed)
		var sum float64
		for i, x := range o.Parts {
			sum += x.Worth
			if x.Worth < -1e-12 && i < 4 {
				t.Errorf("seed %d: the part %s is %g", seed, x.Name, x.Worth)
			}
		}
		if math.Abs(sum-(o.Ceiling-o.Coverage)) > 1e-12 {
			t.Errorf("seed %d: the parts sum to %g, the gap is %g", seed, sum, o.Ceiling-o.Coverage)
		}
	}
}

// TestAnatomyFindsWhatIsWrong spoils a plan in one way at a time: the part
// that is to blame grows, by what was lost.
func TestAnatomyFindsWhatIsWrong(t *testing.T) {
	sv := starter.Family("small", 3)
	k := build(t, sv, 2)
	p := k.Problem
	o := solve(t, k, 2, "quick", 1)
	whole := scheduler.Dissect(p, o.Plan, o.Coverage, o.Ceiling, o.Prices)
	if whole.Slews <= 0 || whole.Filters <= 0 {
		t.Errorf("slews cost %g and filter changes %g; want more than nothing", whole.Slews, whole.Filters)
	}

	// Instant mounts and filters: their parts vanish.
	quick := *sv
	quick.Telescopes = append(quick.Telescopes[:0:0], sv.Telescopes...)
	for i := range quick.Telescopes {
		tel := &quick.Telescopes[i]
		tel.Slew.Rate, tel.Slew.Acceleration, tel.Slew.Settle, tel.FilterChange = 1e6, 1e9, 0, 0
	}
	q := build(t, &quick, 2)
	plain := scheduler.Dissect(q.Problem, o.Plan, o.Coverage, o.Ceiling, o.Prices)
	if plain.Slews > 1e-6 || plain.Filters != 0 {
		t.Errorf("without slews and changes they cost %g and %g", plain.Slews, plain.Filters)
	}

	// A third of the visits dropped: their time is idle, at its price. Each was
	// worth its value; what isn't idle is the search's fault, in Choice.
	var rest model.Plan
	lost := 0.0
	for i, e := range o.Plan.Exposures {
		if i%3 != 0 {
			rest.Exposures = append(rest.Exposures, e)
			continue
		}
		for wi := range p.Wants {
			if w := &p.Wants[wi]; w.Field == e.Field && w.Demand == e.Demand {
				lost += w.Value * p.Quality(w, int(e.Step), e.Telescope, (e.Start+e.End)/2)
			}
		}
	}
	less := scheduler.Dissect(p, &rest, o.Coverage-lost, o.Ceiling, o.Prices)
	if less.Idle < whole.Idle+0.02*lost || less.Choice < whole.Choice {
		t.Errorf("with visits worth %g dropped idle goes from %g to %g, choice from %g to %g", lost, whole.Idle, less.Idle, whole.Choice, less.Choice)
	}

	// Each visit as late in its night as it may be: the moments are worse.
	late := model.Plan{Exposures: append([]model.Exposure(nil), o.Plan.Exposures...)}
	worse := 0.0
	for i := range late.Exposures {
		e := &late.Exposures[i]
		for wi := range p.Wants {
			w := &p.Wants[wi]
			if w.Field != e.Field || w.Demand != e.Demand {
				continue
			}
			before := p.Quality(w, int(e.Step), e.Telescope, (e.Start+e.End)/2)
			open := p.Open(int(e.Telescope), int(e.Night))
			last := open[len(open)-1].To
			for _, win := range p.Windows.Of(int(w.Unit), int(p.Scopes[e.Telescope].Class), int(e.Night)) {
				_, to := p.Inward(win)
				last = min(last, to)
			}
			by := last - e.End
			e.Start, e.End = e.Start+by, e.End+by
			worse += w.Value * (before - p.Quality(w, int(e.Step), e.Telescope, (e.Start+e.End)/2))
		}
	}
	if moved := scheduler.Dissect(p, &late, o.Coverage-worse, o.Ceiling, o.Prices); moved.Moment < whole.Moment+0.5*worse || worse <= 0 {
		t.Errorf("visits moved to the end of their nights lose %g; the moments' part goes from %g to %g", worse, whole.Moment, moved.Moment)
	}
}
