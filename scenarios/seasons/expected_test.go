package seasons

import (
	"context"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
)

// expectedPlan plans a survey of one clear fraction for the expected weather.
func expectedPlan(t *testing.T, k *stageKit, clear float64) *model.Outcome {
	t.Helper()
	out, err := scheduler.SolveExpected(context.Background(),
		scheduler.Input{Survey: k.Survey, Sky: k.sky, Calendar: k.p.Calendar, Windows: k.win, Workers: 2},
		scheduler.Params{Effort: "quick", Seed: 1},
		scheduler.Weather{
			Usable:   func(int, int64, int64) float64 { return clear },
			Calendar: func(sv *survey.Survey) *constraints.Calendar { return constraints.NewCalendar(sv, k.exact, nil) },
		})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// TestExpectedPlans: no policy's mean beats expected_ceiling, and the plan for
// expected weather beats the weather-blind one under the same skies, with its
// lists and with its prices.
func TestExpectedPlans(t *testing.T) {
	if testing.Short() {
		return // the race detector's rounds have enough without it
	}
	k := build(t, small())
	blind, err := scheduler.Solve(context.Background(), scheduler.Input{Survey: k.Survey, Sky: k.sky, Calendar: k.p.Calendar, Windows: k.win, Workers: 2}, scheduler.Params{Effort: "quick", Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	robust := expectedPlan(t, k, 0.65)
	if robust.Expected >= robust.Ceiling || robust.Coverage > robust.Ceiling || robust.Ceiling < blind.Coverage {
		t.Errorf("coverage %.4f, ceiling %.4f, expected_ceiling %.4f; the blind plan has %.4f", robust.Coverage, robust.Ceiling, robust.Expected, blind.Coverage)
	}
	const seasons = 40
	coverage := func(cast Cast) []float64 {
		var out []float64
		for _, o := range play(t, k.Stage, cast, 21, seasons, 2) {
			out = append(out, o.Coverage)
		}
		if m := MeanInterval(out); m.Mean > robust.Expected {
			t.Errorf("%v: the mean coverage %.4f is above expected_ceiling %.4f", cast.Policy, m.Mean, robust.Expected)
		}
		return out
	}
	coverage(Cast{Policy: Densest})
	coverage(Cast{Policy: Resolved})
	lists := Paired(coverage(Cast{Policy: AsPlanned, List: robust.Plan.Exposures}), coverage(Cast{Policy: AsPlanned, List: blind.Plan.Exposures}))
	if lists.Low <= 0 {
		t.Errorf("lists for expected weather gain %.4f (%.4f to %.4f); want more than 0", lists.Mean, lists.Low, lists.High)
	}
	prices := Paired(coverage(Cast{Policy: FixedPrices, Prices: robust.Prices}), coverage(Cast{Policy: FixedPrices, Prices: blind.Prices}))
	if prices.Low <= 0 {
		t.Errorf("prices for expected weather gain %.4f (%.4f to %.4f); want more than 0", prices.Mean, prices.Low, prices.High)
	}
	t.Logf("expected_ceiling %.4f; lists gain %+.4f (%.4f to %.4f), prices %+.4f (%.4f to %.4f)", robust.Expected, lists.Mean, lists.Low, lists.High, prices.Mean, prices.Low, prices.High)
}
