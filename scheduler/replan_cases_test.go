package scheduler_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// noon is a moment after a day's afternoon at which nothing is under way.
func (s *season) noon(t *testing.T, night int) int64 {
	t.Helper()
	at := int64((s.kit.Survey.FirstNight+survey.Day(night)).Unix()*1e6) + 15*3600e6
	for i := 0; i < len(s.plan.Plan.Exposures); i++ { // ascending by start
		if e := &s.plan.Plan.Exposures[i]; e.Start < at && at < e.End {
			at, i = e.End, -1
		}
	}
	return at
}

// TestNothingLostNothingMoves: a plan that went as planned comes out again, visit
// for visit.
func TestNothingLostNothingMoves(t *testing.T) {
	s := start(t, demo(t, 4, 60))
	now := s.noon(t, 2)
	q := map[int64]float64{}
	for _, e := range s.plan.Plan.Exposures {
		w := &s.kit.Problem.Wants[s.kit.Problem.WantOf(e.Field, e.Demand)]
		q[e.Visit] = s.kit.Problem.Quality(w, int(e.Step), e.Telescope, (e.Start+e.End)/2)
	}
	s.follow(now, func(e *model.Exposure) (bool, float64) { return true, q[e.Visit] })
	out := s.replan(t, s.earlier(), scheduler.ReplanParams{Hold: 24 * 3600e6, Stability: 1})
	s.judge(t, "as planned", out)
	for _, c := range out.Changes {
		if c.What != scheduler.Kept && c.What != scheduler.Did || c.ToStart != c.FromStart {
			t.Fatalf("%+v", c)
		}
	}
	if d := math.Abs(out.Coverage - s.plan.Coverage); d > 2e-5 {
		t.Errorf("coverage %.9f; it was %.9f", out.Coverage, s.plan.Coverage)
	}
	if out.Tally.Held == 0 || out.Tally.Done == 0 || out.Tally.Lost+out.Tally.Moved+out.Tally.Dropped+out.Tally.New+out.Tally.Shifted > 0 {
		t.Errorf("%+v", out.Tally)
	}
}

// follow has visits that ended by now done as planned, as far as took says so.
func (s *season) follow(now int64, took func(e *model.Exposure) (bool, float64)) {
	sets := map[int64][]model.Exposure{}
	quality := map[int64]float64{}
	for _, e := range s.plan.Plan.Exposures {
		ok, q := took(&e)
		if !ok || e.End > now {
			continue
		}
		if e.Set == 0 {
			s.done(q, e)
			continue
		}
		sets[e.Set] = append(sets[e.Set], e)
		quality[e.Set] += q
		if n := len(s.kit.Survey.Programs[s.kit.Survey.Fields[e.Field].Program].Demands[e.Demand].Exposures); len(sets[e.Set]) == n {
			s.done(quality[e.Set]/float64(n), sets[e.Set]...)
		}
	}
	s.past.From = now
}

// TestALostNight: what a telescope missed is looked for again; less moves the
// higher the stability; and a night that is given back before anything was planned
// again leaves the season as it was.
func TestALostNight(t *testing.T) {
	s := start(t, starter.Family("small", 1))
	now := s.noon(t, 4)
	const telescope, night = 1, 3
	s.follow(now, func(e *model.Exposure) (bool, float64) { return e.Telescope != telescope || e.Night != night, 0.6 })
	in := s.kit.Calendar.Night(s.kit.Survey.Telescopes[telescope].Site, night)
	from := model.MicroOf(in.From)
	s.losses[telescope] = nil
	s.lose(t, telescope, from, from+86400e6)
	last := scheduler.Tally{}
	for i, x := range []float64{0.25, 0.5, 1} {
		out := s.replan(t, s.earlier(), scheduler.ReplanParams{Hold: 24 * 3600e6, Stability: x})
		s.judge(t, fmt.Sprint("stability ", x), out)
		tl := out.Tally
		t.Logf("stability %g: %+v", x, tl)
		if tl.Lost == 0 || tl.New == 0 || !(tl.WonC > 0) {
			t.Errorf("stability %g: %+v; want visits lost and won back", x, tl)
		}
		if i > 0 && tl.Moved+tl.Dropped > last.Moved+last.Dropped {
			t.Errorf("stability %g moves %d visits; a lower one moved %d", x, tl.Moved+tl.Dropped, last.Moved+last.Dropped)
		}
		if tl.Moved+tl.Dropped > tl.Lost || x == 1 && 2*(tl.Moved+tl.Dropped) > tl.Lost {
			t.Errorf("stability %g: %d lost and %d moved", x, tl.Lost, tl.Moved+tl.Dropped)
		}
		last = tl
	}
}

// TestANightLostAndGivenBack: a night ahead is lost, planned without, and given
// back: the season is worth what it was to a thousandth, and to five where moving
// visits is charged. Given back before anything was planned without it, the very
// same plan comes out.
func TestANightLostAndGivenBack(t *testing.T) {
	for _, family := range []string{"small", "one-site"}[:rounds(1, 2)] {
		for seed := range uint64(rounds(2, 10)) {
			s := start(t, starter.Family(family, seed+1))
			const telescope, night = 0, 6
			in := s.kit.Calendar.Night(s.kit.Survey.Telescopes[telescope].Site, night)
			s.past.From = s.noon(t, 2)
			par := scheduler.ReplanParams{Hold: 24 * 3600e6, Stability: 0.5}
			s.follow(s.past.From, func(*model.Exposure) (bool, float64) { return true, 0.6 })
			old := s.earlier()
			before := s.replan(t, old, par)
			s.lose(t, telescope, model.MicroOf(in.From), model.MicroOf(in.To))
			without := s.replan(t, old, par)
			s.judge(t, "without the night", without)
			same := *s
			same.losses = make([][]visibility.Interval, len(s.losses))
			same.reopen(t)
			if c := same.replan(t, old, par).Coverage; c != before.Coverage {
				t.Errorf("%s %d: coverage %.9f with the night lost and given back before a re-plan; it was %.9f", family, seed+1, c, before.Coverage)
			}
			again := *s
			again.plan = without.Outcome
			again.losses = make([][]visibility.Interval, len(s.losses))
			again.reopen(t)
			firm := again.judge(t, "with the night again", again.replan(t, again.earlierOf(without, s), par))
			par.Stability = 0
			free := again.judge(t, "with the night again, anything may move", again.replan(t, again.earlierOf(without, s), par))
			t.Logf("%s %d: coverage %.6f, without the night %.6f, with it again %.6f, and %.6f when anything may move", family, seed+1, before.Coverage, without.Coverage, firm, free)
			if free < 0.999*before.Coverage || firm < 0.995*before.Coverage || firm <= without.Coverage {
				t.Errorf("%s %d: coverage %.6f with the night given back, %.6f when anything may move; it was %.6f", family, seed+1, firm, free, before.Coverage)
			}
		}
	}
}

// earlierOf is a re-plan as the next one takes it, with the open hours that it
// knew.
func (s *season) earlierOf(out *scheduler.Replanned, when *season) *scheduler.Earlier {
	old := s.earlier()
	old.Exposures = nil
	for _, e := range out.Plan.Exposures {
		old.Visit, old.Set = max(old.Visit, e.Visit), max(old.Set, e.Set)
		if e.State == model.Done {
			old.Done[e.Visit] = true
			continue
		}
		old.Exposures = append(old.Exposures, e)
	}
	sv := s.kit.Survey
	for i := range old.OpenHours {
		old.OpenHours[i] = when.kit.Calendar.OpenHours(i/sv.Nights(), i%sv.Nights())
	}
	return old
}

// TestAnUrgentField: a heavy field that is added with a deadline gets its visits
// before it, others make room; one that is taken out leaves its time to others.
func TestAnUrgentField(t *testing.T) {
	s := start(t, starter.Family("small", 2))
	s.past.From = s.noon(t, 3)
	s.follow(s.past.From, func(*model.Exposure) (bool, float64) { return true, 0.6 })
	old := s.earlier()
	par := scheduler.ReplanParams{Hold: 12 * 3600e6, Stability: 0.5}
	sv := *s.kit.Survey
	sv.Fields = append([]survey.Field{}, sv.Fields...)
	// The field that the plan has most of before the deadline, again, under
	// another name.
	deadline := model.Sec(s.past.From) + 5*86400
	soon := make([]int, len(sv.Fields))
	for _, e := range s.plan.Plan.Exposures {
		if e.Start > s.past.From+par.Hold && model.Sec(e.End) < deadline {
			soon[e.Field]++
		}
	}
	like := slices.Index(soon, slices.Max(soon))
	urgent := sv.Fields[like]
	urgent.Name, urgent.Weight, urgent.NotAfter = "urgent", 20*urgent.Weight, deadline
	sv.Fields = append(sv.Fields, urgent)
	k := build(t, &sv, 2)
	s.kit = k
	old.Weights, old.Wanted = append(old.Weights, math.NaN()), append(old.Wanted, 0)
	out := s.replan(t, old, par)
	s.judge(t, "an urgent field", out)
	got := 0
	for _, e := range out.Plan.Exposures {
		if int(e.Field) == len(sv.Fields)-1 {
			if got++; model.Sec(e.End) > deadline {
				t.Errorf("a visit ends %.0f s after the deadline", model.Sec(e.End)-deadline)
			}
		}
	}
	t.Logf("the urgent field got %d exposures; %+v", got, out.Tally)
	if got < 2 || out.Tally.Lost != 0 {
		t.Errorf("the urgent field got %d exposures, %+v", got, out.Tally)
	}
}
