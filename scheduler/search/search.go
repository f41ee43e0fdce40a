// Package search fills the telescopes' nights: construction from an empty
// season and sweeps, both by one routine that takes a field's visits out and
// puts them back where they are worth most.
package search

import (
	"cmp"
	"context"
	"math/rand/v2"
	"slices"

	"nightwright/scheduler/model"
)

// Search holds one search's state.
type Search struct {
	p  *model.Problem
	s  *state
	pl *placer
	rg *rand.Rand
}

// New starts from an empty plan. mu are the wants' count multipliers of the
// relaxation: what each want's last visit is worth.
func New(p *model.Problem, price pricer, mu []float64, seed uint64) *Search {
	s := newState(p, price)
	s.occupy(p.Busy)
	return &Search{p: p, s: s, pl: newPlacer(s, mu), rg: rand.New(rand.NewPCG(seed, 1))}
}

// Coverage returns the plan's coverage by the search's own count.
func (x *Search) Coverage() float64 { return x.p.Earned + float64(x.s.score)/scoreUnit }

// Stats returns the counters.
func (x *Search) Stats() *Stats { return &x.s.stats }

// Construct places every field once, most valuable time first, with the price
// of time weighed by theta.
func (x *Search) Construct(ctx context.Context, theta float64, report func(done, of int)) {
	x.run(ctx, x.byWorth(), theta, report)
}

// byWorth lists the fields by the value of a second of their visits, most first.
func (x *Search) byWorth() []int {
	n := len(x.p.FieldWant) - 1
	order := make([]int, n)
	worth := make([]float64, n)
	for f := range n {
		order[f] = f
		var value, time float64
		for wi := x.p.FieldWant[f]; wi < x.p.FieldWant[f+1]; wi++ {
			w := &x.p.Wants[wi]
			if len(w.Scopes) == 0 {
				continue
			}
			value += float64(w.Visits) * w.Value
			for k := range w.Steps {
				t := w.Scopes[0]
				time += float64(w.Visits) * model.Sec(x.p.Length(&w.Steps[k], t)+x.p.Scopes[t].LeastGap)
			}
		}
		if time > 0 {
			worth[f] = value / time
		}
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(worth[b], worth[a]) })
	return order
}

// Sweep places every field again in random order.
func (x *Search) Sweep(ctx context.Context, theta float64, report func(done, of int)) {
	order := make([]int, len(x.p.FieldWant)-1)
	for i := range order {
		order[i] = i
	}
	x.rg.Shuffle(len(order), func(i, j int) { order[i], order[j] = order[j], order[i] })
	x.run(ctx, order, theta, report)
	x.s.stats.Sweeps++
}

func (x *Search) run(ctx context.Context, order []int, theta float64, report func(done, of int)) {
	x.s.theta = theta
	for i, f := range order {
		if i%64 == 0 {
			if ctx.Err() != nil {
				return
			}
			if report != nil {
				report(i, len(order))
			}
		}
		x.pl.place(f)
		if invariants {
			x.s.verify()
		}
	}
}

// Plan writes the state out, sorted by start and telescope.
func (x *Search) Plan() *model.Plan {
	var out []model.Exposure
	ids := map[int32]int64{}
	sets := int64(0)
	for i := range x.s.nights {
		for k := range x.s.nights[i].list {
			e := &x.s.nights[i].list[k]
			if x.s.visits[e.visit].fixed {
				continue // given, not planned
			}
			w := &x.p.Wants[e.want]
			ex := model.Exposure{
				Field: w.Field, Demand: w.Demand, Step: int32(e.step), Telescope: int32(i / x.p.Nights),
				Night: int32(i % x.p.Nights), State: model.Planned, Start: e.start, End: e.end(),
			}
			if len(w.Steps) > 1 {
				if ids[e.visit] == 0 {
					sets++
					ids[e.visit] = sets
				}
				ex.Set = ids[e.visit]
			}
			out = append(out, ex)
		}
	}
	return model.NewPlan(out)
}

// Use sums up how the open time is spent, s.
type Use struct{ Exposure, Gap, Idle float64 }

// Use returns how the plan spends the telescopes' open time.
func (x *Search) Use() Use {
	var u Use
	for i := range x.s.nights {
		n := &x.s.nights[i]
		var open, exposure int64
		for _, o := range x.p.Open(i/x.p.Nights, i%x.p.Nights) {
			open += o.To - o.From
		}
		for k := range n.list {
			exposure += n.list[k].length
		}
		u.Exposure += model.Sec(exposure)
		u.Gap += model.Sec(n.used - exposure)
		u.Idle += model.Sec(open - n.used)
	}
	return u
}
