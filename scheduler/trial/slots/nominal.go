package slots

import (
	"nightwright/constraints"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// Nominal builds the slot model: time is the survey's slots, a visit's first
// exposure has its middle in the middle of a slot and the quality of that
// instant, and takes its exposure and the least gap from the slots it lies
// over, in parts where it straddles them. Each slot of a telescope has its open
// time. It rounds neither for nor against anyone, so its linear relaxation says
// where a ceiling ought to lie, not on which side.
func Nominal(p *model.Problem, exact *visibility.Exact) *Program {
	a := &ask{p: p, grid: model.MicroOf(p.Survey.Slot), out: &Program{}}
	sky := &skyline{p, exact, map[spot]lit{}}
	for wi := range p.Wants {
		w := &p.Wants[wi]
		for _, t := range w.Scopes {
			for n := range p.Nights {
				a.nominal(sky, wi, w, t, n)
			}
		}
	}
	a.capacities()
	a.cadence()
	a.counts()
	return a.out
}

// nominal adds the columns of a want on a telescope in a night. Exposures of a
// set follow at their nominal times.
func (a *ask) nominal(sky *skyline, wi int, w *model.Want, t int32, n int) {
	p := a.p
	first := p.Length(&w.Steps[0], t)
	for _, o := range p.Open(int(t), n) {
		for k := o.From / a.grid; k*a.grid < o.To; k++ {
			at := k*a.grid + a.grid/2 - first/2
			c := Column{Want: int32(wi), Scope: t, Night: int32(n), Starts: []int64{at}}
			sum, s, ok := 0.0, at, true
			for i := range w.Steps {
				s += w.Steps[i].After
				length := p.Length(&w.Steps[i], t)
				if ok = a.inside(w, t, n, s, s+length); !ok {
					break
				}
				q, _ := sky.at(w.Field, w.Steps[i].Filter, p.Scopes[t].Site, s+length/2)
				if ok = q >= w.MinQuality; !ok {
					break
				}
				sum += q
				c.busy = append(c.busy, model.Span{From: s, To: s + length + p.Scopes[t].LeastGap})
				c.Exposure += model.Sec(length)
			}
			if c.Value = w.Value * sum / float64(len(w.Steps)); ok {
				a.out.Columns = append(a.out.Columns, c)
			}
		}
	}
}

// inside reports whether an exposure lies in a window and in open time.
func (a *ask) inside(w *model.Want, t int32, n int, from, to int64) bool {
	in := func(spans []model.Span) bool {
		for _, s := range spans {
			if from >= s.From && to <= s.To {
				return true
			}
		}
		return false
	}
	return in(a.p.Open(int(t), n)) && in(inward(a.p, a.p.Windows.Of(int(w.Unit), int(a.p.Scopes[t].Class), n)))
}

func inward(p *model.Problem, windows []constraints.Window) []model.Span {
	out := make([]model.Span, len(windows))
	for i, w := range windows {
		out[i].From, out[i].To = p.Inward(w)
	}
	return out
}

// capacities bounds the busy time in each slot of a telescope by its open time,
// a least gap at the end of an interval being outside it.
func (a *ask) capacities() {
	type slot struct {
		scope int32
		k     int64
	}
	rows := map[slot][]Term{}
	var order []slot
	for i := range a.out.Columns {
		c := &a.out.Columns[i]
		for _, b := range c.busy {
			for k := b.From / a.grid; k*a.grid < b.To; k++ {
				at := slot{c.Scope, k}
				if rows[at] == nil {
					order = append(order, at)
				}
				s := model.Sec(min(b.To, (k+1)*a.grid) - max(b.From, k*a.grid))
				rows[at] = append(rows[at], Term{i, s})
			}
		}
	}
	for _, at := range order {
		var open int64
		for n := range a.p.Nights {
			for _, o := range a.p.Open(int(at.scope), n) {
				o.To += a.p.Scopes[at.scope].LeastGap
				open += max(0, min(o.To, (at.k+1)*a.grid)-max(o.From, at.k*a.grid))
			}
		}
		a.less(merge(rows[at]), model.Sec(open))
	}
}

// merge adds up the terms of one column.
func merge(terms []Term) []Term {
	var out []Term
	for _, t := range terms {
		if n := len(out); n > 0 && out[n-1].Column == t.Column {
			out[n-1].Factor += t.Factor
			continue
		}
		out = append(out, t)
	}
	return out
}
