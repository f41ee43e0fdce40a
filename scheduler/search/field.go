package search

import (
	"math"
	"slices"

	"nightwright/scheduler/model"
)

// placer takes a field's visits out and puts them back where they are worth
// most: the one move of construction and sweeps.
type placer struct {
	s      *state
	find   finder  // for single looks
	scouts []scout // for looks over all nights
	choose chooser
	mu     []float64 // [want] what the last visit was worth: spots much below are passed over
	all    []spot
	combos []combo
	picked []int
	banned []spot // spots of the want being filled that turned out not to work
	// Spots are looked for in the nights [from, to), and with only in those
	// telescope-nights alone.
	from, to int
	only     []bool // [scope * Nights + night]; nil: all
}

// startBin is the width of the bins in which the finder keeps one spot, s;
// wideBin where a night can hold one visit of a want anyway.
const (
	startBin = 200
	wideBin  = 1800
)

func newPlacer(s *state, mu []float64) *placer {
	pl := &placer{s: s, mu: slices.Clone(mu), to: s.p.Nights}
	pl.find = finder{s: s}
	s.mu = pl.mu
	for range s.p.Workers {
		pl.scouts = append(pl.scouts, scout{find: pl.find})
	}
	return pl
}

// skipBelow is how far under a want's multiplier a spot may be and still be
// looked at.
const skipBelow = 0.97

// place re-places all visits of a field's wants and reports whether the plan
// changed for the better (in score less theta times the price of time). When
// a finish bonus is near, it also tries to get every visit, at a loss on some.
func (pl *placer) place(field int) bool {
	s := pl.s
	s.stats.Placed++
	before := pl.objective()
	s.begin()
	pl.replace(field, 0)
	after := pl.objective() + s.hoped(field)
	if bonus := s.p.Bonus(field); bonus > 0 && s.got[field] < s.wanted[field] && 4*s.got[field] >= 3*s.wanted[field] {
		lack := float64(s.wanted[field] - s.got[field])
		s.rollback()
		s.begin()
		pl.replace(field, bonus/lack)
		if forced := pl.objective() + s.hoped(field); forced > after {
			after = forced
		} else {
			s.rollback()
			s.begin()
			pl.replace(field, 0)
		}
	}
	if after < before {
		s.rollback()
		s.stats.Undone++
		return false
	}
	s.commit()
	if after > before {
		s.stats.Better++
	}
	return true
}

// replace takes a field's visits out and puts them back, with extra added to
// the worth of every spot.
func (pl *placer) replace(field int, extra float64) {
	s := pl.s
	for wi := s.p.FieldWant[field]; wi < s.p.FieldWant[field+1]; wi++ {
		for _, id := range slices.Clone(s.of[wi]) {
			if !s.visits[id].fixed {
				s.remove(id)
			}
		}
	}
	for wi := s.p.FieldWant[field]; wi < s.p.FieldWant[field+1]; wi++ {
		pl.fill(int(wi), extra)
	}
}

// objective is what place compares: the score less theta times the price of
// the time used on the nights it touches.
func (pl *placer) objective() float64 {
	s := pl.s
	v := float64(s.score-s.charged) / scoreUnit
	if s.theta > 0 {
		v -= s.theta * s.priced
	}
	for p, r := range s.rates {
		v += r * model.Sec(s.time[p])
	}
	return v
}

// rounds is how often a want's missing visits are looked for again: an
// insertion can fail where an earlier one has pushed things about.
const rounds = 4

// fill adds visits of one want, as many as it lacks.
func (pl *placer) fill(wi int, extra float64) {
	s := pl.s
	w := &s.p.Wants[wi]
	if len(w.Scopes) == 0 {
		return
	}
	least := skipBelow * pl.mu[wi]
	if extra > 0 {
		least = -extra
	}
	pl.banned = pl.banned[:0]
	for round := range rounds {
		lack := int(w.Visits) - len(s.of[wi])
		if lack <= 0 {
			return
		}
		pl.gather(wi, w, least, extra)
		var mu float64
		pl.picked, mu = pl.choose.choose(w, pl.all, lack, pl.picked[:0])
		if len(pl.picked) < lack && least > 0 {
			least = 0
			pl.gather(wi, w, least, extra)
			pl.picked, mu = pl.choose.choose(w, pl.all, lack, pl.picked[:0])
		}
		if extra == 0 && round == 0 {
			pl.mu[wi] = mu
		}
		done := 0
		for k := range pl.picked {
			if pl.putBack(wi, w, k) {
				done++
			} else {
				pl.banned = append(pl.banned, pl.all[pl.picked[k]])
			}
		}
		if done == len(pl.picked) {
			return
		}
	}
}

// gather lists the want's spots over all telescopes and nights, by start, as
// far as they are worth more than least, and adds extra to each. The nights
// are looked through by several scouts, each a stretch of them; what they
// bring is joined in the order of the nights.
func (pl *placer) gather(wi int, w *model.Want, least, extra float64) {
	nights := pl.to - pl.from
	cells := len(w.Scopes) * nights
	model.Parallel(len(pl.scouts), len(pl.scouts), func(k int) {
		sc := &pl.scouts[k]
		sc.spots, sc.combos = sc.spots[:0], sc.combos[:0]
		for i := k * cells / len(pl.scouts); i < (k+1)*cells/len(pl.scouts); i++ {
			t, n := w.Scopes[i/nights], pl.from+i%nights
			if pl.only == nil || pl.only[int(t)*pl.s.p.Nights+n] {
				sc.look(w, t, n, least)
			}
		}
	})
	pl.all, pl.combos = pl.all[:0], pl.combos[:0]
	for k := range pl.scouts {
		sc := &pl.scouts[k]
		for _, sp := range sc.spots {
			sp.combo += int32(len(pl.combos))
			pl.all = append(pl.all, sp)
		}
		pl.combos = append(pl.combos, sc.combos...)
	}
	if len(pl.banned) > 0 {
		pl.all = slices.DeleteFunc(pl.all, pl.isBanned)
	}
	if len(pl.s.of[wi]) > 0 || w.Given() {
		pl.all = slices.DeleteFunc(pl.all, func(sp spot) bool { return pl.s.tooNear(w, wi, sp) })
	}
	if extra != 0 {
		for i := range pl.all {
			pl.all[i].profit += extra
		}
	}
	sortSpots(pl.all)
}

// isBanned reports whether a spot is one that failed before.
func (pl *placer) isBanned(sp spot) bool {
	for i := range pl.banned {
		b := &pl.banned[i]
		if b.scope == sp.scope && b.night == sp.night && b.start/(startBin*model.Micro) == sp.start/(startBin*model.Micro) && b.eject == sp.eject {
			return true
		}
	}
	return false
}

// tooNear reports whether a spot breaks the cadence with a visit that stays.
func (s *state) tooNear(w *model.Want, wi int, sp spot) bool {
	if w.Near(sp.start, sp.night) {
		return true
	}
	same := w.GivenIn(sp.night)
	for _, id := range s.of[wi] {
		v := &s.visits[id]
		if sp.start-v.late < w.Spacing && v.early-sp.start < w.Spacing {
			return true
		}
		if v.night == sp.night {
			same++
		}
	}
	return w.PerNight > 0 && same >= w.PerNight
}

// putBack inserts the k-th picked visit, ejecting what makes room. It leaves
// the plan as it was when that fails.
func (pl *placer) putBack(wi int, w *model.Want, k int) bool {
	s := pl.s
	sp := pl.all[pl.picked[k]]
	parts := []spot{sp}
	if len(w.Steps) > 1 {
		parts = pl.combos[sp.combo].spots
	}
	// Cadence slack to the neighbours, half each.
	lo, hi := int64(-maxShift), int64(maxShift)
	if k > 0 {
		lo = max(lo, -(sp.start-pl.all[pl.picked[k-1]].start-w.Spacing)/2)
	}
	if k+1 < len(pl.picked) {
		hi = min(hi, (pl.all[pl.picked[k+1]].start-sp.start-w.Spacing)/2)
	}
	down, up := w.Slack(sp.start)
	lo, hi = max(lo, down), min(hi, up)
	same := w.GivenIn(sp.night)
	for _, id := range s.of[wi] {
		v := &s.visits[id]
		if sp.start > v.start {
			lo = max(lo, v.late+w.Spacing-sp.start)
		} else {
			hi = min(hi, v.early-w.Spacing-sp.start)
		}
		if v.night == sp.night {
			same++
		}
	}
	if lo > 0 || hi < 0 || w.PerNight > 0 && same >= w.PerNight {
		return false
	}
	mark := s.mark(sp.scope, sp.night)
	if !pl.eject(sp.eject, int32(wi)) {
		s.undoTo(mark)
		return false
	}
	id := s.newVisit(int32(wi), sp.scope, sp.night)
	for j, part := range parts {
		if j > 0 {
			// The first steps moved what is around: look again.
			if part, ok := pl.nextStep(w, wi, j, parts[j-1]); ok {
				parts[j] = part
			} else {
				s.undoTo(mark)
				s.stats.Refused++
				return false
			}
			part = parts[j]
			pl.eject(part.eject, int32(wi))
		}
		early, late, ok := s.shiftWindow(w, j, part, parts, lo, hi)
		if !ok || !s.insert(id, j, part, early, late) {
			s.undoTo(mark)
			s.stats.Refused++
			return false
		}
		parts[j].start = (early + late) / 2
	}
	s.stats.Inserted++
	return true
}

// eject removes the visits that make room; false when one is gone already or
// is the want's own.
func (pl *placer) eject(e ejected, want int32) bool {
	if pl.ownVisit(e, want) {
		return false
	}
	for _, id := range e {
		if id < 0 {
			continue
		}
		if !pl.s.visits[id].alive {
			return false
		}
		pl.s.remove(id)
		pl.s.stats.Ejected++
	}
	return true
}

// ownVisit reports whether one of the visits is the want's.
func (pl *placer) ownVisit(e ejected, want int32) bool {
	for _, id := range e {
		if id >= 0 && pl.s.visits[id].want == want {
			return true
		}
	}
	return false
}

// shiftWindow bounds the start of a step: the legal window it was found in,
// the cadence slack, and half of what the set's tolerances leave.
func (s *state) shiftWindow(w *model.Want, j int, part spot, parts []spot, lo, hi int64) (early, late int64, ok bool) {
	length := s.p.Length(&w.Steps[j], part.scope)
	early, late, ok = s.legalStarts(w, part.scope, int(part.night), part.start, length)
	if !ok {
		return 0, 0, false
	}
	if len(parts) > 1 {
		// Half of the least tolerance to each of two steps, so that no two
		// shifts together break one; a step that is off its ideal time gets
		// less on the side it is off to.
		half := s.half(w)
		lo, hi = max(lo, -half), min(hi, half)
		if j > 0 {
			off := part.start - parts[j-1].start - w.Steps[j].After
			lo, hi = max(lo, -half-min(off, 0)), min(hi, half-max(off, 0))
		}
		if lo > 0 || hi < 0 {
			return 0, 0, false
		}
	}
	return max(early, part.start+lo), min(late, part.start+hi), true
}

// half returns half of the least tolerance of a set, us.
func (s *state) half(w *model.Want) int64 {
	least := int64(math.MaxInt64)
	for j := 1; j < len(w.Steps); j++ {
		least = min(least, w.Steps[j].Tolerance)
	}
	return least / 2
}

// nextStep finds where step j of a set goes, given where the middle of the
// step before's shift window is, and not by ejecting the set itself.
func (pl *placer) nextStep(w *model.Want, wi, j int, before spot) (spot, bool) {
	st := &w.Steps[j]
	f := &pl.find
	f.spots = f.spots[:0]
	f.only = Range{before.start + st.After - st.Tolerance/2, before.start + st.After + st.Tolerance/2}
	f.find(w, j, before.scope, int(before.night), math.Inf(-1))
	f.only = Range{}
	best := -1
	for i := range f.spots {
		if pl.ownVisit(f.spots[i].eject, int32(wi)) {
			continue
		}
		if best < 0 || f.spots[i].profit > f.spots[best].profit {
			best = i
		}
	}
	if best < 0 {
		return spot{}, false
	}
	return f.spots[best], true
}

// legalStarts returns the starts around t at which an exposure lies in one
// window and one open interval with t.
func (s *state) legalStarts(w *model.Want, scope int32, night int, t, length int64) (lo, hi int64, ok bool) {
	for _, win := range s.p.Windows.Of(int(w.Unit), int(s.p.Scopes[scope].Class), night) {
		wf, wt := s.p.Inward(win)
		for _, o := range s.p.Open(int(scope), night) {
			a, b := max(wf, o.From), min(wt, o.To)-length
			if a <= t && t <= b {
				if !ok || b-a > hi-lo {
					lo, hi, ok = a, b, true
				}
			}
		}
	}
	return lo, hi, ok
}
