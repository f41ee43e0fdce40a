package scheduler

import (
	"cmp"
	"slices"

	"nightwright/scheduler/model"
)

// placeKey is where and what an exposure is.
type placeKey struct{ telescope, night, field, demand, step int32 }

func placeOf(e *model.Exposure) placeKey {
	return placeKey{e.Telescope, e.Night, e.Field, e.Demand, e.Step}
}

// identify finds out which planned exposure each done one follows, and gives
// it that one's numbers: by the number that was recorded, or else the nearest in
// time of the same field, demand, telescope and night. Others keep 0, which
// finish numbers. It returns a past of its own.
func (r *replanner) identify() {
	past := *r.in.Past
	past.Exposures = slices.Clone(past.Exposures)
	r.in.Past = &past
	r.planned = make(map[int64]int32, len(r.old.Exposures)) // number to index
	at := map[placeKey][]int32{}
	for i := range r.old.Exposures {
		e := &r.old.Exposures[i]
		r.planned[e.Visit] = int32(i)
		at[placeOf(e)] = append(at[placeOf(e)], int32(i))
	}
	r.doneAs = make([]int32, len(r.old.Exposures))
	for i := range r.doneAs {
		r.doneAs[i] = -1
	}
	order := make([]int32, len(past.Exposures))
	for i := range order {
		order[i] = int32(i)
	}
	slices.SortStableFunc(order, func(a, b int32) int { return cmp.Compare(past.Exposures[a].Start, past.Exposures[b].Start) })
	var left []int32
	for _, i := range order {
		e := &past.Exposures[i]
		if r.old.Done[e.Visit] && e.Visit != 0 {
			continue // done already when the earlier plan was made
		}
		k, ok := r.planned[e.Visit]
		if p := &r.old.Exposures; ok && (*p)[k].Field == e.Field && (*p)[k].Demand == e.Demand && (*p)[k].Step == e.Step && r.doneAs[k] < 0 {
			r.doneAs[k] = i
			continue
		}
		left = append(left, i)
	}
	for _, i := range left {
		e := &past.Exposures[i]
		best := int32(-1)
		for _, k := range at[placeOf(e)] {
			if r.doneAs[k] < 0 && (best < 0 || off(&r.old.Exposures[k], e) < off(&r.old.Exposures[best], e)) {
				best = k
			}
		}
		e.Visit = 0
		if best >= 0 {
			r.doneAs[best] = i
		}
	}
	for k, i := range r.doneAs {
		if i >= 0 {
			past.Exposures[i].Visit, past.Exposures[i].Set = r.old.Exposures[k].Visit, r.old.Exposures[k].Set
		}
	}
}

func off(a, b *model.Exposure) int64 { return max(a.Start-b.Start, b.Start-a.Start) }

// wasDone reports whether all exposures of a visit of the earlier plan were
// done.
func (r *replanner) wasDone(v *oldVisit) bool {
	for _, i := range v.exposures {
		if r.doneAs[i] < 0 {
			return false
		}
	}
	return true
}

// begun returns the starts, as they were, of the exposures that were done of a
// visit under way: all of those that have ended by now. nil: it was missed, or
// one of them was so poor that the visit can't count any more.
func (r *replanner) begun(v *oldVisit) []int64 {
	out := []int64{}
	for _, i := range v.exposures {
		if r.old.Exposures[i].End > r.in.Past.From {
			break
		}
		if r.doneAs[i] < 0 {
			return nil
		}
		e := &r.in.Past.Exposures[r.doneAs[i]]
		if e.Quality < r.base.Wants[v.want].MinQuality {
			return nil
		}
		out = append(out, e.Start)
	}
	return out
}

// numberDone gives what was done and follows no planned exposure numbers of its
// own, and each done set one number.
func (r *replanner) numberDone(next func() int64, nextSet func() int64) []model.Exposure {
	out := slices.Clone(r.in.Past.Exposures)
	visits, sets := map[int64]bool{}, map[int64]bool{}
	for i := range r.in.Past.Visits {
		v := &r.in.Past.Visits[i]
		set := int64(0)
		for _, k := range v.Exposures {
			set = max(set, out[k].Set)
		}
		if set != 0 && (sets[set] || !r.isNumber(out, v)) {
			set = nextSet()
		}
		sets[set] = true
		for _, k := range v.Exposures {
			e := &out[k]
			if e.Set != 0 {
				e.Set = set
			}
			if e.Visit == 0 || visits[e.Visit] {
				e.Visit = next()
			}
			visits[e.Visit] = true
		}
	}
	return out
}

// isNumber reports whether a done set's number is one of the earlier plan's,
// and not merely what the ledger has it under.
func (r *replanner) isNumber(done []model.Exposure, v *PastVisit) bool {
	for _, k := range v.Exposures {
		if done[k].Visit != 0 {
			return true
		}
	}
	return false
}
