package dual

import (
	"math"

	"nightwright/scheduler/model"
)

// Sets are joined on bins of their own, finer than the network's, for a
// tolerance must be widened by up to two bins: about setBin wide, a whole part of
// the network's bin.
const setBin = 75 * model.Micro

// setWidth returns the width of the bins in which the steps of sets are joined.
func (o *Oracle) setWidth() int64 {
	for n := o.bin / setBin; n > 1; n-- {
		if o.bin%n == 0 {
			return o.bin / n
		}
	}
	return o.bin
}

// gatherSet bounds the worth of a whole set by the bin of its first step:
// each later step may start anywhere within its tolerance after the one
// before.
func (o *Oracle) gatherSet(sc *scratch, wi int, w *model.Want, t int32, n int, floor float64) {
	width := o.setWidth()
	base, size, ok := o.setWorth(sc, wi, w, t, n, width)
	if !ok {
		return
	}
	for i := range size {
		b := &sc.step[0][i]
		if b.worth <= floor {
			continue
		}
		bin := int32(floorDiv((base+int64(i))*width, o.bin) - o.firstBin)
		if bin >= 0 && int(bin) < o.bins && b.worth > sc.worth[bin] {
			sc.keep(bin, b.worth, t, int32(n), b.at)
		}
	}
}

// setWorth leaves in sc.step[j] the bound of steps j.. by the start bin of step
// j, in bins of the given width from number base since 1970.
func (o *Oracle) setWorth(sc *scratch, wi int, w *model.Want, t int32, n int, width int64) (base int64, size int, ok bool) {
	open := o.p.OpenOuter(int(t), n)
	base = floorDiv(open[0].From, width)
	size = int(floorDiv(open[len(open)-1].To, width)-base) + 1
	for len(sc.step) < len(w.Steps) {
		sc.step = append(sc.step, nil)
	}
	for j := range w.Steps {
		row := grow(sc.step[j], size)
		for i := range row {
			row[i] = binBest{math.Inf(-1), 0}
		}
		sc.step[j] = row
		any := false
		var at int64
		var before float64
		o.scan(sc, wi, w, j, t, n, o.stepValue(w, j, t), func(s int64, _ int32, worth float64, first bool) {
			if first {
				at, before = s, worth
			}
			if fill(row, base, width, at, s, before, worth) {
				any = true
			}
			at, before = s, worth
		})
		if !any {
			return base, size, false
		}
	}
	sc.joinSteps(w, size, width)
	return base, size, true
}

// fill raises the bins to the line from worth v1 at start s1 to v2 at s2, and
// reports whether it holds any start. Where one end is -Inf there is nothing
// between: no start of that cell reaches the least quality.
func fill(row []binBest, base, width, s1, s2 int64, v1, v2 float64) bool {
	raise := func(s int64, v float64) {
		if i := floorDiv(s, width) - base; i >= 0 && i < int64(len(row)) && v > row[i].worth {
			row[i] = binBest{v, s}
		}
	}
	raise(s1, v1)
	raise(s2, v2)
	if math.IsInf(v1, -1) || math.IsInf(v2, -1) {
		return !math.IsInf(v1, -1) || !math.IsInf(v2, -1)
	}
	for i := floorDiv(s1, width); i < floorDiv(s2, width); i++ {
		// The edge between bins i and i + 1 counts for both.
		edge := (i + 1) * width
		v := v1 + (v2-v1)*float64(edge-s1)/float64(s2-s1)
		raise(edge, v)
		if k := i - base; k >= 0 && k < int64(len(row)) && v > row[k].worth {
			row[k] = binBest{v, edge - 1}
		}
	}
	return true
}

// joinSteps adds to each step's bins the best that the steps after it can
// reach from there: a running maximum over the bins its tolerance touches.
func (sc *scratch) joinSteps(w *model.Want, size int, width int64) {
	for j := len(w.Steps) - 2; j >= 0; j-- {
		st := &w.Steps[j+1]
		lo := int(floorDiv(st.After-st.Tolerance, width))
		hi := int(floorDiv(st.After+st.Tolerance, width)) + 1
		row, next := sc.step[j], sc.step[j+1]
		queue := sc.queue[:0] // bins of next in the window, worths falling
		head, in := 0, max(0, lo)
		for i := range row {
			for ; in <= min(size-1, i+hi); in++ {
				for len(queue) > head && next[queue[len(queue)-1]].worth <= next[in].worth {
					queue = queue[:len(queue)-1]
				}
				queue = append(queue, int32(in))
			}
			for head < len(queue) && int(queue[head]) < i+lo {
				head++
			}
			best := math.Inf(-1)
			if head < len(queue) {
				best = next[queue[head]].worth
			}
			row[i].worth += best
		}
		sc.queue = queue
	}
}
