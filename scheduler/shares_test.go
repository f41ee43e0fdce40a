package scheduler_test

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scheduler/dual"
)

// shareOf solves a survey quickly and returns a program's share, what one visit
// of it is of all the time, its breach and the reason. The plan must be legal
// and under its ceiling.
func shareOf(t *testing.T, sv *survey.Survey, p int) (share, breach, visit float64, why string) {
	t.Helper()
	k := build(t, sv, 2)
	o := solve(t, k, 2, "quick", 1)
	if c := legal(t, k, "shares", o.Plan.Exposures); c > o.Ceiling {
		t.Errorf("coverage %g is over the ceiling %g", c, o.Ceiling)
	}
	var all, longest float64
	for _, e := range o.Plan.Exposures {
		s := float64(e.End-e.Start) / 1e6
		all += s
		if sv.Fields[e.Field].Program == p {
			share += s
			longest = math.Max(longest, s)
		}
	}
	if share/all-o.Shares[p].Share > 1e-9 || o.Shares[p].Share-share/all > 1e-9 {
		t.Errorf("share told %g, counted %g", o.Shares[p].Share, share/all)
	}
	return share / all, o.Shares[p].Breach, longest / all, o.Shares[p].Why
}

// TestSharesAreKept asks a program that lacks visits for a little more, then a
// little less, than it gets when nobody asks: both must come out, to within one
// visit.
func TestSharesAreKept(t *testing.T) {
	const p = 1
	free, _, _, _ := shareOf(t, starter.Family("small", 2), p)
	more := starter.Family("small", 2)
	more.Programs[p].ShareMin = free + 0.03
	if got, breach, visit, why := shareOf(t, more, p); got < free+0.03-visit || breach != 0 {
		t.Errorf("at least %.3f asked (%.3f when free), %.3f got, breach %g: %s", free+0.03, free, got, breach, why)
	}
	less := starter.Family("small", 2)
	less.Programs[p].ShareMax = free - 0.05
	if got, breach, visit, why := shareOf(t, less, p); got > free-0.05+visit || breach != 0 {
		t.Errorf("at most %.3f asked (%.3f when free), %.3f got, breach %g: %s", free-0.05, free, got, breach, why)
	}
}

// TestShareThatCannotBeIsTold: a program whose fields never rise can't have a
// share; the plan is legal, the breach is the whole of it, and the ceiling is
// that of plans that need not keep it.
func TestShareThatCannotBeIsTold(t *testing.T) {
	sv := starter.Family("tiny", 1)
	for i := range sv.Fields {
		if sv.Fields[i].Program == 0 {
			for d := range sv.Fields[i].Rules {
				sv.Fields[i].Rules[d].AltitudeMin = math.Pi/2 - 1e-6
			}
		}
	}
	sv.Programs[0].ShareMin = 0.3
	got, breach, _, why := shareOf(t, sv, 0)
	if got != 0 || math.Abs(breach-0.3) > 1e-9 || why == "" {
		t.Errorf("share %g, breach %g, why %q; want 0, 0.3 and a reason", got, breach, why)
	}
}

// TestMissedShareBoundsWhatWasReached: the ceiling of a plan that misses a
// share keeps the bound as far as the plan does. It lies above the plan and,
// prices being equal, not above the ceiling with the bound dropped.
func TestMissedShareBoundsWhatWasReached(t *testing.T) {
	const p = 1
	sv := starter.Family("small", 2)
	sv.Programs[p].ShareMin = 0.97
	k := build(t, sv, 2)
	o := solve(t, k, 2, "quick", 1)
	if o.Shares[p].Breach == 0 {
		t.Fatalf("program %d has all of its share, %g; the test wants a breach", p, o.Shares[p].Share)
	}
	a := dual.NewAscent(k.Problem)
	a.Run(t.Context(), dual.Level{Memory: 0.6, Steps: 30, Eta: 0.5, EtaLast: 0.05}, nil)
	asked := a.Ceiling(600)
	a.Relax(p, o.Shares[p].Share)
	reached := a.Ceiling(600)
	a.Relax(p, 0)
	dropped := a.Ceiling(600)
	c := legal(t, k, "missed share", o.Plan.Exposures)
	t.Logf("coverage %.4f; ceiling with the share asked %.4f, reached %.4f, none %.4f; told %.4f", c, asked, reached, dropped, o.Ceiling)
	if !(asked < reached && reached < dropped) {
		t.Errorf("ceilings %.6f with the share asked, %.6f with what was reached, %.6f without", asked, reached, dropped)
	}
	if c > reached || c > o.Ceiling {
		t.Errorf("coverage %.6f is over the ceiling %.6f or %.6f", c, reached, o.Ceiling)
	}
}
