package seasons

import (
	"context"
	"testing"

	"nightwright/scheduler/audit"
	"nightwright/scheduler/trial"
)

// TestRandomSeasonsAreLegal plays random small surveys, with poles, the date
// line, every mount and odd rules, under random weather, and has the judge look
// at all that counted.
func TestRandomSeasonsAreLegal(t *testing.T) {
	surveys, visits := uint64(120), 0
	if testing.Short() {
		surveys = 20
	}
	for seed := uint64(1); seed <= surveys; seed++ {
		k := build(t, cloudy(trial.Survey(seed), 0.4+0.02*float64(seed%25), float64(1+seed%5)*4*3600))
		for _, policy := range []Policy{FixedPrices, Resolved, Densest} {
			o := play(t, k.Stage, Cast{Policy: policy, Record: true}, seed, 1, 1)[0]
			known, losses := k.Known(seed, 0)
			for i := range o.Taken {
				o.Taken[i].Visit = int64(i + 1)
			}
			r, err := audit.Check(context.Background(), audit.Input{
				Survey: known, Exact: k.exact, Losses: losses, Workers: 2,
				Plan: audit.Plan{Visits: trial.Rows(k.Survey, o.Taken), LegalityOnly: true},
			})
			if err != nil {
				t.Fatal(err)
			}
			visits += o.Visits
			for i, b := range r.Breaches {
				if i < 3 {
					t.Errorf("seed %d, %v: %s %s %s: %s", seed, policy, b.Rule, b.Telescope, b.Field, b.What)
				}
			}
			if d := r.Score.Coverage - o.Coverage; d > 3e-5 || d < -3e-5 {
				t.Errorf("seed %d, %v: the judge counts %.6f, the season %.6f", seed, policy, r.Score.Coverage, o.Coverage)
			}
		}
	}
	if visits < 100 {
		t.Errorf("%d visits in all; the check would be idle", visits)
	}
	t.Logf("%d visits of %d surveys", visits, surveys)
}
