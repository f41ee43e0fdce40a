package work

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
)

// TestPlanEndedAtAnyPhase ends the context at the start of each phase in turn:
// there is no plan folder then, nor anything else that wasn't there.
func TestPlanEndedAtAnyPhase(t *testing.T) {
	var phases []string
	dir := t.TempDir()
	whole := filepath.Join(dir, "whole")
	_, err := Plan(t.Context(), small(t), PlanAsk{Out: whole, Effort: "quick"}, Options{Workers: 1, Progress: func(p model.Progress) {
		if len(phases) == 0 || phases[len(phases)-1] != p.Phase {
			phases = append(phases, p.Phase)
		}
	}})
	if err != nil {
		t.Fatal(err)
	}
	if len(phases) < 6 {
		t.Fatalf("phases %q; want several", phases)
	}
	for i, stop := range phases {
		out := filepath.Join(dir, "cut", stop)
		if err := os.MkdirAll(filepath.Dir(out), 0o755); err != nil {
			t.Fatal(err)
		}
		ctx, cancel := context.WithCancel(t.Context())
		seen := -1
		last := ""
		_, err := Plan(ctx, small(t), PlanAsk{Out: out, Effort: "quick"}, Options{Workers: 1, Progress: func(p model.Progress) {
			if p.Phase != last {
				last = p.Phase
				if seen++; seen == i {
					cancel()
				}
			}
		}})
		cancel()
		if !errors.Is(err, context.Canceled) {
			t.Errorf("ended at %q: %v; want context.Canceled", stop, err)
		}
		if left, _ := filepath.Glob(filepath.Join(dir, "cut", "*")); len(left) > 0 {
			t.Errorf("ended at %q it left %q", stop, left)
		}
	}
}

// TestPlanKeptAtAnyPhase ends the context at the start of each phase of the
// search in turn, where the best plan so far is to be kept: then there is either
// nothing, or a whole plan that passed its audit and says how it came to be. A
// plan that stood there is never replaced.
func TestPlanKeptAtAnyPhase(t *testing.T) {
	dir := t.TempDir()
	kept := 0
	for _, stop := range []string{"windows", "prices", "ceiling", "construction", "sweep 1 of 2", "iterations", "recount"} {
		out := filepath.Join(dir, stop)
		for _, stands := range []bool{false, true} {
			ctx, cancel := context.WithCancel(t.Context())
			r, err := Plan(ctx, small(t), PlanAsk{Out: out, Effort: "quick", Keep: true}, Options{Workers: 1, Progress: func(p model.Progress) {
				if p.Phase == stop {
					cancel()
				}
			}})
			cancel()
			if err != nil {
				if left, _ := filepath.Glob(out + "*"); !errors.Is(err, context.Canceled) || len(left) > 0 {
					t.Errorf("ended at %q: %v, and left %q", stop, err, left)
				}
				break
			}
			kept++
			if want := map[bool]string{false: out, true: out + "-interrupted"}[stands]; r.Folder != want || r.Beside != stands || !r.Interrupted {
				t.Errorf("ended at %q, a plan stands: %v: folder %q, beside %v, interrupted %v; want %q", stop, stands, r.Folder, r.Beside, r.Interrupted, want)
			}
			pt, err := tables.ReadFolder(r.Folder)
			if err != nil {
				t.Fatal(err)
			}
			if s := pt.Summary; s.Status != "interrupted" && stop != "recount" || s.Coverage <= 0 || s.Coverage > s.Ceiling {
				t.Errorf("ended at %q: status %q, coverage %g, ceiling %g", stop, s.Status, s.Coverage, s.Ceiling)
			}
		}
	}
	if kept < 6 {
		t.Errorf("only %d plans were kept", kept)
	}
}

// TestTimeLimitWithoutAPlanIsTold: no empty plan is written for it.
func TestTimeLimitWithoutAPlanIsTold(t *testing.T) {
	out := filepath.Join(t.TempDir(), "plan")
	_, err := Plan(t.Context(), small(t), PlanAsk{Out: out, Effort: "thorough", TimeLimit: 1}, Options{Workers: 1})
	if err == nil || !strings.Contains(err.Error(), "time limit of 1ns") {
		t.Errorf("error %v; want one that names the time limit", err)
	}
	if _, err := os.Stat(out); !errors.Is(err, os.ErrNotExist) {
		t.Error("an empty plan was written")
	}
}

// TestPlanIsTheSameForAnyWorkers compares plan folders byte by byte.
func TestPlanIsTheSameForAnyWorkers(t *testing.T) {
	dir := t.TempDir()
	var first map[string]string
	for _, workers := range []int{1, 2, 8} {
		out := filepath.Join(dir, "plan")
		if _, err := Plan(t.Context(), small(t), PlanAsk{Out: out, Effort: "normal"}, Options{Workers: workers}); err != nil {
			t.Fatal(err)
		}
		got := map[string]string{}
		err := filepath.WalkDir(out, func(p string, d os.DirEntry, err error) error {
			if err != nil || d.IsDir() {
				return err
			}
			data, err := os.ReadFile(p)
			got[p] = string(data)
			return err
		})
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = got
		}
		if len(got) != len(first) {
			t.Errorf("%d workers: %d files; want %d", workers, len(got), len(first))
		}
		for name, data := range first {
			if got[name] != data {
				t.Errorf("%d workers: %s differs from that of one", workers, filepath.Base(name))
			}
		}
	}
}

// TestSeedOfTheCallerCounts: the survey's seed unless another is given.
func TestSeedOfTheCallerCounts(t *testing.T) {
	seed := uint64(41)
	for want, ask := range map[uint64]PlanAsk{3: {}, seed: {Seed: &seed}} {
		ask.Out, ask.Effort = filepath.Join(t.TempDir(), "plan"), "quick"
		r, err := Plan(t.Context(), small(t), ask, Options{Workers: 2, Version: "v9"})
		if err != nil {
			t.Fatal(err)
		}
		pt, err := tables.ReadFolder(r.Folder)
		if err != nil {
			t.Fatal(err)
		}
		if pt.Summary.Seed != want || pt.Summary.Program != "v9" || pt.Summary.Effort != "quick" {
			t.Errorf("plan.json has seed %d, program %q, effort %q; want %d, v9, quick", pt.Summary.Seed, pt.Summary.Program, pt.Summary.Effort, want)
		}
	}
}

// TestSurveyChangedWhilePlanning: the copy in the plan folder is what was planned.
func TestSurveyChangedWhilePlanning(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "s")
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("..", "testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	s, err := ReadSurvey(dir)
	if err != nil {
		t.Fatal(err)
	}
	fields, err := os.ReadFile(filepath.Join(dir, "fields.csv"))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, "fields.csv"), append(fields, "A9,150,20,wide\n"...), 0o644); err != nil {
		t.Fatal(err)
	}
	var fault *InputError
	if _, err := Plan(t.Context(), s, PlanAsk{Effort: "quick"}, Options{Workers: 2}); !errors.As(err, &fault) {
		t.Fatalf("%v; want an InputError that names the file", err)
	}
	if _, err := os.Stat(filepath.Join(dir, "plan")); !errors.Is(err, os.ErrNotExist) {
		t.Error("a plan was written for a survey that had changed")
	}
}

// TestPlaceThatCantBeWrittenIsToldAtOnce: before the work, not after it.
func TestPlaceThatCantBeWrittenIsToldAtOnce(t *testing.T) {
	told := false
	report := Options{Workers: 1, Progress: func(model.Progress) { told = true }}
	// A folder in which not even root may make another.
	_, err := Plan(t.Context(), small(t), PlanAsk{Out: "/proc/self/plan", Effort: "quick"}, report)
	var fault *InputError
	if !errors.As(err, &fault) || !strings.Contains(err.Error(), "nothing can be written in /proc/self") {
		t.Errorf("error %v; want one that says that nothing can be written there", err)
	}
	if told {
		t.Error("the work had begun")
	}
}
