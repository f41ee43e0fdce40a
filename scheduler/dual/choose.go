package dual

import (
	"math"
	"slices"

	"nightwright/scheduler/model"
)

// best bounds what want wi earns with at most its wanted visits: it returns
// the bound and the picks that reach it (for the load), and leaves the count
// multiplier in Mu. The scratch must be clean and is left clean.
//
// Only bins worth more than floor are gathered; the multiplier is then never
// taken below floor, which keeps the bound valid (any mu >= 0 gives one).
func (o *Oracle) best(sc *scratch, wi int, picks []pick) (float64, []pick) {
	w := &o.p.Wants[wi]
	if w.Visits == 0 || len(w.Scopes) == 0 {
		return 0, picks
	}
	from := len(picks)
	best := math.Inf(1)
	for floor := 0.9 * math.Max(0, o.Mu[wi]); ; floor *= 0.6 {
		if floor < 1e-3*w.Value {
			floor = 0
		}
		var bound float64
		bound, picks = o.above(sc, wi, floor, picks[:from])
		best = math.Min(best, bound)
		// Fewer visits than wanted above the floor: look further down.
		if floor == 0 || o.Mu[wi] > floor {
			return best, picks
		}
	}
}

// above solves a want over the starts worth more than floor.
func (o *Oracle) above(sc *scratch, wi int, floor float64, picks []pick) (bound float64, _ []pick) {
	w := &o.p.Wants[wi]
	o.gather(sc, wi, floor)
	o.sortBins(sc)
	switch {
	case w.PerNight > 0 && w.GapMin < 12*3600*model.Micro:
		bound, picks = o.perNight(sc, wi, w, floor, picks)
	case leastSpacing(w) < o.bin:
		bound, picks = o.repeated(sc, wi, w, floor, picks)
	default:
		bound, picks = o.spaced(sc, wi, w, floor, picks)
	}
	o.clean(sc)
	return bound, picks
}

// field bounds what the wants of a field earn together, finish bonus and all:
// either some visit is missing, and each want earns its best of at most its
// visits, or none is, and each earns its best of exactly its visits, plus the
// bonus. The second sum only counts when it loses less than the bonus to the
// first, so multipliers down to -bonus are enough; every multiplier's bound
// is valid: n mu + f(mu) for any real mu when exactly n are taken.
func (o *Oracle) field(sc *scratch, f int, chosen func(wi int, picks []pick)) float64 {
	from, to := int(o.p.FieldWant[f]), int(o.p.FieldWant[f+1])
	bonus := o.p.Bonus(f)
	var sum, full float64
	for wi := from; wi < to; wi++ {
		var b float64
		b, sc.picks = o.best(sc, wi, sc.picks[:0])
		sum += b
		w := &o.p.Wants[wi]
		if w.Visits == 0 {
			// All are given: nothing to gain, nothing in the bonus' way.
		} else if bonus > 0 && len(w.Scopes) == 0 {
			full = math.Inf(-1)
		} else if bonus > 0 && o.Mu[wi] > 0 {
			full += b // at a positive multiplier all visits are got already
		} else if bonus > 0 {
			mu := o.Mu[wi]
			for _, floor := range []float64{-bonus, -bonus / float64(w.Visits)} {
				var c float64
				c, sc.picks = o.above(sc, wi, floor, sc.picks[:0])
				b = math.Min(b, c)
			}
			o.Mu[wi] = mu
			full += b
		}
		chosen(wi, sc.picks)
	}
	if bonus > 0 && full+bonus > sum {
		return full + bonus
	}
	return sum
}

// sortBins leaves the touched bins, ascending, in sc.order.
func (o *Oracle) sortBins(sc *scratch) {
	sc.order = sc.order[:0]
	for d := range sc.mark {
		if !sc.mark[d] {
			continue
		}
		sc.mark[d] = false
		for b := d * dayBlock; b < min((d+1)*dayBlock, o.bins); b++ {
			if !math.IsInf(sc.worth[b], -1) {
				sc.order = append(sc.order, int32(b))
			}
		}
	}
}

func (o *Oracle) clean(sc *scratch) {
	for _, b := range sc.dirty {
		sc.worth[b] = math.Inf(-1)
	}
	sc.dirty = sc.dirty[:0]
}

// spaced solves the common case: at most n visits with a gap of at least a bin.
func (o *Oracle) spaced(sc *scratch, wi int, w *model.Want, floor float64, picks []pick) (float64, []pick) {
	gap := int32(min(floorDiv(leastSpacing(w), o.bin), int64(o.bins)))
	n := int(w.Visits)
	solve := func(mu float64) (float64, int) { return sc.interval(gap, mu) }
	mu, full, bound := multiplier(solve, n, floor, o.Mu[wi])
	o.Mu[wi] = mu
	// Where worths tie, the count jumps over n at mu: trace the larger set
	// and keep its best.
	sc.interval(gap, full)
	picks = o.trace(sc, n, picks)
	return bound, picks
}

// leastSpacing is a want's gap before the problem rounded it up to a
// millisecond, or a little less.
func leastSpacing(w *model.Want) int64 { return max(0, w.GapMin-999) }

// interval is the weighted interval programme over the gathered bins for one
// multiplier: the best sum of (worth - mu) and the number of visits in it.
func (sc *scratch) interval(gap int32, mu float64) (float64, int) {
	m := len(sc.order)
	if cap(sc.f) < m+1 {
		sc.f = make([]float64, m+1024)
		sc.n = make([]int32, m+1024)
		sc.take = make([]bool, m+1024)
		sc.prev = make([]int32, m+1024)
	}
	f, n, take, prev := sc.f[:m+1], sc.n[:m+1], sc.take[:m+1], sc.prev[:m+1]
	f[0], n[0] = 0, 0
	p := 0 // f[p]: best over order[:p], all at least gap before
	for i, b := range sc.order {
		for p < i && b-sc.order[p] >= gap {
			p++
		}
		v := sc.worth[b] - mu + f[p]
		take[i+1] = v > f[i]
		prev[i+1] = int32(p)
		if take[i+1] {
			f[i+1], n[i+1] = v, n[p]+1
		} else {
			f[i+1], n[i+1] = f[i], n[i]
		}
	}
	return f[m], int(n[m])
}

// trace lists the visits of the last programme, at most n (the best ones).
func (o *Oracle) trace(sc *scratch, n int, picks []pick) []pick {
	from := len(picks)
	for i := len(sc.order); i > 0; {
		if !sc.take[i] {
			i--
			continue
		}
		b := sc.order[i-1]
		picks = append(picks, pick{bin: b, scope: sc.scope[b], night: sc.night[b], worth: sc.worth[b], at: sc.at[b]})
		i = int(sc.prev[i])
	}
	return keepBest(picks, from, n)
}

// keepBest drops the least worthy picks beyond n.
func keepBest(picks []pick, from, n int) []pick {
	if len(picks)-from <= n {
		return picks
	}
	slices.SortFunc(picks[from:], func(a, b pick) int {
		if a.worth != b.worth {
			if a.worth > b.worth {
				return -1
			}
			return 1
		}
		return int(a.bin - b.bin)
	})
	return picks[:from+n]
}

// multiplier finds a mu >= floor at which the programme takes about n visits
// and returns it with the least bound n mu + f(mu) seen. The bound is valid
// for every mu, so the search may stop anywhere. full is a multiplier at which
// the programme takes at least n visits, or as many as it can.
func multiplier(solve func(float64) (float64, int), n int, floor, guess float64) (mu, full, bound float64) {
	lo := floor
	f, c := solve(lo)
	mu, bound = lo, float64(n)*lo+f
	if c <= n {
		return mu, mu, bound
	}
	flo, clo := f, c
	// Secant on the concave best value: the tangents at lo and hi meet where
	// the next trial is.
	hi := math.Max(guess, lo)
	f, c = solve(hi)
	for c > n {
		lo, flo, clo = hi, f, c
		hi = 1.3*hi + 1e-15
		f, c = solve(hi)
	}
	fhi, chi := f, c
	if b := float64(n)*hi + f; b < bound {
		mu, bound = hi, b
	}
	for range 8 {
		if clo == chi {
			break
		}
		// f is convex in mu with slope -count; the tangents meet at x.
		x := (flo + float64(clo)*lo - fhi - float64(chi)*hi) / float64(clo-chi)
		if !(x > lo && x < hi) {
			break
		}
		f, c = solve(x)
		if b := float64(n)*x + f; b < bound {
			mu, bound = x, b
		}
		if c == n {
			lo = x
			break
		}
		if c > n {
			if c == clo {
				break
			}
			lo, flo, clo = x, f, c
		} else {
			if c == chi {
				break
			}
			hi, fhi, chi = x, f, c
		}
	}
	return mu, lo, bound
}

// repeated solves gaps shorter than a bin: a bin can hold several visits, as
// many as fit its width (any number without a gap).
func (o *Oracle) repeated(sc *scratch, wi int, w *model.Want, floor float64, picks []pick) (float64, []pick) {
	n := int(w.Visits)
	per := n
	if w.GapMin > 0 {
		per = min(n, int(o.bin/max(1, leastSpacing(w)))+1)
	}
	type cell struct {
		worth float64
		bin   int32
	}
	cells := make([]cell, len(sc.order))
	for i, b := range sc.order {
		cells[i] = cell{sc.worth[b], b}
	}
	slices.SortFunc(cells, func(a, b cell) int {
		if a.worth != b.worth {
			if a.worth > b.worth {
				return -1
			}
			return 1
		}
		return int(a.bin - b.bin)
	})
	var bound float64
	left, mu := n, floor
	for _, c := range cells {
		if left == 0 || c.worth <= floor {
			break
		}
		k := min(per, left)
		bound += float64(k) * c.worth
		left -= k
		mu = math.Max(floor, c.worth)
		for range k {
			picks = append(picks, pick{bin: c.bin, scope: sc.scope[c.bin], night: sc.night[c.bin], worth: c.worth, at: sc.at[c.bin]})
		}
	}
	// Visits worth less than the floor were not gathered.
	bound += float64(left) * floor
	if left > 0 {
		mu = floor
	}
	o.Mu[wi] = mu
	return bound, picks
}

// perNight bounds demands limited by night label and not by a long gap: at
// most PerNight visits of each label, gaps left out.
func (o *Oracle) perNight(sc *scratch, wi int, w *model.Want, floor float64, picks []pick) (float64, []pick) {
	// The bins' maxima over telescopes mix labels; the greatest worth a label
	// can have is bounded by that of any bin it touches.
	best := make([]float64, o.p.Nights)
	bin := make([]int32, o.p.Nights)
	for n := range best {
		best[n] = floor
		bin[n] = -1
	}
	for _, b := range sc.order {
		for n := o.labelFrom(b); n <= o.labelTo(b); n++ {
			if sc.worth[b] > best[n] {
				best[n], bin[n] = sc.worth[b], b
			}
		}
	}
	var bound float64
	left := int(w.Visits)
	order := make([]int, o.p.Nights)
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case best[a] > best[b]:
			return -1
		case best[a] < best[b]:
			return 1
		}
		return a - b
	})
	mu := floor
	for _, n := range order {
		if left == 0 || best[n] <= floor {
			break
		}
		k := min(left, int(w.PerNight))
		bound += float64(k) * best[n]
		left -= k
		mu = math.Max(floor, best[n])
		for range k {
			b := bin[n]
			picks = append(picks, pick{bin: b, scope: sc.scope[b], night: sc.night[b], worth: best[n], at: sc.at[b]})
		}
	}
	// Visits worth less than the floor were not gathered.
	bound += float64(left) * floor
	o.Mu[wi] = mu
	return bound, picks
}

// labelFrom and labelTo bound the night labels that a bin's starts can carry
// at any site: a night D begins within a day of 00:00 UTC of D.
func (o *Oracle) labelFrom(bin int32) int { return max(0, o.dayOf(bin)-2) }
func (o *Oracle) labelTo(bin int32) int   { return min(o.p.Nights-1, o.dayOf(bin)+1) }

func (o *Oracle) dayOf(bin int32) int {
	us := (o.firstBin + int64(bin)) * o.bin
	return int(floorDiv(us, 86400*model.Micro)) - int(o.p.Survey.FirstNight)
}
