// Package scheduler plans a survey: it prices telescope time, proves a
// ceiling on the coverage, and fills the nights against those prices. It is
// the conductor over the rooms below it (dual, search) and knows no files,
// terminals or clocks.
package scheduler

import (
	"context"
	"errors"
	"fmt"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/search"
	"nightwright/visibility"
)

// Input is everything a solver needs; all of it belongs to the same survey.
type Input struct {
	Survey   *survey.Survey
	Sky      *visibility.Sky
	Calendar *constraints.Calendar
	Windows  *constraints.Windows
	Workers  int
	Past     *Past // nil: nothing was done yet
}

// Params steer a search. Steps, not seconds, decide the result; a context
// with a deadline or a cancelled one ends it early, with the best plan so far
// and a Status that says so.
type Params struct {
	Effort   string // quick, normal (the default) or thorough
	Seed     uint64
	Progress func(model.Progress) // nil: none
	// Prices, when not nil, ends the price search early, so that a time limit
	// leaves time for the plan itself.
	Prices context.Context
}

// Solve plans the survey.
func Solve(ctx context.Context, in Input, params Params) (*model.Outcome, error) {
	if params.Effort == "" {
		params.Effort = "normal"
	}
	effort, ok := efforts[params.Effort]
	if !ok {
		return nil, fmt.Errorf("scheduler: effort %q is not known; want quick, normal or thorough", params.Effort)
	}
	p, err := problem(ctx, in)
	if err != nil {
		return nil, err
	}
	if in.Past != nil {
		p = p.Take(in.Past.given(p))
	}
	c := &conductor{p: p, ctx: ctx, prices: ctx, effort: effort, report: params.Progress}
	if params.Prices != nil {
		c.prices = params.Prices
	}
	if c.report == nil {
		c.report = func(model.Progress) {}
	}
	out := c.solve(params.Seed)
	out.Effort, out.Seed = params.Effort, params.Seed
	if in.Past != nil {
		out.Plan = in.Past.merge(out.Plan)
	}
	return out, nil
}

// problem gathers what is worked on. A cancelled context gives it up; one that
// is only late doesn't, for its plan may still be empty and legal.
func problem(ctx context.Context, in Input) (*model.Problem, error) {
	patient, stop := context.WithCancel(context.WithoutCancel(ctx))
	defer stop()
	defer context.AfterFunc(ctx, func() {
		if errors.Is(ctx.Err(), context.Canceled) {
			stop()
		}
	})()
	return model.NewProblemWithin(patient, in.Survey, in.Sky, in.Calendar, in.Windows, in.Workers)
}

// conductor runs the phases of one solve.
type conductor struct {
	p      *model.Problem
	ctx    context.Context
	prices context.Context
	effort effort
	report func(model.Progress)
}

func (c *conductor) solve(seed uint64) *model.Outcome {
	ascent := dual.NewAscent(c.p)
	// A bound that proves nothing isn't told as a ceiling.
	ascent.Soften(c.prices, c.effort.soft, func(step, of int, _ float64) {
		c.report(model.Progress{Phase: "prices", Done: step, Total: of})
	})
	ascent.Run(c.prices, fit(c.p, c.effort.fine), func(step, of int, _ float64) {
		c.report(model.Progress{Phase: "fine prices", Done: step, Total: of})
	})
	c.report(model.Progress{Phase: "ceiling"})
	ceiling := ascent.CeilingWithin(c.ctx, c.effort.ceilingBin)
	c.report(model.Progress{Phase: "ceiling", Done: 1, Total: 1, Ceiling: ceiling})
	prices, kept := ascent.Prices().List(), ascent.Keep()
	ascent.Steer(c.prices, c.effort.soft, c.effort.steer, func(step, of int, _ float64) {
		c.report(model.Progress{Phase: "steering", Done: step, Total: of, Ceiling: ceiling})
	})
	s := search.New(c.p, ascent.Prices(), ascent.Oracle().Mu, seed)
	s.SetRates(ascent.ShareRates())
	s.Construct(c.ctx, c.effort.construct, func(done, of int) {
		c.report(model.Progress{Phase: "construction", Done: done, Total: of, Coverage: s.Coverage(), Ceiling: ceiling})
	})
	for i, theta := range c.effort.sweeps {
		phase := fmt.Sprintf("sweep %d of %d", i+1, len(c.effort.sweeps))
		s.Hope(hopeOf(theta))
		s.Sweep(c.ctx, theta, func(done, of int) {
			c.report(model.Progress{Phase: phase, Done: done, Total: of, Coverage: s.Coverage(), Ceiling: ceiling})
		})
	}
	s.Hope(0)
	s.Iterate(c.ctx, c.effort.iterations, func(done, of int) {
		c.report(model.Progress{Phase: "iterations", Done: done, Total: of, Coverage: s.Coverage(), Ceiling: ceiling})
	})
	s.KeepShares(c.ctx, func(done, of int) {
		c.report(model.Progress{Phase: "shares", Done: done, Total: of, Coverage: s.Coverage(), Ceiling: ceiling})
	})
	status := model.StepsDone
	if err := c.ctx.Err(); err != nil {
		status = model.Interrupted
		if errors.Is(err, context.DeadlineExceeded) {
			status = model.TimeLimit
		}
	}
	plan := s.Plan()
	told := shares(c.p, plan)
	if missed(told) {
		ceiling = c.relaxedCeiling(ascent, kept, told)
	}
	anatomy := Dissect(c.p, plan, s.Coverage(), ceiling, prices)
	return &model.Outcome{
		Parts: anatomy.Parts(),
		Plan:  plan, Coverage: s.Coverage(), Ceiling: ceiling, Status: status,
		Prices: prices, Stats: s.Stats().List(), Shares: told,
	}
}
