package scheduler_test

import (
	"math"
	"os"
	"os/exec"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
	"nightwright/scheduler/trial/slots"
)

// TestWhatWasDoneBefore: visits from before the period count, and gap.min holds
// against them.
func TestWhatWasDoneBefore(t *testing.T) {
	sv := demo(t, 2, 20)
	for p := range sv.Programs {
		for d := range sv.Programs[p].Demands {
			sv.Programs[p].Demands[d].GapMin = 30 * 3600
		}
	}
	s := &season{kit: build(t, sv, 2)}
	free := solve(t, s.kit, 2, "quick", 1)
	// Each single visit of the first night was done already, a day before.
	was := map[[2]int32]int64{}
	for _, e := range free.Plan.Exposures {
		if e.Set != 0 || e.Night != 0 {
			continue
		}
		e.Start, e.End, e.Night = e.Start-86400e6, e.End-86400e6, e.Night-1
		s.done(0.5, e)
		was[[2]int32{e.Field, e.Demand}] = e.Start
	}
	for i := range s.past.Visits {
		s.past.Visits[i].Seconds = 0 // outside of the period
	}
	in := input(s.kit, 2)
	in.Past = &s.past
	out, err := scheduler.Solve(t.Context(), in, scheduler.Params{Effort: "quick", Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	c := s.judge(t, "a plan with a past", &scheduler.Replanned{Outcome: out, CeilingHeld: out.Ceiling})
	met, credited := 0, 0.0
	for i := range s.past.Visits {
		v := &s.past.Visits[i]
		credited += s.kit.Problem.Wants[s.kit.Problem.WantOf(v.Field, v.Demand)].Value * v.Quality
	}
	for _, e := range out.Plan.Exposures {
		at, ok := was[[2]int32{e.Field, e.Demand}]
		if !ok || e.State == model.Done {
			continue
		}
		if met++; e.Start-at < 30*3600e6 {
			t.Errorf("field %d starts %.1f h after what was done; gap.min is 30 h", e.Field, float64(e.Start-at)/3600e6)
		}
	}
	if len(was) < 5 || met == 0 || c < credited {
		t.Errorf("%d visits done before, worth %g; coverage %g, %d later ones: the test tests nothing", len(was), credited, c, met)
	}
}

// TestExactRestOfSeason: the optimum of the rest of small seasons, by glpsol
// (GLPK 5.0) over the favourable programme that every legal plan is a solution of,
// bounds what a re-plan gets.
func TestExactRestOfSeason(t *testing.T) {
	if _, err := exec.LookPath("glpsol"); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("glpsol is not installed (Debian: glpk-utils), and NIGHTWRIGHT_REQUIRE_ALL is 1")
		}
		t.Skip("glpsol is not installed (Debian: glpk-utils)")
	}
	told := 0
	for seed := range uint64(rounds(12, 200)) {
		sv := trial.Survey(seed + 3000)
		sv.LastNight = min(sv.LastNight, sv.FirstNight+survey.Day(1))
		s := start(t, sv)
		list := s.plan.Plan.Exposures
		if len(list) < 2 || len(list) > 40 {
			continue
		}
		now := list[len(list)/3].Start
		n := 0
		s.follow(now, func(*model.Exposure) (bool, float64) { n++; return n%3 != 0, 0.4 })
		out := s.replan(t, s.earlier(), scheduler.ReplanParams{Stability: float64(seed % 2)})
		c := s.judge(t, "exact", out)
		g := model.Given{From: now}
		for i := range s.past.Visits {
			g.Visits = append(g.Visits, s.past.Visits[i].GivenVisit)
		}
		// What is under way began before now: the bound lets it start anew.
		for _, e := range out.Plan.Exposures {
			if e.State != model.Done {
				g.From = min(g.From, e.Start)
			}
		}
		p := s.kit.Problem.Take(g)
		pr := slots.Favourable(p, s.kit.Exact, 300, nil)
		if pr.Width() > 3000 {
			continue
		}
		best, err := pr.Solve(t.Context(), "glpsol", 60, false)
		if err != nil {
			t.Logf("seed %d: %v", seed, err)
			continue
		}
		told++
		bound := p.Earned + best.Value
		t.Logf("seed %d: %d exposures, coverage %.6f, optimum at most %.6f, ceiling %.6f", seed, len(list), c, bound, out.Ceiling)
		if c > bound+1e-6 || math.IsNaN(bound) {
			t.Errorf("seed %d: coverage %.9f is over the optimum's bound %.9f", seed, c, bound)
		}
	}
	if told < 3 && !testing.Short() {
		t.Errorf("%d seasons were solved; want 3 at least", told)
	}
}
