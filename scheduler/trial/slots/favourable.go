package slots

import (
	"math"

	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// sampleStep is the time between two instants at which the quality in a cell
// is worked out, us.
const sampleStep = 60 * model.Micro

// Favourable builds the programme that every legal plan is a solution of.
// cell is the cells' width, s.
func Favourable(p *model.Problem, exact *visibility.Exact, cell float64, shares []Share) *Program {
	a := &ask{p: p, grid: model.MicroOf(cell), spread: model.MicroOf(cell), shares: shares, out: &Program{}}
	sky := &skyline{p, exact, map[spot]lit{}}
	for wi := range p.Wants {
		w := &p.Wants[wi]
		for _, t := range w.Scopes {
			for n := range p.Nights {
				steps := make([][]choice, len(w.Steps))
				for k := range steps {
					steps[k] = a.inCells(sky, w, k, t, n)
				}
				a.join(wi, t, n, p.Scopes[t].LeastGap, steps, nil, 0)
			}
		}
	}
	a.finish()
	return a.out
}

// inCells lists the cells in which a step may begin, with a bound on the
// quality it can have there.
func (a *ask) inCells(sky *skyline, w *model.Want, step int, t int32, n int) []choice {
	p := a.p
	length := p.Length(&w.Steps[step], t)
	best := map[int64]float64{}
	var order []int64
	for _, win := range p.Outer(nil, w.Unit, p.Scopes[t].Class, n) {
		for _, o := range p.OpenOuter(int(t), n) {
			lo, hi := max(win.From, o.From), min(win.To, o.To)-length
			if hi < lo {
				continue
			}
			for c := lo / a.grid * a.grid; c <= hi; c += a.grid {
				q := a.most(sky, w, step, t, max(lo, c)+length/2, min(hi, c+a.grid)+length/2)
				if q < w.MinQuality {
					continue
				}
				if old, ok := best[c]; !ok {
					order = append(order, c)
					best[c] = q
				} else {
					best[c] = math.Max(old, q)
				}
			}
		}
	}
	var out []choice
	for _, c := range order {
		out = append(out, choice{c, best[c]})
	}
	return out
}

// most bounds the quality over the middles from one instant to another: the
// greatest of samples a minute apart, and what it may rise between two of them.
//
// Where the Moon stays up or down, quality bends by less than 2e-8 a second
// squared at the altitudes that the surveys here allow, so it rises over two
// samples by less than h^2/8 times that, 9e-6. Where the Moon rises or sets it
// jumps, and on either side of the jump it changes by less than 2e-4 a second (airmass at
// 20 deg changes by 6e-4 a second, which takes 8e-5; from memory, on the airmass'
// derivative).
func (a *ask) most(sky *skyline, w *model.Want, step int, t int32, from, to int64) float64 {
	first := from / sampleStep
	last := (to + sampleStep - 1) / sampleStep
	top, before, upBefore := 0.0, 0.0, false
	for k := first; k <= last; k++ {
		q, up := sky.at(w.Field, w.Steps[step].Filter, a.p.Scopes[t].Site, k*sampleStep)
		top = math.Max(top, q)
		if k > first && up != upBefore {
			top = math.Max(top, math.Max(q, before)+0.012)
		}
		before, upBefore = q, up
	}
	return math.Min(1, top+1e-5)
}
