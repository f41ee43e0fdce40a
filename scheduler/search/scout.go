package search

import (
	"sort"

	"nightwright/scheduler/model"
)

// combo is a whole set on one telescope-night: a spot for each step.
type combo struct{ spots []spot }

// scout looks through nights for spots of a want. Scouts work side by side on
// a state that stands still.
type scout struct {
	find   finder
	steps  [][]spot // of sets: spots by step
	spots  []spot
	combos []combo
}

// look adds what one telescope-night has to offer.
func (sc *scout) look(w *model.Want, t int32, n int, least float64) {
	sc.find.spots = sc.find.spots[:0]
	if len(w.Steps) == 1 {
		sc.find.find(w, 0, t, n, least)
		sc.spots = append(sc.spots, sc.find.spots...)
		return
	}
	from := len(sc.combos)
	sc.lookSet(w, t, n, least)
	for i := from; i < len(sc.combos); i++ {
		parts := sc.combos[i].spots
		sp := parts[0]
		sp.profit = 0
		for _, x := range parts {
			sp.profit += x.profit
		}
		sp.combo = int32(i)
		sc.spots = append(sc.spots, sp)
	}
}

// lookSet combines spots of the steps of a set.
func (sc *scout) lookSet(w *model.Want, t int32, n int, least float64) {
	s := sc.find.s
	k := len(w.Steps)
	for len(sc.steps) < k {
		sc.steps = append(sc.steps, nil)
	}
	class := s.p.Scopes[t].Class
	most := func(i int) float64 {
		st := &w.Steps[i]
		return w.Value/float64(k)*s.p.Shelf.Top(class, n, st.Row) + max(0, s.rates[w.Program]*model.Sec(s.p.Length(st, t)))
	}
	total := 0.0
	for i := range w.Steps {
		total += most(i)
	}
	if total <= least {
		return
	}
	for i := range w.Steps {
		sc.find.spots = sc.find.spots[:0]
		sc.find.find(w, i, t, n, least-(total-most(i)))
		sc.steps[i] = append(sc.steps[i][:0], sc.find.spots...)
		if len(sc.steps[i]) == 0 {
			return
		}
	}
	for _, first := range sc.steps[0] {
		if c, ok := sc.chain(w, first, least); ok {
			sc.combos = append(sc.combos, combo{c})
		}
	}
}

// chain extends a first step greedily: for each later step the best spot
// within half its tolerance, the other half being for shifts. It reports
// false when a step has none or the set isn't worth more than least.
func (sc *scout) chain(w *model.Want, first spot, least float64) ([]spot, bool) {
	var buf [8]int32
	picks := buf[:0]
	profit, at := first.profit, first.start
	for j := 1; j < len(w.Steps); j++ {
		st := &w.Steps[j]
		lo, hi := at+st.After-st.Tolerance/2, at+st.After+st.Tolerance/2
		row := sc.steps[j] // by start
		best := int32(-1)
		for i := sort.Search(len(row), func(k int) bool { return row[k].start >= lo }); i < len(row) && row[i].start <= hi; i++ {
			if best < 0 || row[i].profit > row[best].profit {
				best = int32(i)
			}
		}
		if best < 0 {
			return nil, false
		}
		picks = append(picks, best)
		profit += row[best].profit
		at = row[best].start
	}
	if profit <= least {
		return nil, false
	}
	out := make([]spot, 1, len(w.Steps))
	out[0] = first
	for j, i := range picks {
		out = append(out, sc.steps[j+1][i])
	}
	return out, true
}
