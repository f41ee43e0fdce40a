package scheduler_test

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
)

// long asks for more rounds than a usual test run has time for.
var long = os.Getenv("NIGHTWRIGHT_LONG") != ""

func rounds(usual, many int) int {
	if testing.Short() {
		return max(1, usual/5) // under the race detector
	}
	if long {
		return many
	}
	return usual
}

func build(t *testing.T, sv *survey.Survey, workers int) *trial.Kit {
	t.Helper()
	k, err := trial.Build(t.Context(), sv, workers)
	if err != nil {
		t.Fatal(err)
	}
	return k
}

func input(k *trial.Kit, workers int) scheduler.Input {
	return scheduler.Input{Survey: k.Survey, Sky: k.Sky, Calendar: k.Calendar, Windows: k.Windows, Workers: workers}
}

func solve(t *testing.T, k *trial.Kit, workers int, effort string, seed uint64) *model.Outcome {
	t.Helper()
	out, err := scheduler.Solve(t.Context(), input(k, workers), scheduler.Params{Effort: effort, Seed: seed})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// legal fails when the judge finds a breach, and returns the coverage that it
// counts on the exact path.
func legal(t *testing.T, k *trial.Kit, what string, list []model.Exposure) float64 {
	t.Helper()
	r, err := k.Check(t.Context(), list)
	if err != nil {
		t.Fatal(err)
	}
	for i, b := range r.Breaches {
		if i == 3 {
			t.Errorf("%s: and %d breaches more", what, len(r.Breaches)-i)
			break
		}
		t.Errorf("%s: %s: field %s, telescope %s, night %s: %s", what, b.Rule, b.Field, b.Telescope, b.Night, b.What)
	}
	return r.Score.Coverage
}

// demo is the starter survey, cut to some nights and fields.
func demo(t *testing.T, nights, fields int) *survey.Survey {
	t.Helper()
	dir := t.TempDir() + "/demo"
	if err := starter.Write(dir, "demo", 1); err != nil {
		t.Fatal(err)
	}
	sv, _, issues := surveyfile.Load(dir)
	for _, i := range issues {
		if !i.Warning {
			t.Fatal(i)
		}
	}
	sv.LastNight = sv.FirstNight + survey.Day(nights-1)
	sv.Fields = sv.Fields[:min(fields, len(sv.Fields))]
	return sv
}

// bytesOf is an outcome as text, bit for bit.
func bytesOf(t *testing.T, o *model.Outcome) string {
	t.Helper()
	b, err := json.Marshal(o)
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// TestPlansOfRandomSurveysAreLegal holds plans against the judge, who works
// every rule out afresh; their own count of coverage against the judge's; and
// both against the ceiling.
func TestPlansOfRandomSurveysAreLegal(t *testing.T) {
	for seed := range uint64(rounds(14, 2000)) {
		k := build(t, trial.Survey(seed), 2)
		effort := []string{"quick", "normal"}[seed%2]
		o := solve(t, k, 2, effort, seed)
		c := legal(t, k, fmt.Sprint("seed ", seed), o.Plan.Exposures)
		if d := c - o.Coverage; d > 1e-4 || d < -1e-4 {
			t.Errorf("seed %d: coverage %.9f by the search, %.9f by the judge", seed, o.Coverage, c)
		}
		if !t.Failed() && (c > o.Ceiling || o.Coverage > o.Ceiling+1e-6) {
			t.Errorf("seed %d: coverage %.9f (the search's %.9f) is over the ceiling %.9f", seed, c, o.Coverage, o.Ceiling)
		}
		if o.Status != model.StepsDone || o.Effort != effort || o.Seed != seed {
			t.Errorf("seed %d: status %v, effort %q, seed %d", seed, o.Status, o.Effort, o.Seed)
		}
	}
}

// TestDemoPlanIsLegal plans some nights of the starter survey.
func TestDemoPlanIsLegal(t *testing.T) {
	k := build(t, demo(t, 3, 120), 2)
	o := solve(t, k, 2, "quick", 7)
	c := legal(t, k, "demo", o.Plan.Exposures)
	if c <= 0 || c > o.Ceiling {
		t.Errorf("coverage %g, ceiling %g", c, o.Ceiling)
	}
	if g := model.Gap(c, o.Ceiling); g > 0.15 {
		t.Errorf("the plan is %.1f %% under the ceiling; it used to be within 15", 100*g)
	}
}

// TestSameBytesForAnyWorkers: plan, prices, ceiling and counters don't depend
// on the number of workers, nor on what ran before.
func TestSameBytesForAnyWorkers(t *testing.T) {
	surveys := []*survey.Survey{demo(t, 3, rounds(80, 80))}
	for seed := range uint64(rounds(3, 30)) {
		surveys = append(surveys, trial.Survey(seed+500))
	}
	for i, sv := range surveys {
		first := ""
		for _, workers := range []int{1, 2, 8, 1} {
			got := bytesOf(t, solve(t, build(t, sv, workers), workers, "quick", 11))
			if first == "" {
				first = got
			} else if got != first {
				t.Errorf("survey %d: %d workers give another outcome than 1", i, workers)
			}
		}
	}
}

// TestSeedMatters: another seed gives another order of the sweeps, so that
// the parameter is not ignored.
func TestSeedMatters(t *testing.T) {
	k := build(t, demo(t, 3, 80), 2)
	a, b := solve(t, k, 2, "quick", 1), solve(t, k, 2, "quick", 2)
	if slices.Equal(a.Plan.Exposures, b.Plan.Exposures) {
		t.Error("seeds 1 and 2 give the same plan")
	}
	if a.Ceiling != b.Ceiling {
		t.Errorf("the ceiling depends on the seed: %g, %g", a.Ceiling, b.Ceiling)
	}
}

// TestInterruptedPlanIsLegal cancels at reports throughout the search.
func TestInterruptedPlanIsLegal(t *testing.T) {
	k := build(t, demo(t, 2, 60), 2)
	reports := 0
	if _, err := scheduler.Solve(t.Context(), input(k, 2), scheduler.Params{Effort: "quick", Progress: func(model.Progress) { reports++ }}); err != nil {
		t.Fatal(err)
	}
	for _, part := range []int{0, 1, 4, 7, 9} {
		ctx, cancel := context.WithCancel(t.Context())
		left := reports * part / 10
		o, err := scheduler.Solve(ctx, input(k, 2), scheduler.Params{Effort: "quick", Progress: func(model.Progress) {
			if left--; left <= 0 {
				cancel()
			}
		}})
		cancel()
		if err != nil {
			t.Fatalf("cancelled after %d/10 of the reports: %v", part, err)
		}
		if o.Status != model.Interrupted {
			t.Errorf("cancelled after %d/10: status %v", part, o.Status)
		}
		if c := legal(t, k, "interrupted", o.Plan.Exposures); c > o.Ceiling {
			t.Errorf("cancelled after %d/10: coverage %g is over the ceiling %g", part, c, o.Ceiling)
		}
	}
	ctx, cancel := context.WithTimeout(t.Context(), 0)
	defer cancel()
	o, err := scheduler.Solve(ctx, input(k, 2), scheduler.Params{Effort: "quick"})
	if err != nil || o.Status != model.TimeLimit {
		t.Fatalf("a deadline that has passed: outcome %v, error %v", o, err)
	}
	ended, end := context.WithCancel(t.Context())
	end()
	if o, err := scheduler.Solve(ended, input(k, 2), scheduler.Params{Effort: "quick"}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled before it began: outcome %v, error %v; want context.Canceled", o, err)
	}
}

// TestFieldsWithoutWeightChangeNothing: what they would get is worth nothing,
// so coverage and ceiling stay what they are.
func TestFieldsWithoutWeightChangeNothing(t *testing.T) {
	sv := demo(t, 2, 60)
	plain := solve(t, build(t, sv, 2), 2, "quick", 3)
	more := *sv
	for i := range 20 {
		f := sv.Fields[i]
		f.Name, f.Weight = f.Name+" again", 0
		more.Fields = append(more.Fields, f)
	}
	k := build(t, &more, 2)
	with := solve(t, k, 2, "quick", 3)
	legal(t, k, "with fields of no weight", with.Plan.Exposures)
	if d := with.Ceiling/plain.Ceiling - 1; d > 0.01 || d < -0.01 {
		t.Errorf("ceiling %g, and %g with fields of no weight", plain.Ceiling, with.Ceiling)
	}
	if d := with.Coverage/plain.Coverage - 1; d > 0.01 || d < -0.01 {
		t.Errorf("coverage %g, and %g with fields of no weight", plain.Coverage, with.Coverage)
	}
	for i := range with.Plan.Exposures {
		if f := with.Plan.Exposures[i].Field; int(f) >= len(sv.Fields) {
			t.Fatalf("field %d of no weight got a visit", f)
		}
	}
}

// TestUnknownEffortErrs also names what there is.
func TestUnknownEffortErrs(t *testing.T) {
	k := build(t, trial.Survey(1), 1)
	for _, effort := range []string{"heroic", "QUICK", "quick "} {
		if _, err := scheduler.Solve(t.Context(), input(k, 1), scheduler.Params{Effort: effort}); err == nil {
			t.Errorf("effort %q: no error", effort)
		}
	}
}
