package work

import (
	"context"
	"math"

	"nightwright/constraints/survey"
	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
)

// History is what the ledger says was done, in a survey's own ids.
type History struct {
	scheduler.Past
	Last     int64 // end of the last exposure, UTC, Unix us; 0: there is none
	Homeless int   // exposures of telescopes that the survey has no more: they can't be counted
}

// done reads the exposures of the survey's fields, as the ledger held them
// after an entry.
func (s *Survey) done(ctx context.Context, upTo int64) ([]ledger.Exposure, error) {
	l, err := ledger.Open(s.LedgerPath())
	if err != nil {
		return nil, ledgerFault(err)
	}
	defer l.Close()
	list, err := l.DoneFor(ctx, s.Survey, upTo)
	if err != nil {
		return nil, ledgerFault(err)
	}
	return list, nil
}

// history works out what the ledger's exposures, up to an entry, mean to a plan.
func (s *Survey) history(ctx context.Context, upTo int64) (*History, error) {
	list, err := s.done(ctx, upTo)
	if err != nil {
		return nil, err
	}
	h := &History{}
	for i := range list {
		h.Last = max(h.Last, list[i].End)
	}
	c := ledger.Credit(s.Survey, s.Exact, list)
	for i := range c.Visits {
		v := &c.Visits[i]
		if v.Telescope < 0 {
			h.Homeless += len(v.Exposures)
			continue
		}
		h.Visits = append(h.Visits, s.pastVisit(v, list, c, &h.Exposures))
	}
	return h, nil
}

// pastFor is what a plan made afresh has to take as given: what was done, and
// no time before the end of that. nil: nothing was done, and no instant asked for.
func (s *Survey) pastFor(ctx context.Context, ask PlanAsk, knew int64) (*scheduler.Past, error) {
	h, err := s.history(ctx, knew)
	if err != nil {
		return nil, err
	}
	if h.From = h.Last; ask.Now != "" {
		now, err := ParseInstant("--now", ask.Now)
		if err != nil {
			return nil, err
		}
		h.From = int64(math.Round(now * 1e6))
		if err := s.inTime(h, ask.Now); err != nil {
			return nil, err
		}
	}
	if h.From == 0 {
		return nil, nil
	}
	return &h.Past, nil
}

// pastVisit turns a visit of the ledger into one of a plan's past.
func (s *Survey) pastVisit(v *ledger.Visit, list []ledger.Exposure, c *ledger.Credits, exposures *[]model.Exposure) scheduler.PastVisit {
	night := int32(v.Night - s.FirstNight)
	out := scheduler.PastVisit{GivenVisit: model.GivenVisit{
		Field: v.Field, Demand: v.Demand, Night: night, Start: v.Start, Quality: v.Quality, Counts: v.Counts, Binds: v.Sound,
	}}
	steps := len(s.Programs[s.Fields[v.Field].Program].Demands[v.Demand].Exposures)
	for k, x := range v.Exposures {
		e := &list[x]
		if night >= 0 && int(night) < s.Nights() {
			out.Seconds += model.Sec(e.End - e.Start)
		}
		out.Exposures = append(out.Exposures, int32(len(*exposures)))
		*exposures = append(*exposures, model.Exposure{
			Visit: e.Visit, Set: e.Set, Field: v.Field, Demand: v.Demand, Step: int32(min(k, steps-1)), Telescope: v.Telescope,
			Night: night, State: model.Done, Start: e.Start, End: e.End, Quality: c.Qualities[x],
		})
	}
	return out
}

// doneClaims gives the audit what the ledger says was done, in its own words.
func (s *Survey) doneClaims(ctx context.Context, upTo int64) ([]audit.Done, error) {
	list, err := s.done(ctx, upTo)
	if err != nil {
		return nil, err
	}
	var out []audit.Done
	for i := range list {
		if e := &list[i]; e.Unmatched == "" {
			out = append(out, audit.Done{Telescope: e.Telescope, Start: e.Start, Quality: e.Quality})
		}
	}
	return out, nil
}

// earlier turns a plan's tables into what a re-plan starts from. left counts the
// planned exposures of fields, demands or telescopes that the survey has no more;
// their changes are noted at once.
func (s *Survey) earlier(pt *tables.PlanTables, h *History) (old *scheduler.Earlier, left []tables.ChangeRow) {
	ids := newNames(s.Survey)
	old = &scheduler.Earlier{Done: map[int64]bool{}}
	type doneKey struct {
		telescope string
		start     int64
	}
	numbers := map[doneKey]*tables.VisitRow{}
	step := map[int64]int32{}
	for i := range pt.Visits {
		v := &pt.Visits[i]
		old.Visit, old.Set = max(old.Visit, v.Visit), max(old.Set, v.Set)
		k := int32(0)
		if v.Set != 0 {
			k = step[v.Set]
			step[v.Set]++
		}
		if v.State == model.Done.String() {
			old.Done[v.Visit] = true
			numbers[doneKey{v.Telescope, v.Start}] = v
			continue
		}
		f, d, t, ok := ids.of(v)
		if !ok {
			left = append(left, tables.ChangeRow{Visit: v.Visit, Field: v.Field, What: string(scheduler.Dropped), FromTelescope: v.Telescope, FromStart: v.Start})
			continue
		}
		old.Exposures = append(old.Exposures, model.Exposure{
			Visit: v.Visit, Set: v.Set, Field: f, Demand: d, Step: k, Telescope: t, Night: v.Night - int32(s.FirstNight),
			State: model.Planned, Start: v.Start, End: v.End,
		})
	}
	for i := range h.Exposures {
		e := &h.Exposures[i]
		if v := numbers[doneKey{s.Telescopes[e.Telescope].Name, e.Start}]; v != nil {
			e.Visit, e.Set = v.Visit, v.Set
		}
	}
	s.earlierTables(pt, ids, old)
	return old, left
}

// earlierTables takes prices, weights and open hours over.
func (s *Survey) earlierTables(pt *tables.PlanTables, ids *names, old *scheduler.Earlier) {
	for i := range pt.Prices {
		if t, ok := ids.telescopes[pt.Prices[i].Telescope]; ok {
			old.Prices = append(old.Prices, model.Price{Telescope: t, SlotStart: pt.Prices[i].SlotStart / 1e6, PerHour: pt.Prices[i].PricePerHour})
		}
	}
	old.Weights, old.Wanted = make([]float64, len(s.Fields)), make([]int32, len(s.Fields))
	for f := range old.Weights {
		old.Weights[f] = math.NaN()
	}
	for i := range pt.Fields {
		if f, ok := ids.fields[pt.Fields[i].Field]; ok {
			old.Weights[f], old.Wanted[f] = pt.Fields[i].Weight, int32(pt.Fields[i].VisitsWanted)
		}
	}
	old.OpenHours = make([]float64, len(s.Telescopes)*s.Nights())
	for i := range pt.Nights {
		r := &pt.Nights[i]
		t, ok := ids.telescopes[r.Telescope]
		if n := int(r.Night) - int(s.FirstNight); ok && n >= 0 && n < s.Nights() {
			old.OpenHours[int(t)*s.Nights()+n] = r.OpenHours
		}
	}
}

// names finds ids by name.
type names struct {
	sv                 *survey.Survey
	fields, telescopes map[string]int32
}

func newNames(sv *survey.Survey) *names {
	n := &names{sv, map[string]int32{}, map[string]int32{}}
	for i := range sv.Fields {
		n.fields[sv.Fields[i].Name] = int32(i)
	}
	for i := range sv.Telescopes {
		n.telescopes[sv.Telescopes[i].Name] = int32(i)
	}
	return n
}

// of finds the ids of a plan's row; false: the survey hasn't all of them.
func (n *names) of(v *tables.VisitRow) (field, demand, telescope int32, ok bool) {
	f, ok1 := n.fields[v.Field]
	t, ok2 := n.telescopes[v.Telescope]
	if !ok1 || !ok2 {
		return 0, 0, 0, false
	}
	p := &n.sv.Programs[n.sv.Fields[f].Program]
	if p.Name != v.Program {
		return 0, 0, 0, false
	}
	for d := range p.Demands {
		if p.Demands[d].Name == v.Demand {
			return f, int32(d), t, true
		}
	}
	return 0, 0, 0, false
}
