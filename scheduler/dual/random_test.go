package dual_test

import (
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
)

// surveys asks for a long run:
//
//	go test ./scheduler/dual -run NoPlanBeatsRandomPrices -surveys 10000 -timeout 0
var (
	surveys = flag.Int("surveys", 0, "how many random surveys TestNoPlanBeatsRandomPrices takes; 0: a few")
	first   = flag.Uint64("first", 0, "the first of their seeds")
)

// TestNoPlanBeatsRandomPrices: no legal plan is above the ceiling at any
// prices, count multipliers, share multipliers and bin widths. Plans come from
// the search and are then made hostile: visits are pushed to the last
// microsecond that the judge, on the exact path, allows.
func TestNoPlanBeatsRandomPrices(t *testing.T) {
	n := *surveys
	if n == 0 {
		n = 12
		if testing.Short() {
			n = 5
		}
	}
	var c counts
	for i := range n {
		seed := *first + uint64(i)
		if !t.Run(fmt.Sprint(seed), func(t *testing.T) { c.survey(t, seed) }) && i > 100 {
			break // a long run that fails needn't go on
		}
	}
	t.Logf("%d surveys, %d with a plan, %d visits pushed to an edge, %d better for it; nearest ceiling within %.2g of the plan", n, c.plans, c.pushed, c.better, c.nearest)
	if c.plans < n/3 || c.pushed == 0 {
		t.Errorf("only %d plans, %d visits pushed: the test has no teeth", c.plans, c.pushed)
	}
}

// counts is what a run did.
type counts struct {
	plans, pushed, better int
	nearest               float64 // least ceiling / coverage - 1
}

func (c *counts) survey(t *testing.T, seed uint64) {
	sv := trial.Survey(seed + 1_000_000)
	if seed%4 == 0 {
		sv = trial.Micro(seed + 1_000_000)
	}
	k, err := trial.Build(t.Context(), sv, 2)
	if err != nil {
		t.Fatal(err)
	}
	out, err := scheduler.Solve(t.Context(), scheduler.Input{Survey: sv, Sky: k.Sky, Calendar: k.Calendar, Windows: k.Windows, Workers: 2}, scheduler.Params{Effort: "quick", Seed: seed})
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(seed, 77))
	list := slices.Clone(out.Plan.Exposures)
	if len(list) == 0 {
		return
	}
	rep, err := k.Check(t.Context(), list)
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range rep.Breaches {
		t.Fatalf("the plan isn't legal: %s: %s", b.Rule, b.What)
	}
	coverage := rep.Score.Coverage
	if coverage > out.Ceiling {
		t.Errorf("the plan earns %.12g, its own ceiling is %.12g", coverage, out.Ceiling)
	}
	list, coverage = c.push(t, k, list, coverage, r)
	c.plans++
	if coverage > out.Ceiling && !missed(out) {
		t.Errorf("the pushed plan earns %.12g, the ceiling is %.12g", coverage, out.Ceiling)
	}
	c.bound(t, k, list, coverage, r)
}

// missed reports whether a plan misses a share.
func missed(o *model.Outcome) bool {
	return slices.ContainsFunc(o.Shares, func(s model.ShareOutcome) bool { return s.Breach > 0 })
}

// bound holds a plan against ceilings at random multipliers, with shares that
// it keeps.
func (c *counts) bound(t *testing.T, k *trial.Kit, list []model.Exposure, coverage float64, r *rand.Rand) {
	t.Helper()
	sv := k.Survey
	time := make([]float64, len(sv.Programs))
	var all float64
	for i := range list {
		s := model.Sec(list[i].End - list[i].Start)
		time[sv.Fields[list[i].Field].Program] += s
		all += s
	}
	for i := range sv.Programs {
		pr := &sv.Programs[i]
		pr.ShareMin, pr.ShareMax = 0, 1
		if share := time[i] / all; r.IntN(2) == 0 {
			pr.ShareMin, pr.ShareMax = share*math.Sqrt(r.Float64()), share+(1-share)*r.Float64()*r.Float64()
		}
	}
	scale := typicalRate(k.Problem)
	for range 4 {
		a := dual.NewAscent(k.Problem)
		randomRates(a, r, scale)
		a.SetMu(func(i int) float64 { return k.Problem.Wants[i].Value * r.Float64() * float64(r.IntN(2)) })
		if r.IntN(2) == 0 {
			a.SetShareRates(func(int) (low, high float64) {
				return scale * r.Float64() * float64(r.IntN(2)), scale * r.Float64() * float64(r.IntN(2))
			})
		}
		width := []float64{60, 150, 300, 600, 731}[r.IntN(5)]
		b := a.Ceiling(width)
		if coverage > b {
			t.Errorf("bins of %g s: the plan earns %.12g, over the ceiling %.12g by %.3g", width, coverage, b, coverage-b)
		}
		if coverage > 0 {
			if room := b/coverage - 1; c.nearest == 0 || room < c.nearest {
				c.nearest = room
			}
		}
	}
}

// push moves some visits, whole sets together, as far to either side as the
// judge allows, to the microsecond, and keeps what earns at least as much.
func (c *counts) push(t *testing.T, k *trial.Kit, list []model.Exposure, coverage float64, r *rand.Rand) ([]model.Exposure, float64) {
	t.Helper()
	j, err := audit.NewJudge(t.Context(), k.Survey, k.Exact, nil, 1)
	if err != nil {
		t.Fatal(err)
	}
	judge := func(try []model.Exposure) (float64, bool) {
		rep, err := j.Check(t.Context(), audit.Plan{Visits: trial.Rows(k.Survey, try), LegalityOnly: true})
		if err != nil {
			t.Fatal(err)
		}
		return rep.Score.Coverage, rep.Legal()
	}
	for range 3 {
		i := r.IntN(len(list))
		side := int64(1 - 2*r.IntN(2))
		moved := func(by int64) []model.Exposure {
			out := slices.Clone(list)
			for m := range out {
				if m == i || out[m].Set != 0 && out[m].Set == out[i].Set {
					out[m].Start += side * by
					out[m].End += side * by
				}
			}
			slices.SortFunc(out, func(a, b model.Exposure) int { return int(a.Start - b.Start) })
			return out
		}
		lo, hi := int64(0), int64(4*3600)*model.Micro
		for hi-lo > 1 {
			m := lo + (hi-lo)/2
			if hi-lo > 64*model.Micro {
				m = lo + (hi-lo)/3 // edges lie near more often than far
			}
			if _, ok := judge(moved(m)); ok {
				lo = m
			} else {
				hi = m
			}
		}
		if lo == 0 {
			continue
		}
		c.pushed++
		if got, ok := judge(moved(lo)); ok && (got >= coverage || r.IntN(4) == 0) {
			if got > coverage {
				c.better++
			}
			list, coverage = moved(lo), got
		}
	}
	return list, coverage
}
