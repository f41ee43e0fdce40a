package dual

import (
	"math"

	"nightwright/scheduler/model"
)

// fillSet leaves in sc.row the worth of whole sets by their first start: each
// later step at its best start within the tolerance.
func (sc *softScratch) fillSet(o *Oracle, wi int, w *model.Want, t int32, n int) (from, to int, top float64) {
	k := len(w.Steps)
	for len(sc.rows) < k {
		sc.rows = append(sc.rows, nil)
		sc.best = append(sc.best, nil)
	}
	night := o.soft[int(t)*o.p.Nights+n]
	var fromNext, toNext int
	for j := k - 1; j >= 0; j-- {
		row, a, b, _ := sc.fillRow(o, wi, w, j, t, n, sc.rows[j])
		sc.rows[j] = row
		if a >= b {
			return 0, 0, math.Inf(-1)
		}
		if j < k-1 {
			sc.best[j] = grow(sc.best[j], len(row))
			joinRows(&w.Steps[j+1], night[o.shapeOf[o.kinds[wi][j]][t]].at, night[o.shapeOf[o.kinds[wi][j+1]][t]].at,
				row, sc.rows[j+1], sc.best[j], a, b, fromNext, toNext)
		}
		fromNext, toNext = a, b
	}
	top = math.Inf(-1)
	sc.row = append(sc.row[:0], sc.rows[0]...)
	for i := fromNext; i < toNext; i++ {
		top = math.Max(top, sc.row[i])
	}
	return fromNext, toNext, top
}

// joinRows adds to row[from:to] the best of next[nf:nt] that the step's
// tolerance allows after it, and notes which it is.
func joinRows(st *model.Step, at, atNext []int64, row, next []float64, best []int32, from, to, nf, nt int) {
	lo := nf
	for i := from; i < to; i++ {
		first, last := at[i]+st.After-st.Tolerance, at[i]+st.After+st.Tolerance
		for lo < nt && atNext[lo] < first {
			lo++
		}
		most, which := math.Inf(-1), int32(-1)
		for k := lo; k < nt && atNext[k] <= last; k++ {
			if next[k] > most {
				most, which = next[k], int32(k)
			}
		}
		best[i] = which
		row[i] += most
	}
}

// loadSet adds a piece of sets to the load.
func (sc *softScratch) loadSet(o *Oracle, ld *softLoad, wi int, w *model.Want, pc *piece, prob, tau float64) {
	from, _, _ := sc.fillSet(o, wi, w, pc.scope, int(pc.night))
	if from > pc.first {
		return
	}
	night := int(pc.scope)*o.p.Nights + int(pc.night)
	var busy float64
	for j := range w.Steps {
		sh := o.shapes[pc.scope][o.shapeOf[o.kinds[wi][j]][pc.scope]]
		busy += model.Sec(sh.busy)
		ld.time[w.Program] += prob * model.Sec(sh.length)
	}
	ld.night[night] += prob * math.Max(1-prob, leastYield) / tau * busy * busy
	for k, x := range sc.weight[pc.from:pc.to] {
		p := prob * x
		if p < 1e-6 {
			continue
		}
		i := int32(pc.first + k)
		for j := range w.Steps {
			at := o.soft[night][o.shapeOf[o.kinds[wi][j]][pc.scope]].first + int(i)
			ld.mass[at] += float32(p)
			ld.give[at] += float32(p * math.Max(1-p, leastYield) / tau)
			if j+1 < len(w.Steps) {
				if i = sc.best[j][i]; i < 0 {
					break
				}
			}
		}
	}
}
