package dual

import (
	"math"

	"nightwright/scheduler/model"
)

// gatherSet bounds the worth of a whole set by the bin of its first step:
// each later step may start anywhere within its tolerance after the one
// before.
func (o *Oracle) gatherSet(sc *scratch, wi int, w *model.Want, t int32, n int, floor float64) {
	base, size, ok := o.setWorth(sc, wi, w, t, n)
	if !ok {
		return
	}
	for i := range size {
		b := &sc.step[0][i]
		bin := int32(base + i)
		if b.worth > floor && b.worth > sc.worth[bin] {
			sc.keep(bin, b.worth, t, int32(n), b.at)
		}
	}
}

// setWorth leaves in sc.step[j] the bound of steps j.. by the start bin of step j.
func (o *Oracle) setWorth(sc *scratch, wi int, w *model.Want, t int32, n int) (base, size int, ok bool) {
	open := o.p.OpenOuter(int(t), n)
	base = int(floorDiv(open[0].From, o.bin) - o.firstBin)
	size = int(floorDiv(open[len(open)-1].To, o.bin)-o.firstBin) - base + 1
	for len(sc.step) < len(w.Steps) {
		sc.step = append(sc.step, nil)
	}
	for j := range w.Steps {
		if cap(sc.step[j]) < size {
			sc.step[j] = make([]binBest, size+64)
		}
		row := sc.step[j][:size]
		for i := range row {
			row[i] = binBest{math.Inf(-1), 0}
		}
		sc.step[j] = row
		any := false
		o.scan(sc, wi, w, j, t, n, o.stepValue(w, j, t), func(s int64, bin int32, worth float64) {
			if i := int(bin) - base; i >= 0 && i < size && worth > row[i].worth {
				row[i] = binBest{worth, s}
				any = true
			}
		})
		if !any {
			return base, size, false
		}
	}
	o.joinSteps(sc, w, size)
	return base, size, true
}

// joinSteps adds to each step's bins the best that the steps after it can
// reach from there.
func (o *Oracle) joinSteps(sc *scratch, w *model.Want, size int) {
	for j := len(w.Steps) - 2; j >= 0; j-- {
		st := &w.Steps[j+1]
		lo := int(floorDiv(st.After-st.Tolerance, o.bin))
		hi := int(floorDiv(st.After+st.Tolerance, o.bin)) + 1
		row, next := sc.step[j], sc.step[j+1]
		for i := range row {
			best := math.Inf(-1)
			for m := max(0, i+lo); m <= min(size-1, i+hi); m++ {
				best = math.Max(best, next[m].worth)
			}
			row[i].worth += best
		}
	}
}
