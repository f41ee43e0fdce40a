package seasons

import (
	"cmp"
	"slices"

	"nightwright/scheduler/model"
)

// planned is a plan as telescopes' lists.
type planned struct {
	nights [][]model.Exposure // [scope*Nights+night], by start
	starts [][]plannedVisit   // [want], by start
	wants  [][]int32          // want of each of nights' exposures
}

// plannedVisit is the first start of a visit.
type plannedVisit struct {
	start int64
	night int32
}

// shift is how much earlier or later than planned a visit may start, us: who
// is ahead of the list goes on with it, who is behind catches up.
const shift = 30 * 60 * model.Micro

// newPlanned sorts a plan's exposures into lists. Exposures of demands that
// the problem doesn't have are left out.
func newPlanned(st *Stage, list []model.Exposure) *planned {
	p := st.p
	l := &planned{nights: make([][]model.Exposure, len(p.Scopes)*p.Nights), wants: make([][]int32, len(p.Scopes)*p.Nights), starts: make([][]plannedVisit, len(p.Wants))}
	sorted := slices.Clone(list)
	slices.SortStableFunc(sorted, func(a, b model.Exposure) int { return cmp.Compare(a.Start, b.Start) })
	for _, e := range sorted {
		want := int32(-1)
		for w := p.FieldWant[e.Field]; w < p.FieldWant[e.Field+1]; w++ {
			if p.Wants[w].Demand == e.Demand {
				want = w
			}
		}
		k := int(e.Telescope)*p.Nights + int(e.Night)
		if want < 0 || e.Night < 0 || int(e.Night) >= p.Nights {
			continue // not of this season
		}
		l.nights[k] = append(l.nights[k], e)
		l.wants[k] = append(l.wants[k], want)
		if e.Step == 0 {
			l.starts[want] = append(l.starts[want], plannedVisit{e.Start, e.Night})
		}
	}
	return l
}

// takeList puts the night's list among what is due.
func (pl *Player) takeList(s *scope) {
	if pl.policy != AsPlanned {
		return
	}
	k := int(s.id)*pl.st.p.Nights + int(s.night)
	for i, e := range pl.lists.nights[k] {
		if e.Step > 0 {
			continue // the steps of a set follow its first
		}
		c := commit{want: pl.lists.wants[k][i], earliest: e.Start - shift, latest: e.Start + shift}
		if len(pl.st.p.Wants[c.want].Steps) > 1 {
			c.set = &begun{want: c.want, planned: true}
		}
		pl.due(s, c)
	}
}

// clearOfList reports whether a visit that starts now leaves the want's next
// planned one its distance.
func (pl *Player) clearOfList(s *scope, want int32, at int64) bool {
	list := pl.lists.starts[want]
	k := pl.next[want]
	for int(k) < len(list) && list[k].start < at {
		k++
	}
	pl.next[want] = k
	if int(k) == len(list) {
		return true
	}
	w := &pl.st.p.Wants[want]
	if w.PerNight > 0 && list[k].night == s.night {
		return false
	}
	return list[k].start-at >= w.Spacing
}
