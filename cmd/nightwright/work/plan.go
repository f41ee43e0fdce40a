package work

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
)

// PlanAsk says how to plan.
type PlanAsk struct {
	Out       string        // the plan folder; "": plan in the survey folder
	Effort    string        // quick, normal or thorough
	Seed      *uint64       // nil: the survey's
	Now       string        // instant before which nothing is planned any more; "": the end of the last exposure that was done
	TimeLimit time.Duration // 0: none; a plan that was cut short says so and can't be repeated
	// Keep writes the best plan so far when the context ends during the search:
	// where the plan was to go, or, when a plan stands there, beside it.
	Keep    bool
	Weather string // expected: plan for the weather that is to be expected; "": for clear skies
}

// PlanResult is a plan that passed its audit and was written.
type PlanResult struct {
	Folder string
	Tables *tables.PlanTables
	Audit  *audit.Report
	// Unrecorded says why the ledger doesn't have the plan; nil: it has, or the
	// plan was put beside another.
	Unrecorded error
	// Interrupted says that the context ended; Beside that the plan therefore
	// went beside the one that stands.
	Interrupted, Beside bool
}

// Efforts lists the efforts, least first.
func Efforts() []string { return []string{"quick", "normal", "thorough"} }

// BreachError says that a fresh plan failed its audit: a fault of the program,
// never of the survey. Nothing was written.
type BreachError struct{ Report *audit.Report }

// Error tells the first breach and how many there are.
func (e *BreachError) Error() string {
	n := len(e.Report.Breaches)
	return fmt.Sprintf("the plan failed its audit with %d breaches and was not written; this is a fault of the program, please report it with the survey; the first: %s", n, BreachLine(&e.Report.Breaches[0]))
}

// Folder says where the plan goes.
func (ask *PlanAsk) folder(s *Survey) string {
	if ask.Out != "" {
		return ask.Out
	}
	return filepath.Join(s.Folder(), "plan")
}

// Plan optimises a survey, audits the plan afresh and writes its folder. A
// failed audit or a full disk leaves what stood there, and so does a context
// that ends, unless the best plan so far is to be kept.
func Plan(ctx context.Context, s *Survey, ask PlanAsk, o Options) (*PlanResult, error) {
	dir := ask.folder(s)
	if err := plannable(dir); err != nil {
		return nil, err
	}
	knew, err := s.TakeLosses(ctx, ledger.Now)
	if err != nil {
		return nil, err
	}
	past, err := s.pastFor(ctx, ask, knew)
	if err != nil {
		return nil, err
	}
	if err := s.OpenWindows(ctx, o); err != nil {
		return nil, err
	}
	outcome, err := solve(ctx, s, ask, past, o)
	if err != nil {
		return nil, err
	}
	interrupt := ctx
	if ask.Keep {
		ctx = context.WithoutCancel(ctx) // what is there is audited and written
	}
	o.tell("recount", 0, 1)
	pt, err := tables.Build(ctx, s.Survey, s.Exact, s.Calendar, s.Windows, outcome, o.Workers)
	if err != nil {
		return nil, err
	}
	pt.Summary.Program = o.Version
	report, err := Audit(ctx, s, pt, o)
	if err != nil {
		return nil, err
	}
	if len(report.Breaches) > 0 {
		return nil, &BreachError{report}
	}
	files, err := s.files()
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil { // the last moment to turn back
		return nil, err
	}
	r := &PlanResult{Folder: dir, Tables: pt, Audit: report, Interrupted: interrupt.Err() != nil}
	if _, err := os.Stat(filepath.Join(dir, "plan.json")); err == nil && r.Interrupted {
		r.Folder, r.Beside = dir+besides, true
		if err := plannable(r.Folder); err != nil {
			return nil, err
		}
	}
	if err := tables.WriteFolder(r.Folder, pt, files); err != nil {
		return nil, err
	}
	if !r.Beside {
		// The plan stands; a ledger that can't be written doesn't undo it.
		r.Unrecorded = s.enterPlan(ctx, dir, pt, knew, o)
	}
	return r, nil
}

// besides ends the name of the folder of an interrupted plan that would
// replace a whole one.
const besides = "-interrupted"

// solve runs the optimiser. Only the caller's context, not the time limit,
// makes it fail.
func solve(ctx context.Context, s *Survey, ask PlanAsk, past *scheduler.Past, o Options) (*model.Outcome, error) {
	limited, cancel := ctx, context.CancelFunc(func() {})
	if ask.TimeLimit > 0 {
		limited, cancel = context.WithTimeout(ctx, ask.TimeLimit)
	}
	defer cancel()
	prices := limited
	if ask.TimeLimit > 0 {
		// Prices may take a third: a plan at rough prices beats none.
		var stop context.CancelFunc
		prices, stop = context.WithTimeout(limited, ask.TimeLimit/3)
		defer stop()
	}
	seed := s.Seed
	if ask.Seed != nil {
		seed = *ask.Seed
	}
	in := scheduler.Input{Survey: s.Survey, Sky: s.Sky, Calendar: s.Calendar, Windows: s.Windows, Workers: o.Workers, Past: past}
	params := scheduler.Params{Effort: ask.Effort, Seed: seed, Progress: o.Progress, Prices: prices}
	var out *model.Outcome
	var err error
	if ask.Weather == "expected" {
		out, err = scheduler.SolveExpected(limited, in, params, s.expectedWeather())
	} else {
		out, err = scheduler.Solve(limited, in, params)
	}
	if stop := ctx.Err(); stop != nil && (!ask.Keep || out == nil || len(out.Plan.Exposures) == 0) {
		return nil, stop
	}
	if err != nil {
		return nil, err
	}
	if out.Status == model.TimeLimit && len(out.Plan.Exposures) == 0 {
		return nil, fmt.Errorf("the time limit of %v ended the search before it had placed a visit; nothing was written; give it more, or none", ask.TimeLimit)
	}
	return out, nil
}

// plannable errs when a folder can't take a plan, before hours are spent.
func plannable(dir string) error {
	info, err := os.Stat(dir)
	if errors.Is(err, os.ErrNotExist) {
		parent := filepath.Dir(dir)
		if info, err := os.Stat(parent); err != nil || !info.IsDir() {
			return Inputf("the plan can't go to %s: there is no folder %s; make it first", dir, parent)
		}
		return writable(dir, parent)
	}
	if err != nil {
		return err
	}
	if !info.IsDir() {
		return Inputf("the plan can't go to %s: it is a file; want a folder name", dir)
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return err
	}
	if _, err := os.Stat(filepath.Join(dir, "plan.json")); err != nil && len(entries) > 0 {
		return Inputf("the plan can't go to %s: the folder holds something else; want a new name or a plan folder to replace", dir)
	}
	return writable(dir, filepath.Dir(filepath.Clean(dir)))
}

// writable errs when nothing can be made in the folder that a plan folder
// is made in: plan folders are written beside the place and moved there whole.
func writable(dir, parent string) error {
	try, err := os.MkdirTemp(parent, ".nightwright-*")
	if err == nil {
		err = os.Remove(try)
	}
	if err != nil {
		reason := err
		if inner := (*os.PathError)(nil); errors.As(err, &inner) {
			reason = inner.Err
		}
		return Inputf("the plan can't go to %s: nothing can be written in %s (%v); want --out with a folder that can be written to", dir, parent, reason)
	}
	return nil
}

// files reads the survey's files for the copy in the plan folder.
func (s *Survey) files() ([]tables.SurveyFile, error) {
	var out []tables.SurveyFile
	for _, f := range s.Source.Files {
		data, err := s.file(f)
		if err != nil {
			return nil, err
		}
		out = append(out, tables.SurveyFile{Name: f.Name, Data: data})
	}
	return out, nil
}
