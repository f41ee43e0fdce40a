package scheduler_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
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
	// A field that is well up now, again, under another name.
	like := s.plan.Plan.Exposures[len(s.plan.Plan.Exposures)/3].Field
	urgent := sv.Fields[like]
	deadline := model.Sec(s.past.From) + 5*86400
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
