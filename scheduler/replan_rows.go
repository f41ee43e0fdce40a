package scheduler

import (
	"cmp"
	"slices"

	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/search"
)

// What says what became of a visit.
type What string

// What becomes of visits.
const (
	Kept    What = "kept"    // on its telescope, in its night
	Moved   What = "moved"   // to another telescope or night
	Dropped What = "dropped" // it made room for others
	New     What = "new"
	Lost    What = "lost" // it was not done, or can't stand any more
	Did     What = "done"
)

// Change is what a re-plan did to one exposure. From is where it was in the
// earlier plan, To where it is now; a start of 0 is nowhere.
type Change struct {
	Visit         int64
	Field         int32
	What          What
	Why           search.Refusal // of a lost one
	FromTelescope int32
	FromStart     int64 // UTC, Unix us
	ToTelescope   int32
	ToStart       int64
}

// now is the plan as the search has it, by visit.
type now struct {
	visits []nowVisit
	gone   []int // indices of replanner.visits that stood, and stand no more
}

type nowVisit struct {
	exposures []model.Exposure // by start
	old       int              // index of replanner.visits that it is or takes the place of; -1: none
	moved     bool
}

// placed pairs the visits of the search with those of the earlier plan: the
// ones that stayed, then for each demand those that left with those that came, in
// their order.
func (r *replanner) placed() *now {
	out := &now{}
	at := map[int32]int{}
	stayed := make([]bool, len(r.rest))
	for _, p := range r.s.Placed() {
		k, ok := at[p.Visit]
		if !ok {
			k = len(out.visits)
			at[p.Visit] = k
			v := nowVisit{old: -1}
			if p.Ref > 0 {
				v.old = r.rest[p.Ref-1]
				stayed[p.Ref-1] = true
			}
			out.visits = append(out.visits, v)
		}
		out.visits[k].exposures = append(out.visits[k].exposures, p.Exposure)
	}
	left := map[int32][]int{} // by want
	for i, k := range r.rest {
		if !stayed[i] && r.visits[k].fate == stands {
			left[r.visits[k].want] = append(left[r.visits[k].want], k)
		}
	}
	for i := range out.visits {
		v := &out.visits[i]
		e := &v.exposures[0]
		want := r.p.WantOf(e.Field, e.Demand)
		if v.old < 0 && len(left[want]) > 0 {
			// One that only went elsewhere in its night is the same one first.
			list := left[want]
			k := max(0, slices.IndexFunc(list, func(k int) bool { return r.sameNight(k, e) }))
			v.old = list[k]
			left[want] = slices.Delete(list, k, k+1)
			v.moved = !r.sameNight(v.old, e)
		}
	}
	for _, k := range r.rest {
		if slices.Contains(left[r.visits[k].want], k) {
			out.gone = append(out.gone, k)
		}
	}
	return out
}

func (r *replanner) sameNight(k int, e *model.Exposure) bool {
	o := r.first(&r.visits[k])
	return o.Telescope == e.Telescope && o.Night == e.Night
}

// tally counts what became of the visits planned after the hold.
func (n *now) tally(r *replanner) Tally {
	t := Tally{Dropped: len(n.gone)}
	for i := range n.visits {
		v := &n.visits[i]
		switch {
		case v.old < 0:
			t.New++
		case v.moved:
			t.Moved++
		default:
			t.Kept++
			if v.exposures[0].Start != r.first(&r.visits[v.old]).Start {
				t.Shifted++
			}
		}
	}
	return t
}

// finish proves the ceilings and puts the outcome together.
func (r *replanner) finish(ascent *dual.Ascent, out *Replanned) {
	r.par.Progress(model.Progress{Phase: "ceiling", Total: 2, Coverage: r.s.Coverage()})
	ceiling := ascent.CeilingWithin(r.ctx, r.par.CeilingBin)
	r.par.Progress(model.Progress{Phase: "ceiling", Done: 1, Total: 2, Coverage: r.s.Coverage(), Ceiling: ceiling})
	out.CeilingHeld = ceiling
	kept := dual.NewAscentAt(r.ph, r.old.Prices)
	if len(r.held) > 0 {
		kept.StartMu(ascent.Oracle().Mu)
		out.CeilingHeld = min(ceiling, kept.CeilingWithin(r.ctx, r.par.CeilingBin))
	}
	planned := &model.Plan{}
	for _, p := range r.s.Placed() {
		planned.Exposures = append(planned.Exposures, p.Exposure)
	}
	told := shares(r.ph, planned)
	relaxed := false
	for i := range told {
		if told[i].Breach != 0 {
			relaxed = true
			ascent.Relax(int(told[i].Program), told[i].Share)
			kept.Relax(int(told[i].Program), told[i].Share)
		}
	}
	if relaxed {
		ceiling = ascent.CeilingWithin(r.ctx, r.par.CeilingBin)
		out.CeilingHeld = min(ceiling, kept.CeilingWithin(r.ctx, r.par.CeilingBin))
	}
	r.par.Progress(model.Progress{Phase: "ceiling", Done: 2, Total: 2, Coverage: r.s.Coverage(), Ceiling: ceiling})
	status := model.StepsDone
	if r.ctx.Err() != nil {
		status = model.Interrupted
	}
	n := r.placed()
	t := n.tally(r)
	t.Done, t.Held, t.Lost, t.LostC, t.WonC = out.Tally.Done, out.Tally.Held, out.Tally.Lost, out.Tally.LostC, out.Tally.WonC
	t.Kept += t.Held
	out.Tally = t
	out.Outcome = &model.Outcome{
		Plan: r.rows(n, out), Coverage: r.s.Coverage(), Ceiling: ceiling, Status: status,
		Effort: "replan", Seed: r.par.Seed, Prices: ascent.Prices().List(), Stats: r.s.Stats().List(), Shares: told,
	}
}

// rows writes the plan out with its numbers, and notes the changes.
func (r *replanner) rows(n *now, out *Replanned) *model.Plan {
	visit, set := r.old.Visit, r.old.Set
	next := func() int64 { visit++; return visit }
	nextSet := func() int64 { set++; return set }
	all := r.numberDone(next, nextSet)
	r.doneChanges(all, out)
	for _, k := range r.held {
		v := &r.visits[k]
		for j, i := range v.exposures {
			if j < len(v.begun) {
				continue // among the done ones, with the set's number
			}
			e := r.old.Exposures[i]
			e.State = model.Held
			all = append(all, e)
			out.Changes = append(out.Changes, change(&e, Kept, &e))
		}
	}
	for i := range n.visits {
		v := &n.visits[i]
		number := int64(0)
		switch {
		case len(v.exposures) < 2:
		case v.old >= 0:
			number = r.first(&r.visits[v.old]).Set
		default:
			number = nextSet()
		}
		for j := range v.exposures {
			e := &v.exposures[j]
			e.Set = number
			if v.old < 0 {
				e.Visit = next()
				out.Changes = append(out.Changes, change(nil, New, e))
			} else {
				was := &r.old.Exposures[r.visits[v.old].exposures[j]]
				e.Visit = was.Visit
				what := Kept
				if v.moved {
					what = Moved
				}
				out.Changes = append(out.Changes, change(was, what, e))
			}
			all = append(all, *e)
		}
	}
	r.goneChanges(n, out)
	slices.SortStableFunc(out.Changes, func(a, b Change) int { return cmp.Compare(a.Visit, b.Visit) })
	slices.SortStableFunc(all, func(a, b model.Exposure) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope))
	})
	return &model.Plan{Exposures: all}
}

// change notes an exposure that was at one place and is at another; nil is
// nowhere.
func change(from *model.Exposure, what What, to *model.Exposure) Change {
	c := Change{What: what, FromTelescope: -1, ToTelescope: -1}
	if from != nil {
		c.Visit, c.Field, c.FromTelescope, c.FromStart = from.Visit, from.Field, from.Telescope, from.Start
	}
	if to != nil {
		c.Visit, c.Field, c.ToTelescope, c.ToStart = to.Visit, to.Field, to.Telescope, to.Start
	}
	return c
}

// doneChanges notes what was done since the earlier plan was made.
func (r *replanner) doneChanges(done []model.Exposure, out *Replanned) {
	for i := range done {
		e := &done[i]
		if r.old.Done[e.Visit] {
			continue
		}
		if k, ok := r.planned[e.Visit]; ok {
			out.Changes = append(out.Changes, change(&r.old.Exposures[k], Did, e))
		} else {
			out.Changes = append(out.Changes, change(nil, Did, e))
		}
	}
}

// goneChanges notes what was lost and what made room.
func (r *replanner) goneChanges(n *now, out *Replanned) {
	note := func(k int, what What) {
		v := &r.visits[k]
		for _, i := range v.exposures {
			if r.doneAs[i] >= 0 {
				continue // the part of a broken set that was done
			}
			c := change(&r.old.Exposures[i], what, nil)
			c.Why = v.why
			out.Changes = append(out.Changes, c)
		}
	}
	for k := range r.visits {
		if r.visits[k].fate == isLost {
			note(k, Lost)
		}
	}
	for _, k := range n.gone {
		note(k, Dropped)
	}
}
