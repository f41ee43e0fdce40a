package dual

import "nightwright/scheduler/model"

// Expect scales the capacity of all priced time by the mean part of it that
// can be used: usable of a telescope and a stretch [from, to), us. It must be
// called before the first level.
//
// Why the ceiling then bounds a mean. Let the sky of a season be w, and let a
// way of acting get C(w) in it, which is the coverage of a legal plan in the
// time that w leaves usable. For every price lambda >= 0 the relaxation bounds
// it: C(w) <= sum of usable time x lambda + sum over fields of the best
// that their wants could earn, the latter under a clear sky at most. Only the
// first sum depends on w, and linearly, so that E C <= sum of E(usable time)
// x lambda + the same (Jensen's inequality for the concave value of
// capacity; Gallego & van Ryzin 1997). It holds for problems without keep_free,
// whose budgets would have to be scaled too.
func (a *Ascent) Expect(usable func(scope int, from, to int64) float64) {
	pr := a.prices
	clear(pr.capacity)
	for i := range pr.nights {
		pn := &pr.nights[i]
		for k, open := range pn.open {
			if open {
				from, to := pn.knots[k], pn.knots[k+1]
				pr.capacity[pn.slots[k]] += model.Sec(to-from) * usable(i/pr.p.Nights, from, to)
			}
		}
	}
}
