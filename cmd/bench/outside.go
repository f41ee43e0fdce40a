package main

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"time"

	"nightwright/scheduler/model"
	"nightwright/scheduler/trial/slots"
	"nightwright/visibility"
)

// outside compares an outcome with what general solvers find.
type outside struct {
	p     *model.Problem
	exact *visibility.Exact
	out   *model.Outcome
	ask   *ask
}

// means gathers what the seeds of a family gave.
type means struct{ gap, restricted, favourable, ceiling, linear []float64 }

// print prints the means of a family and begins anew.
func (m *means) print(name string) {
	line := func(what string, list []float64, form string) {
		if len(list) < 2 {
			return
		}
		var sum float64
		for _, x := range list {
			sum += x
		}
		fmt.Printf("  %s: mean of %d: %s "+form+", least "+form+", most "+form+"\n", name, len(list), what, sum/float64(len(list)), slices.Min(list), slices.Max(list))
	}
	line("gap %", m.gap, "%.2f")
	line("plan / restricted optimum", m.restricted, "%.4f")
	line("plan / favourable optimum", m.favourable, "%.4f")
	line("ceiling / favourable optimum", m.ceiling, "%.4f")
	line("ceiling / slot model's relaxation", m.linear, "%.4f")
	*m = means{}
}

// solve has each solver try, and returns the first proven optimum.
func (o *outside) solve(what string, pr *slots.Program, seconds int, relaxed bool) (best *slots.Solution, err error) {
	for _, solver := range slots.Solvers() {
		at := time.Now()
		s, err := pr.Solve(context.Background(), solver, seconds, relaxed)
		took := time.Since(at).Seconds()
		switch {
		case errors.Is(err, slots.ErrNotProven):
			fmt.Printf("  %s, %d columns, %d rows: %s has no proven optimum after %.0f s\n", what, pr.Width(), len(pr.Rows), solver, took)
		case err != nil:
			return nil, err
		default:
			fmt.Printf("  %s, %d columns, %d rows: %s %.6f in %.1f s\n", what, pr.Width(), len(pr.Rows), solver, s.Value, took)
			if best == nil {
				best = s
			}
		}
	}
	return best, nil
}

// bracket prints the best plan there is, between a programme of legal plans
// and one that every legal plan is in.
func (o *outside) bracket(seconds int) error {
	shares := slots.Asked(o.p)
	low, err := o.solve("restricted", slots.Restricted(o.p, o.exact, o.ask.grid, shares), seconds, false)
	if err != nil {
		return err
	}
	high, err := o.solve("favourable", slots.Favourable(o.p, o.exact, o.ask.grid, shares), seconds, false)
	if err != nil {
		return err
	}
	points := func(x float64) float64 { return 100 * x / o.out.Ceiling }
	m := &o.ask.means
	if low != nil {
		m.restricted = append(m.restricted, o.out.Coverage/low.Value)
		fmt.Printf("  plan / restricted optimum %.4f; the ceiling is at most %.2f points above the best plan\n",
			o.out.Coverage/low.Value, points(o.out.Ceiling-max(low.Value, o.out.Coverage)))
	}
	if high != nil {
		m.favourable = append(m.favourable, o.out.Coverage/high.Value)
		m.ceiling = append(m.ceiling, o.out.Ceiling/high.Value)
		fmt.Printf("  ceiling / favourable optimum %.4f; the search is at most %.2f points under the best plan\n",
			o.out.Ceiling/high.Value, points(high.Value-o.out.Coverage))
	}
	return nil
}

// relaxation prints the linear relaxation of the slot model beside the ceiling.
func (o *outside) relaxation(seconds int) error {
	s, err := o.solve("slot model, relaxed", slots.Nominal(o.p, o.exact), seconds, true)
	if err != nil || s == nil {
		return err
	}
	o.ask.means.linear = append(o.ask.means.linear, o.out.Ceiling/s.Value)
	fmt.Printf("  ceiling / linear relaxation of the slot model %.4f\n", o.out.Ceiling/s.Value)
	return nil
}
