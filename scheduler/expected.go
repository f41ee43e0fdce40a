package scheduler

import (
	"context"
	"fmt"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
)

// Weather is what a plan for expected weather needs to know.
type Weather struct {
	// Usable returns the mean part of a telescope's time in [from, to) (UTC,
	// Unix us) that the sky leaves.
	Usable func(telescope int, from, to int64) float64
	// Calendar makes the calendar of a survey that differs from the input's in
	// keep_free alone, with the same losses.
	Calendar func(sv *survey.Survey) *constraints.Calendar
}

// SolveExpected plans for the weather that is to be expected. Each telescope's
// nights are filled to the part that the sky leaves on the mean, by the visits
// that are worth most; what is left free takes up what clouds take. Prices are
// those of the scarcer time, the ceiling is that of clear skies as for any
// plan, and Expected bounds the mean coverage of every way of acting.
func SolveExpected(ctx context.Context, in Input, params Params, w Weather) (*model.Outcome, error) {
	if params.Effort == "" {
		params.Effort = "normal"
	}
	effort, ok := efforts[params.Effort]
	if !ok {
		return nil, fmt.Errorf("scheduler: effort %q is not known; want quick, normal or thorough", params.Effort)
	}
	thin := *in.Survey
	thin.Telescopes = slices.Clone(thin.Telescopes)
	for t := range thin.Telescopes {
		keep := &thin.Telescopes[t].KeepFree
		*keep = 1 - (1-*keep)*usablePart(in.Calendar, t, thin.Nights(), w.Usable)
	}
	part := in
	part.Survey, part.Calendar = &thin, w.Calendar(&thin)
	out, err := Solve(ctx, part, params)
	if err != nil {
		return nil, err
	}
	if ctx.Err() != nil { // cut short: nothing is proven yet
		out.Ceiling = 1
		return out, nil
	}
	report := params.Progress
	if report == nil {
		report = func(model.Progress) {}
	}
	bound := &bounder{ctx: ctx, effort: effort, report: report}
	if out.Ceiling, err = bound.clear(in, out.Shares); err != nil {
		return nil, err
	}
	if out.Expected, out.Prices, err = bound.expected(in, w); err != nil {
		return nil, err
	}
	return out, nil
}

// usablePart is the mean usable part of a telescope's open time.
func usablePart(cal *constraints.Calendar, telescope, nights int, usable func(int, int64, int64) float64) float64 {
	open, got := 0.0, 0.0
	for n := range nights {
		for _, o := range cal.Open(telescope, n) {
			open += o.To - o.From
			got += (o.To - o.From) * usable(telescope, model.MicroOf(o.From), model.MicroOf(o.To))
		}
	}
	if open == 0 {
		return 1
	}
	return got / open
}

// bounder works out ceilings without a plan.
type bounder struct {
	ctx    context.Context
	effort effort
	report func(model.Progress)
}

// run takes the price levels of the effort and returns the ceiling.
func (b *bounder) run(p *model.Problem, a *dual.Ascent, what string) float64 {
	a.Soften(b.ctx, b.effort.soft, func(step, of int, _ float64) {
		b.report(model.Progress{Phase: what + " prices", Done: step, Total: of})
	})
	a.Run(b.ctx, fit(p, b.effort.fine), func(step, of int, _ float64) {
		b.report(model.Progress{Phase: what + " fine prices", Done: step, Total: of})
	})
	b.report(model.Progress{Phase: what + " ceiling"})
	return a.CeilingWithin(b.ctx, b.effort.ceilingBin)
}

// taken is the problem with what was done taken in.
func taken(ctx context.Context, in Input) (*model.Problem, error) {
	p, err := problem(ctx, in)
	if err == nil && in.Past != nil {
		p = p.Take(in.Past.given(p))
	}
	return p, err
}

// clear is the ceiling of plans under clear skies that keep the share bounds
// as far as this one does.
func (b *bounder) clear(in Input, told []model.ShareOutcome) (float64, error) {
	p, err := taken(b.ctx, in)
	if err != nil {
		return 0, err
	}
	a := dual.NewAscent(p)
	for i := range told {
		if told[i].Breach != 0 {
			a.Relax(int(told[i].Program), told[i].Share)
		}
	}
	return b.run(p, a, "clear"), nil
}

// expected is the ceiling of the mean coverage, which no share bound and no
// keep_free lowers, and its prices.
func (b *bounder) expected(in Input, w Weather) (float64, []model.Price, error) {
	free := *in.Survey
	free.Telescopes, free.Programs = slices.Clone(free.Telescopes), slices.Clone(free.Programs)
	for t := range free.Telescopes {
		free.Telescopes[t].KeepFree = 0
	}
	for i := range free.Programs {
		free.Programs[i].ShareMin, free.Programs[i].ShareMax = 0, 1
	}
	in.Survey, in.Calendar = &free, w.Calendar(&free)
	p, err := taken(b.ctx, in)
	if err != nil {
		return 0, nil, err
	}
	a := dual.NewAscent(p)
	a.Expect(w.Usable)
	ceiling := b.run(p, a, "expected")
	return ceiling, a.Prices().List(), nil
}
