package search

import (
	"cmp"
	"math"
	"slices"

	"nightwright/scheduler/model"
)

// choose picks from the spots (sorted by start) the set of at most n visits
// with the most profit that honours the want's gap and per-night limit, also
// against the fixed starts. It appends to out the indices of the picked
// spots, ascending, and returns the multiplier of the count: what one visit
// more would have added at most.
type chooser struct {
	f    []float64
	cnt  []int32
	take []bool
	prev []int32
}

func sortSpots(spots []spot) {
	slices.SortFunc(spots, func(a, b spot) int {
		return cmp.Or(cmp.Compare(a.start, b.start), cmp.Compare(b.profit, a.profit),
			cmp.Compare(a.scope, b.scope), cmp.Compare(a.eject[0], b.eject[0]))
	})
}

func (c *chooser) choose(w *model.Want, spots []spot, n int, out []int) (picked []int, mu float64) {
	if n <= 0 || len(spots) == 0 {
		return out, 0
	}
	mu = c.multiplier(w, spots, n)
	from := len(out)
	for i := len(spots); i > 0; {
		if !c.take[i] {
			i--
			continue
		}
		out = append(out, i-1)
		i = int(c.prev[i])
	}
	picked = dropWorst(spots, out, from, n)
	slices.Sort(picked[from:])
	picked = perNight(w, spots, picked, from)
	return picked, mu
}

// cadenceEase is added to a gap where visits are chosen, us, so that each can
// still be shifted by half of it.
const cadenceEase = 20 * model.Micro

// multiplier solves with the least count multiplier at which about n visits
// are taken, by the secant of the convex value, and leaves that solution (n
// or a few more visits) in place.
func (c *chooser) multiplier(w *model.Want, spots []spot, n int) float64 {
	lo := 0.0
	flo, klo := c.solve(w, spots, lo)
	if klo <= n {
		return 0
	}
	hi := 0.0
	for i := range spots {
		hi = math.Max(hi, spots[i].profit)
	}
	fhi, khi := 0.0, 0
	for range 30 {
		x := (flo + float64(klo)*lo - fhi - float64(khi)*hi) / float64(klo-khi)
		if !(x > lo && x < hi) {
			break
		}
		f, k := c.solve(w, spots, x)
		if k == n {
			return x
		}
		if k > n {
			if k == klo {
				lo, flo = x, f
				break
			}
			lo, flo, klo = x, f, k
		} else {
			if k == khi {
				break
			}
			hi, fhi, khi = x, f, k
		}
	}
	c.solve(w, spots, lo)
	return lo
}

// solve is the weighted interval programme for one multiplier.
func (c *chooser) solve(w *model.Want, spots []spot, mu float64) (float64, int) {
	m := len(spots)
	c.f, c.cnt = grow(c.f, m+1), grow(c.cnt, m+1)
	c.take, c.prev = grow(c.take, m+1), grow(c.prev, m+1)
	c.f[0], c.cnt[0] = 0, 0
	p := 0
	gap := w.Spacing
	if gap > 0 {
		gap += cadenceEase
	}
	for i := range spots {
		for p < i && spots[i].start-spots[p].start >= gap {
			p++
		}
		if w.Spacing == 0 {
			p = i
		}
		v := spots[i].profit - mu + c.f[p]
		c.take[i+1] = v > c.f[i]
		c.prev[i+1] = int32(p)
		if c.take[i+1] {
			c.f[i+1], c.cnt[i+1] = v, c.cnt[p]+1
		} else {
			c.f[i+1], c.cnt[i+1] = c.f[i], c.cnt[i]
		}
	}
	return c.f[m], int(c.cnt[m])
}

// dropWorst leaves the n most profitable picks.
func dropWorst(spots []spot, picks []int, from, n int) []int {
	if len(picks)-from <= n {
		return picks
	}
	slices.SortFunc(picks[from:], func(a, b int) int {
		return cmp.Or(cmp.Compare(spots[b].profit, spots[a].profit), cmp.Compare(a, b))
	})
	return picks[:from+n]
}

// perNight drops the least profitable picks beyond the limit of a label.
func perNight(w *model.Want, spots []spot, picks []int, from int) []int {
	if w.PerNight == 0 {
		return picks
	}
	keep := picks[from:]
	slices.SortFunc(keep, func(a, b int) int {
		return cmp.Or(cmp.Compare(spots[a].night, spots[b].night),
			cmp.Compare(spots[b].profit, spots[a].profit), cmp.Compare(a, b))
	})
	out := picks[:from]
	run := int32(0)
	for i, k := range keep {
		if i > 0 && spots[k].night == spots[keep[i-1]].night {
			run++
		} else {
			run = 0
		}
		if run < w.PerNight {
			out = append(out, k)
		}
	}
	slices.Sort(out[from:])
	return out
}
