package slots_test

import (
	"fmt"
	"math"
	"os"
	"os/exec"
	"testing"

	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
	"nightwright/scheduler/trial/slots"
)

// requireAll is set where no test may be skipped.
var requireAll = os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1"

// needSolvers skips where an exact solver is missing.
func needSolvers(t *testing.T) {
	t.Helper()
	for _, s := range slots.Solvers() {
		if _, err := exec.LookPath(s); err != nil {
			if requireAll {
				t.Fatalf("%s is not installed (Debian: glpk-utils, coinor-cbc), and NIGHTWRIGHT_REQUIRE_ALL is 1", s)
			}
			t.Skipf("%s is not installed (Debian: glpk-utils, coinor-cbc)", s)
		}
	}
}

// seconds is the most a solver may take for one programme; those of the seeds
// here need a few at most.
const seconds = 400

// optimum has both solvers find a programme's optimum: they must agree.
func optimum(t *testing.T, pr *slots.Program, what string, seed uint64) *slots.Solution {
	t.Helper()
	var first *slots.Solution
	for _, solver := range slots.Solvers() {
		s, err := pr.Solve(t.Context(), solver, seconds, false)
		if err != nil {
			t.Fatalf("seed %d, %s: %v", seed, what, err)
		}
		if first == nil {
			first = s
		} else if math.Abs(s.Value-first.Value) > 1e-6*(1+first.Value) {
			t.Errorf("seed %d, %s: glpsol says %.9f, cbc %.9f", seed, what, first.Value, s.Value)
		}
	}
	return first
}

// TestExactOptima holds plans and ceilings against the optima of general exact
// solvers, glpsol (GLPK 5.0) and cbc (COIN-OR 2.10): the plan can't be above the
// favourable programme's, the ceiling not below the restricted one's, and the
// restricted optimum is a legal plan by the judge. All 60 seeds with
// NIGHTWRIGHT_LONG=1; else the first of them.
func TestExactOptima(t *testing.T) {
	needSolvers(t)
	last := uint64(8)
	switch {
	case os.Getenv("NIGHTWRIGHT_LONG") != "":
		last = 60
	case testing.Short():
		last = 3
	}
	var n, planSum, ceilingSum float64
	leastPlan, mostCeiling := math.Inf(1), 0.0
	for seed := range last {
		var plan, ceiling, r, u float64
		t.Run(fmt.Sprint(seed), func(t *testing.T) { plan, ceiling, r, u = exact(t, seed) })
		if r == 0 {
			if plan > 0 {
				t.Errorf("seed %d: the plan earns %g where the grid has nothing", seed, plan)
			}
			continue
		}
		n++
		planSum += plan / r
		ceilingSum += ceiling / u
		leastPlan, mostCeiling = math.Min(leastPlan, plan/r), math.Max(mostCeiling, ceiling/u)
	}
	t.Logf("plan / R: mean %.4f, least %.4f; ceiling / U: mean %.4f, most %.4f; %g surveys", planSum/n, leastPlan, ceilingSum/n, mostCeiling, n)
}

// gridOf is the grid of starts, s: coarser where sets make many columns, or
// shares and keep_free hard rows.
func gridOf(p *model.Problem) float64 {
	for i := range p.Scopes {
		if p.Scopes[i].KeepFree > 0 {
			return 600
		}
	}
	if p.Survey.Programs[0].ShareMin > 0 {
		return 600
	}
	for i := range p.Wants {
		if len(p.Wants[i].Steps) > 1 {
			return 600
		}
	}
	return 300
}

// exact solves one survey in every way.
func exact(t *testing.T, seed uint64) (plan, ceiling, r, u float64) {
	t.Helper()
	k, err := trial.Build(t.Context(), trial.Micro(seed), 2)
	if err != nil {
		t.Fatal(err)
	}
	out, err := scheduler.Solve(t.Context(), scheduler.Input{Survey: k.Survey, Sky: k.Sky, Calendar: k.Calendar, Windows: k.Windows, Workers: 2}, scheduler.Params{Effort: "normal", Seed: seed})
	if err != nil {
		t.Fatal(err)
	}
	rep, err := k.Check(t.Context(), out.Plan.Exposures)
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range rep.Breaches {
		t.Errorf("seed %d, the plan: %s: %s", seed, b.Rule, b.What)
	}
	plan, ceiling = rep.Score.Coverage, out.Ceiling
	// A bound that the plan misses counts as far as it was reached.
	shares, breach := slots.Asked(k.Problem), ""
	for i, s := range out.Shares {
		if s.Breach > 0 {
			shares[i].Min, shares[i].Max = math.Min(shares[i].Min, s.Share), math.Max(shares[i].Max, s.Share)
			breach = " (a share's bound was missed)"
		}
	}
	grid := gridOf(k.Problem)
	low := slots.Restricted(k.Problem, k.Exact, grid, shares)
	within := optimum(t, low, "restricted", seed)
	high := slots.Favourable(k.Problem, k.Exact, grid, shares)
	beyond := optimum(t, high, "favourable", seed)
	r, u = within.Value, beyond.Value

	// The restricted optimum is a legal plan and earns what the solver says.
	rep, err = k.Check(t.Context(), low.Exposures(k.Problem, within.Taken))
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range rep.Breaches {
		t.Errorf("seed %d, the restricted optimum: %s: %s", seed, b.Rule, b.What)
	}
	if d := math.Abs(rep.Score.Coverage - r); d > 1e-6 {
		t.Errorf("seed %d: the restricted optimum is %.9f, the judge counts %.9f", seed, r, rep.Score.Coverage)
	}
	const tolerance = 2e-6 // the solvers' own
	if plan > u+tolerance {
		t.Errorf("seed %d: the plan earns %.9f, over the favourable optimum %.9f", seed, plan, u)
	}
	if r > ceiling+tolerance {
		t.Errorf("seed %d: the restricted optimum %.9f is over the ceiling %.9f", seed, r, ceiling)
	}
	if r > u+tolerance {
		t.Errorf("seed %d: the restricted optimum %.9f is over the favourable one %.9f", seed, r, u)
	}
	t.Logf("seed %2d: %5d columns; R %.5f  plan %.5f (%.4f of R)  U %.5f  ceiling %.5f (%.4f of U)%s",
		seed, low.Width(), r, plan, plan/r, u, ceiling, ceiling/u, breach)
	return plan, ceiling, r, u
}
