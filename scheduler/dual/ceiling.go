package dual

import (
	"context"
	"math"

	"nightwright/scheduler/model"
)

// Ceiling evaluates the relaxation at the current prices in full: for every
// lambda >= 0 (prices), mu >= 0 (count multipliers) and share multipliers,
//
//	L = sum over slots of capacity x price - what keep_free takes back
//	    + sum over fields of the best its wants could earn + share slack
//
// is at least C of every legal plan. width is the start bins' width in
// seconds. The result is rounded up by a relative 1e-9 and an absolute 1e-12,
// far above the float64 error of sums of 1e6 terms below 1.
func (a *Ascent) Ceiling(width float64) float64 {
	return a.CeilingWithin(context.Background(), width)
}

// CeilingWithin is Ceiling, given up when the context ends: it then returns 1,
// which bounds any coverage.
func (a *Ascent) CeilingWithin(ctx context.Context, width float64) float64 {
	a.oracle.Fine(width)
	a.oracle.Refresh()
	best := a.sweep(ctx)
	if ctx.Err() != nil {
		return 1
	}
	sum := a.p.Earned + best + a.capacityValue() - a.keepFreeValue() + a.shares.slack(a.oracle.Share)
	if sum <= 0 {
		return 0 // not a rounding's worth above it: nothing can be got
	}
	return math.Min(1, sum*(1+1e-9)+1e-12)
}

// keepFreeValue is what the nights' budgets take off the priced capacity. A
// telescope-night's use (exposures and needed gaps) is at most its budget.
// Split its prices into mu, the least of them, and the rest: the rest is
// bounded slot by slot, mu by the budget and one trailing least gap, so that
// mu (open - budget - least gap) need not be paid.
func (a *Ascent) keepFreeValue() float64 {
	var sum float64
	for t := range a.p.Scopes {
		if a.p.Scopes[t].KeepFree == 0 {
			continue
		}
		for n := range a.p.Nights {
			var open int64
			for _, o := range a.p.OpenOuter(t, n) {
				open += o.To - o.From
			}
			spare := open - a.p.Budget(t, n) - a.p.Scopes[t].LeastGap
			if spare > 0 {
				sum += a.oracle.least[t*a.p.Nights+n] * model.Sec(spare)
			}
		}
	}
	return sum
}
