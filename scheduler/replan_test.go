package scheduler_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
	"nightwright/visibility"
)

// season is a survey with a plan, and what has become of it.
type season struct {
	kit    *trial.Kit
	plan   *model.Outcome
	past   scheduler.Past
	losses [][]visibility.Interval
}

// start plans a survey.
func start(t *testing.T, sv *survey.Survey) *season {
	t.Helper()
	k := build(t, sv, 2)
	return &season{kit: k, plan: solve(t, k, 2, "quick", 3), losses: make([][]visibility.Interval, len(sv.Telescopes))}
}

// lose takes time of a telescope out, [from, to) in us.
func (s *season) lose(t *testing.T, telescope int, from, to int64) {
	t.Helper()
	s.losses[telescope] = append(s.losses[telescope], visibility.Interval{From: model.Sec(from), To: model.Sec(to)})
	s.reopen(t)
}

// reopen works calendar and windows out anew.
func (s *season) reopen(t *testing.T) {
	t.Helper()
	k := *s.kit
	k.Calendar = constraints.NewCalendar(k.Survey, k.Exact, s.losses)
	var err error
	if k.Windows, err = constraints.NewWindows(t.Context(), k.Survey, k.Sky, k.Calendar, 2); err != nil {
		t.Fatal(err)
	}
	s.kit = &k
}

// done records exposures of one visit as done, each with its quality.
func (s *season) done(quality float64, list ...model.Exposure) {
	v := scheduler.PastVisit{GivenVisit: model.GivenVisit{
		Field: list[0].Field, Demand: list[0].Demand, Night: list[0].Night, Start: list[0].Start, Quality: quality,
	}}
	sv := s.kit.Survey
	f := &sv.Fields[list[0].Field]
	d := &sv.Programs[f.Program].Demands[list[0].Demand]
	v.Binds = len(list) == len(d.Exposures) && quality >= f.Rules[list[0].Demand].MinQuality
	had := 0
	for i := range s.past.Visits {
		if o := &s.past.Visits[i]; o.Field == v.Field && o.Demand == v.Demand && o.Counts {
			had++
		}
	}
	v.Counts = v.Binds && had < d.Visits
	for _, e := range list {
		e.State, e.Quality = model.Done, quality
		v.Seconds += model.Sec(e.End - e.Start)
		v.Exposures = append(v.Exposures, int32(len(s.past.Exposures)))
		s.past.Exposures = append(s.past.Exposures, e)
	}
	s.past.Visits = append(s.past.Visits, v)
}

// earlier is the season's plan as a re-plan takes it.
func (s *season) earlier() *scheduler.Earlier {
	sv := s.kit.Survey
	old := &scheduler.Earlier{Exposures: s.plan.Plan.Exposures, Prices: s.plan.Prices, Done: map[int64]bool{}}
	for i := range sv.Fields {
		old.Weights, old.Wanted = append(old.Weights, sv.WeightOf(&sv.Fields[i])), append(old.Wanted, int32(sv.Wanted(&sv.Fields[i])))
	}
	for _, e := range old.Exposures {
		old.Visit, old.Set = max(old.Visit, e.Visit), max(old.Set, e.Set)
	}
	plain := constraints.NewCalendar(sv, s.kit.Exact, nil)
	for i := range len(sv.Telescopes) * sv.Nights() {
		old.OpenHours = append(old.OpenHours, plain.OpenHours(i/sv.Nights(), i%sv.Nights()))
	}
	return old
}

// replan plans the rest again.
func (s *season) replan(t *testing.T, old *scheduler.Earlier, par scheduler.ReplanParams) *scheduler.Replanned {
	t.Helper()
	in := input(s.kit, 2)
	in.Past = &s.past
	out, err := scheduler.Replan(t.Context(), in, old, par)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// judge holds a re-plan against the judge, and returns its coverage.
func (s *season) judge(t *testing.T, what string, out *scheduler.Replanned) float64 {
	t.Helper()
	in := audit.Input{Survey: s.kit.Survey, Exact: s.kit.Exact, Losses: s.losses, Workers: 2}
	in.Visits, in.LegalityOnly = trial.Rows(s.kit.Survey, out.Plan.Exposures), true
	for _, e := range s.past.Exposures {
		in.Done = append(in.Done, audit.Done{Telescope: s.kit.Survey.Telescopes[e.Telescope].Name, Start: e.Start, Quality: e.Quality})
	}
	r, err := audit.Check(t.Context(), in)
	if err != nil {
		t.Fatal(err)
	}
	for i, b := range r.Breaches {
		if i < 3 {
			t.Errorf("%s: %s: field %s, telescope %s, night %s, visit %d: %s", what, b.Rule, b.Field, b.Telescope, b.Night, b.Visit, b.What)
		}
	}
	c := r.Score.Coverage
	if d := math.Abs(c - out.Coverage); d > 1e-4 {
		t.Errorf("%s: coverage %.9f by the search, %.9f by the judge", what, out.Coverage, c)
	}
	if !t.Failed() && (c > out.Ceiling+1e-12 || c > out.CeilingHeld+1e-12 || out.CeilingHeld > out.Ceiling) {
		t.Errorf("%s: coverage %.9f, ceiling with the hold %.9f, ceiling %.9f; want them ascending", what, c, out.CeilingHeld, out.Ceiling)
	}
	if out.Coverage < out.Before-1e-9 {
		t.Errorf("%s: coverage %.9f; it was %.9f before anything was won back", what, out.Coverage, out.Before)
	}
	if s.plan != nil {
		s.accounts(t, what, out)
	}
	return c
}

// accounts holds the changes against the two plans: each exposure of the earlier
// one is in them once, and so is each of the new one; numbers are kept.
func (s *season) accounts(t *testing.T, what string, out *scheduler.Replanned) {
	t.Helper()
	seen := map[int64]scheduler.Change{}
	for _, c := range out.Changes {
		if _, twice := seen[c.Visit]; twice {
			t.Fatalf("%s: visit %d changes twice", what, c.Visit)
		}
		seen[c.Visit] = c
	}
	for _, e := range s.plan.Plan.Exposures {
		if c, ok := seen[e.Visit]; e.State == model.Done {
			if ok {
				t.Fatalf("%s: visit %d was done before and changes: %+v", what, e.Visit, c)
			}
		} else if !ok || c.FromStart != e.Start || c.FromTelescope != e.Telescope {
			t.Fatalf("%s: visit %d of the earlier plan became %+v", what, e.Visit, c)
		}
	}
	here, before := map[int64]bool{}, map[int64]model.State{}
	for _, e := range s.plan.Plan.Exposures {
		before[e.Visit] = e.State
	}
	for _, e := range out.Plan.Exposures {
		c, ok := seen[e.Visit]
		if !ok && before[e.Visit] == model.Done {
			continue
		}
		if !ok || here[e.Visit] || c.ToStart != e.Start || c.ToTelescope != e.Telescope || (c.What == scheduler.Did) != (e.State == model.Done) {
			t.Fatalf("%s: visit %d (%v) is in the changes as %+v", what, e.Visit, e.State, c)
		}
		here[e.Visit] = true
	}
	for v, c := range seen {
		if (c.ToStart != 0) != here[v] || (c.What == scheduler.Lost || c.What == scheduler.Dropped) == here[v] {
			t.Fatalf("%s: visit %d: %+v", what, v, c)
		}
	}
}

// live lets the plan run until an instant: visits that have ended by then are
// done with some chance, a little off their times; sets under way in part.
func (s *season) live(r *rand.Rand, now int64, chance float64) {
	sets := map[int64][]model.Exposure{}
	var order []int64
	for _, e := range s.plan.Plan.Exposures {
		k := -e.Visit
		if e.Set != 0 {
			k = e.Set
		}
		if sets[k] == nil {
			order = append(order, k)
		}
		sets[k] = append(sets[k], e)
	}
	for _, k := range order {
		if r.Float64() > chance {
			continue
		}
		var list []model.Exposure
		for _, e := range sets[k] {
			if e.End <= now {
				d := r.Int64N(2_000_000)
				site := s.kit.Survey.Telescopes[e.Telescope].Site
				if model.Sec(e.Start-d) < s.kit.Calendar.Night(site, int(e.Night)).From {
					d = 0
				}
				e.Start, e.End = e.Start-d, e.End-d
				if r.IntN(3) == 0 {
					e.Visit, e.Set = 0, e.Set*1000 // recorded without the plan's numbers
				}
				list = append(list, e)
			}
		}
		if len(list) > 0 {
			s.done(r.Float64(), list...)
		}
	}
	s.past.From = now
}

// TestReplansOfRandomSurveysAreLegal lets random surveys run to a random
// instant, with visits done and missed, time lost before and after, and plans
// them again: what comes out is legal, honest in its changes, and under its
// ceilings.
func TestReplansOfRandomSurveysAreLegal(t *testing.T) {
	for seed := range uint64(rounds(16, 1000)) {
		r := rand.New(rand.NewPCG(seed, 77))
		s := start(t, trial.Survey(seed))
		list := s.plan.Plan.Exposures
		if len(list) == 0 {
			continue
		}
		first, last := list[0].Start, list[len(list)-1].End
		now := first + int64(r.Float64()*float64(last-first))
		s.live(r, now, []float64{0, 0.5, 1}[seed%3])
		if seed%2 == 0 {
			from := first + int64(r.Float64()*float64(last-first))
			s.lose(t, r.IntN(len(s.losses)), from, from+int64(r.Float64()*20*3600e6))
		}
		par := scheduler.ReplanParams{Hold: int64(r.IntN(3)) * 6 * 3600e6, Stability: float64(r.IntN(3)) / 2, Seed: seed, CeilingBin: 300}
		what := fmt.Sprintf("seed %d, now %d, %+v", seed, now, par)
		out := s.replan(t, s.earlier(), par)
		s.judge(t, what, out)
		for _, c := range out.Changes {
			inside := c.FromStart >= now && c.FromStart < now+par.Hold
			if inside && c.What != scheduler.Kept && c.What != scheduler.Lost || inside && c.What == scheduler.Kept && c.ToStart != c.FromStart {
				t.Errorf("%s: inside the hold: %+v", what, c)
			}
		}
		if t.Failed() {
			return
		}
	}
}
