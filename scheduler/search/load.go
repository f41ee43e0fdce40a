package search

import (
	"cmp"
	"math"
	"slices"

	"nightwright/scheduler/model"
)

// Old is one visit of an earlier plan.
type Old struct {
	Want, Scope, Night int32
	Starts             []int64 // of its exposures, us
}

// Refusal says why a visit of an earlier plan can't stand; "" is a visit that
// stands.
type Refusal string

// Why visits can't stand.
const (
	NotWanted Refusal = "not wanted" // the demand has its visits, or another make-up
	Closed    Refusal = "closed"     // outside open time: lost, closed, reserved or gone by
	Rules     Refusal = "rules"      // a rule forbids it now
	Cadence   Refusal = "cadence"    // too near another visit of its demand
	Crowded   Refusal = "crowded"    // the telescope can't get there in time, or keep_free
)

// occupy puts what is given and shares a night with what is planned into the
// nights: exposures that nothing moves, worth nothing here, for they were
// counted before.
func (s *state) occupy(busy []model.Exposure) {
	type visitKey struct {
		want, scope, night int32
		set                int64
	}
	seen := map[visitKey]int32{}
	touched := map[int]bool{}
	var order []int
	for i := range busy {
		e := &busy[i]
		if e.Night < 0 || int(e.Night) >= s.p.Nights {
			continue
		}
		want := s.p.WantOf(e.Field, e.Demand)
		k := visitKey{want, e.Telescope, e.Night, e.Set}
		id, ok := seen[k]
		if !ok || e.Set == 0 {
			id = int32(len(s.visits))
			s.visits = append(s.visits, visit{want: want, scope: e.Telescope, night: e.Night, alive: true, fixed: true, born: -1, start: e.Start, early: e.Start, late: e.Start})
			seen[k] = id
		}
		w := &s.p.Wants[want]
		step := min(int(e.Step), len(w.Steps)-1)
		at := entry{length: e.End - e.Start, visit: id, want: want, step: int16(step), filter: int16(w.Steps[step].Filter), early: e.Start, late: e.Start}
		s.set(e.Telescope, &at, e.Start)
		at.credit, at.slope = 0, 0
		index := int(e.Telescope)*s.p.Nights + int(e.Night)
		s.nights[index].list = append(s.nights[index].list, at)
		if !touched[index] {
			touched[index] = true
			order = append(order, index)
		}
	}
	for _, index := range order {
		n := &s.nights[index]
		slices.SortStableFunc(n.list, func(a, b entry) int { return cmp.Compare(a.start, b.start) })
		s.refresh(int32(index/s.p.Nights), n)
	}
}

// Load puts visits of an earlier plan where they were, as far as they are legal
// by the problem as it is now, and says of each why it can't stand. Until Settle
// nothing can push them. Visits that
// come earlier in the list go first.
func (x *Search) Load(list []Old) []Refusal {
	s := x.s
	out := make([]Refusal, len(list))
	x.cadence(list, out)
	// Pointings and qualities, side by side; then night by night in order.
	entries := make([][]entry, len(list))
	model.Parallel(s.p.Workers, (len(list)+loadChunk-1)/loadChunk, func(c int) {
		for i := c * loadChunk; i < min((c+1)*loadChunk, len(list)); i++ {
			if out[i] == "" {
				entries[i], out[i] = s.entriesOf(list, i)
			}
		}
	})
	byNight := make([][]int32, len(s.nights))
	for i := range list {
		if out[i] == "" {
			k := int(list[i].Scope)*s.p.Nights + int(list[i].Night)
			byNight[k] = append(byNight[k], int32(i))
		}
	}
	model.Parallel(s.p.Workers, len(byNight), func(k int) {
		if len(byNight[k]) > 0 {
			s.crowd(k, byNight[k], entries, out)
		}
	})
	for k := range byNight {
		if len(byNight[k]) > 0 {
			s.admit(k, byNight[k], list, entries, out)
		}
	}
	if invariants {
		s.verify()
	}
	return out
}

// Settle says how firm the loaded visits are: what taking any of them out costs
// (C), and how far they may be pushed to make room, as part of what a visit that
// is placed afresh may be: 0 to 1. list is that of Load.
func (x *Search) Settle(list []Old, charge, leeway float64) {
	s := x.s
	s.charged = 0
	for i := range s.visits {
		if v := &s.visits[i]; v.ref > 0 && v.alive && !v.fixed {
			v.charge = int64(math.Round(charge * scoreUnit))
		}
	}
	x.windows(list, leeway)
}

// loadChunk is how many visits are one piece of work.
const loadChunk = 256

// cadence refuses visits that aren't wanted, or come too near what is given or
// what comes before them in the list.
func (x *Search) cadence(list []Old, out []Refusal) {
	p := x.p
	taken := make([][]int32, len(p.Wants)) // accepted visits of each want
	for i := range list {
		o := &list[i]
		w := &p.Wants[o.Want]
		switch {
		case len(o.Starts) != len(w.Steps) || len(taken[o.Want]) >= int(w.Visits) || o.Night < 0 || int(o.Night) >= p.Nights:
			out[i] = NotWanted
			continue
		case !slices.Contains(w.Scopes, o.Scope):
			out[i] = NotWanted
			continue
		case w.Near(o.Starts[0], o.Night):
			out[i] = Cadence
			continue
		}
		same := w.GivenIn(o.Night)
		for _, k := range taken[o.Want] {
			if d := list[k].Starts[0] - o.Starts[0]; d < w.Spacing && -d < w.Spacing {
				out[i] = Cadence
			}
			if list[k].Night == o.Night {
				same++
			}
		}
		if w.PerNight > 0 && same >= w.PerNight {
			out[i] = Cadence
		}
		if out[i] == "" && !keepsTimes(w, o.Starts) {
			out[i] = NotWanted
		}
		if out[i] == "" {
			taken[o.Want] = append(taken[o.Want], int32(i))
		}
	}
}

// keepsTimes reports whether the starts of a set are within its tolerances.
func keepsTimes(w *model.Want, starts []int64) bool {
	for k := 1; k < len(starts); k++ {
		off := starts[k] - starts[k-1] - w.Steps[k].After
		if off > w.Steps[k].Tolerance || -off > w.Steps[k].Tolerance {
			return false
		}
	}
	return true
}

// entriesOf makes the entries of a visit where it was, with their shift windows
// shut, or says why it can't stand.
func (s *state) entriesOf(list []Old, i int) ([]entry, Refusal) {
	o := &list[i]
	w := &s.p.Wants[o.Want]
	out := make([]entry, len(o.Starts))
	for k, start := range o.Starts {
		e := &out[k]
		*e = entry{
			visit: unborn, length: s.p.Length(&w.Steps[k], o.Scope), want: o.Want, step: int16(k), filter: int16(w.Steps[k].Filter), early: start, late: start,
		}
		if !s.isOpen(o.Scope, o.Night, start, e.length) {
			return nil, Closed
		}
		if _, _, ok := s.legalStarts(w, o.Scope, int(o.Night), start, e.length); !ok || !s.set(o.Scope, e, start) {
			return nil, Rules
		}
	}
	return out, ""
}

// isOpen reports whether an exposure lies in one open interval.
func (s *state) isOpen(scope, night int32, start, length int64) bool {
	for _, o := range s.p.Open(int(scope), int(night)) {
		if o.From <= start && start+length <= o.To {
			return true
		}
	}
	return false
}

// crowd refuses the visits of one telescope-night that the telescope can't reach
// in time from those before them in the list, given ones first, or that keep_free
// has no room for. It writes only what belongs to these visits.
func (s *state) crowd(index int, ids []int32, entries [][]entry, out []Refusal) {
	scope, night := int32(index/s.p.Nights), int32(index%s.p.Nights)
	row := slices.Clone(s.nights[index].list)
	// In order of time everything at once fits, unless something changed; then
	// one by one.
	all := slices.Clone(row)
	for _, i := range ids {
		all = append(all, entries[i]...)
	}
	if s.fits(scope, night, all) {
		return
	}
	for _, i := range ids {
		with := append(slices.Clone(row), entries[i]...)
		if s.fits(scope, night, with) {
			row = with
		} else {
			out[i] = Crowded
		}
	}
}

// fits sorts exposures by time and reports whether every gap holds between those
// that aren't given, and keep_free.
func (s *state) fits(scope, night int32, list []entry) bool {
	slices.SortStableFunc(list, func(a, b entry) int { return cmp.Compare(a.start, b.start) })
	var used int64
	for k := range list {
		e := &list[k]
		used += e.length
		if k == 0 {
			continue
		}
		gap := s.gapBetween(scope, &list[k-1], e)
		used += gap
		given := s.isGiven(&list[k-1]) && s.isGiven(e)
		if !given && list[k-1].end()+gap > e.start {
			return false
		}
	}
	return s.p.Scopes[scope].KeepFree == 0 || used <= s.p.Budget(int(scope), int(night))
}

// unborn stands for the visit of an entry that is being loaded.
const unborn = -1

func (s *state) isGiven(e *entry) bool { return e.visit != unborn && s.visits[e.visit].fixed }

// admit makes visits of what was not refused in one telescope-night.
func (s *state) admit(index int, ids []int32, list []Old, entries [][]entry, out []Refusal) {
	scope, night := int32(index/s.p.Nights), int32(index%s.p.Nights)
	n := &s.nights[index]
	for _, i := range ids {
		if out[i] != "" {
			continue
		}
		o := &list[i]
		id := int32(len(s.visits))
		s.visits = append(s.visits, visit{
			want: o.Want, scope: scope, night: night, born: -1, start: o.Starts[0], early: o.Starts[0], late: o.Starts[0], ref: i + 1,
		})
		s.remember(id)
		for k := range entries[i] {
			e := &entries[i][k]
			e.visit = id
			s.score += e.credit
			s.time[s.p.Wants[o.Want].Program] += e.length
			s.visits[id].credit += e.credit
			n.list = append(n.list, *e)
		}
	}
	slices.SortStableFunc(n.list, func(a, b entry) int { return cmp.Compare(a.start, b.start) })
	s.refresh(scope, n)
}

// windows opens the shift windows of loaded visits: legal starts, 20 minutes,
// half of the cadence slack and of a set's tolerance, as for visits that are
// placed afresh.
func (x *Search) windows(list []Old, leeway float64) {
	s := x.s
	starts := make([][]int64, len(s.of)) // before anything is shifted
	for wi := range s.of {
		for _, id := range s.of[wi] {
			starts[wi] = append(starts[wi], s.visits[id].start)
		}
		slices.Sort(starts[wi])
	}
	model.Parallel(s.p.Workers, len(s.nights), func(k int) {
		n := &s.nights[k]
		for i := range n.list {
			e := &n.list[i]
			v := &s.visits[e.visit]
			if !v.fixed && v.ref > 0 {
				s.openWindow(e, v, starts[e.want], &list[v.ref-1], leeway)
			}
		}
	})
	for k := range s.nights {
		n := &s.nights[k]
		if len(n.list) > 0 {
			s.refresh(int32(k/s.p.Nights), n)
			s.sync(n)
		}
	}
}

// openWindow sets the shift window of one entry.
func (s *state) openWindow(e *entry, v *visit, starts []int64, o *Old, leeway float64) {
	w := &s.p.Wants[e.want]
	reach := int64(leeway * maxShift)
	lo, hi := -reach, reach
	at := o.Starts[0]
	down, up := w.Slack(at)
	lo, hi = max(lo, down), min(hi, up)
	k, _ := slices.BinarySearch(starts, at)
	if k > 0 {
		lo = max(lo, -(at-starts[k-1]-w.Spacing)/2)
	}
	if k+1 < len(starts) {
		hi = min(hi, (starts[k+1]-at-w.Spacing)/2)
	}
	// Of what the tolerance leaves between two steps of a set each takes half.
	for j := max(1, int(e.step)); j <= min(int(e.step)+1, len(w.Steps)-1); j++ {
		off := o.Starts[j] - o.Starts[j-1] - w.Steps[j].After
		less, more := (w.Steps[j].Tolerance+off)/2, (w.Steps[j].Tolerance-off)/2
		if j > int(e.step) {
			less, more = more, less // this one is the step before
		}
		lo, hi = max(lo, -less), min(hi, more)
	}
	lo, hi = min(lo, 0), max(hi, 0)
	early, late, ok := s.legalStarts(w, v.scope, int(v.night), e.start, e.length)
	if !ok {
		return
	}
	e.early, e.late = max(early, e.start+lo), min(late, e.start+hi)
	s.keepQuality(v.scope, e)
}

// Placed is one exposure of the plan as it stands.
type Placed struct {
	model.Exposure
	Visit int32 // number of its visit in this state
	Ref   int32 // which of the loaded visits it is, from 1; 0: a new one
}

// Placed lists the exposures of the plan, given ones apart, by start and
// telescope.
func (x *Search) Placed() []Placed {
	var out []Placed
	for i := range x.s.nights {
		for k := range x.s.nights[i].list {
			e := &x.s.nights[i].list[k]
			v := &x.s.visits[e.visit]
			if v.fixed {
				continue
			}
			w := &x.p.Wants[e.want]
			out = append(out, Placed{model.Exposure{
				Field: w.Field, Demand: w.Demand, Step: int32(e.step), Telescope: int32(i / x.p.Nights),
				Night: int32(i % x.p.Nights), State: model.Planned, Start: e.start, End: e.end(),
			}, e.visit, v.ref})
		}
	}
	slices.SortFunc(out, func(a, b Placed) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope))
	})
	return out
}
