package seasons

import (
	"context"
	"math"
	"testing"

	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/trial"
)

// TestSeasonsAreLegal has the judge look at whole seasons: every exposure that
// counted must be legal with the closed hours as lost time, and the coverage
// must come out the same. The judge knows nothing of this package.
func TestSeasonsAreLegal(t *testing.T) {
	if testing.Short() {
		return // random surveys, below, are enough for the race detector
	}
	for _, sv := range []*stageKit{build(t, small()), build(t, demo(t, 6))} {
		plan, err := scheduler.Solve(context.Background(), scheduler.Input{Survey: sv.Survey, Sky: sv.sky, Calendar: sv.p.Calendar, Windows: sv.win, Workers: 2}, scheduler.Params{Effort: "quick"})
		if err != nil {
			t.Fatal(err)
		}
		for _, policy := range []Policy{AsPlanned, FixedPrices, Resolved, Densest} {
			o := play(t, sv.Stage, Cast{Policy: policy, Record: true, List: plan.Plan.Exposures}, 5, 1, 1)[0]
			known, losses := sv.Known(5, 0)
			for i := range o.Taken {
				o.Taken[i].Visit = int64(i + 1)
			}
			r, err := audit.Check(context.Background(), audit.Input{
				Survey: known, Exact: sv.exact, Losses: losses, Workers: 2,
				Plan: audit.Plan{Visits: trial.Rows(sv.Survey, o.Taken), LegalityOnly: true},
			})
			if err != nil {
				t.Fatal(err)
			}
			for i, b := range r.Breaches {
				if i < 3 {
					t.Errorf("%s, %v: %s %s %s: %s", sv.Survey.Name, policy, b.Rule, b.Telescope, b.Field, b.What)
				}
			}
			if len(r.Breaches) > 0 {
				t.Fatalf("%s, %v: %d breaches in %d exposures", sv.Survey.Name, policy, len(r.Breaches), len(o.Taken))
			}
			if o.Visits < 50 {
				t.Errorf("%s, %v: only %d visits; the check would be idle", sv.Survey.Name, policy, o.Visits)
			}
			if math.Abs(r.Score.Coverage-o.Coverage) > 2e-5 || int(r.Score.VisitsGot) != o.Visits || int(r.Score.FieldsFinished) != o.Finished {
				t.Errorf("%s, %v: the judge counts %.6f, %d visits, %d finished; the season %.6f, %d, %d", sv.Survey.Name, policy,
					r.Score.Coverage, r.Score.VisitsGot, r.Score.FieldsFinished, o.Coverage, o.Visits, o.Finished)
			}
		}
	}
}

// TestNoPolicyBeatsHindsight: the ceiling with a season's weather known bounds
// what any way of acting gets in it.
func TestNoPolicyBeatsHindsight(t *testing.T) {
	if testing.Short() {
		return // the race detector's rounds have enough without it
	}
	sv := small()
	k := build(t, sv)
	for season := range 2 {
		known, losses := k.Known(5, season)
		out, err := hindsight(k, scheduler.Params{Effort: "quick", Seed: 1}, known, losses)
		if err != nil {
			t.Fatal(err)
		}
		for _, policy := range []Policy{FixedPrices, Resolved, Densest} {
			o := play(t, k.Stage, Cast{Policy: policy}, 5, season+1, 1)[season]
			if o.Coverage > out.Ceiling {
				t.Errorf("season %d, %v: coverage %.4f is above the ceiling %.4f", season, policy, o.Coverage, out.Ceiling)
			}
			if policy == Resolved && o.Coverage < 0.85*out.Coverage {
				t.Errorf("season %d: resolved nightly gets %.4f; hindsight planning %.4f", season, o.Coverage, out.Coverage)
			}
		}
	}
}
