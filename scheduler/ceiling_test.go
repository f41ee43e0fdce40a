package scheduler_test

import (
	"cmp"
	"math/rand/v2"
	"slices"
	"testing"

	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
)

// randomPlan takes visits at random until nothing more fits easily, and drops
// what the judge objects to: a legal plan that owes nothing to the search.
func randomPlan(t *testing.T, k *trial.Kit, r *rand.Rand) []model.Exposure {
	t.Helper()
	p := k.Problem
	var list []model.Exposure
	set := int64(0)
	for range 30 {
		w := &p.Wants[r.IntN(len(p.Wants))]
		if len(w.Scopes) == 0 {
			continue
		}
		scope, night := w.Scopes[r.IntN(len(w.Scopes))], r.IntN(p.Nights)
		windows, open := p.Outer(nil, w.Unit, p.Scopes[scope].Class, night), p.OpenOuter(int(scope), night)
		if len(windows) == 0 || len(open) == 0 {
			continue
		}
		win, o := windows[r.IntN(len(windows))], open[r.IntN(len(open))]
		lo, hi := max(win.From, o.From), min(win.To, o.To)-p.Length(&w.Steps[0], scope)
		if hi < lo {
			continue
		}
		at := lo + r.Int64N(hi-lo+1)
		if r.IntN(3) == 0 {
			at = []int64{lo + 5000, hi - 5000, lo + 2e6, hi - 2e6}[r.IntN(4)]
		}
		if len(w.Steps) > 1 {
			set++
		}
		for j := range w.Steps {
			if j > 0 {
				at += w.Steps[j].After
			}
			e := model.Exposure{
				Field: w.Field, Demand: w.Demand, Step: int32(j), Telescope: scope, Night: int32(night), State: model.Planned,
				Start: at, End: at + p.Length(&w.Steps[j], scope), Visit: int64(len(list) + 1),
			}
			if len(w.Steps) > 1 {
				e.Set = set
			}
			list = append(list, e)
		}
	}
	for range 12 {
		rep, err := k.Check(t.Context(), list)
		if err != nil {
			t.Fatal(err)
		}
		if rep.Legal() {
			break
		}
		bad := map[int64]bool{}
		for i := range rep.Breaches {
			if b := &rep.Breaches[i]; b.Visit > 0 {
				bad[b.Visit] = true
			} else {
				bad[list[0].Visit] = true
			}
		}
		sets := map[int64]bool{}
		for i := range list {
			if bad[list[i].Visit] && list[i].Set != 0 {
				sets[list[i].Set] = true
			}
		}
		list = slices.DeleteFunc(list, func(e model.Exposure) bool { return bad[e.Visit] || sets[e.Set] })
	}
	slices.SortFunc(list, func(a, b model.Exposure) int { return cmp.Compare(a.Start, b.Start) })
	return list
}

// TestNoPlanBeatsAnyCeiling: the ceiling of each effort is above the plans of
// every effort and seed, and above random ones, all counted on the exact path.
func TestNoPlanBeatsAnyCeiling(t *testing.T) {
	met := 0
	for seed := range uint64(max(4, rounds(7, 400))) {
		k := build(t, trial.Survey(seed+9000), 2)
		quick, normal := solve(t, k, 2, "quick", seed), solve(t, k, 2, "normal", seed+1)
		ceilings := []float64{quick.Ceiling, normal.Ceiling}
		plans := [][]model.Exposure{quick.Plan.Exposures, normal.Plan.Exposures}
		r := rand.New(rand.NewPCG(seed, 5))
		for range 4 {
			plans = append(plans, randomPlan(t, k, r))
		}
		for i, list := range plans {
			rep, err := k.Check(t.Context(), list)
			if err != nil {
				t.Fatal(err)
			}
			if !rep.Legal() {
				t.Errorf("seed %d, plan %d is not legal: %s", seed, i, rep.Breaches[0].What)
				continue
			}
			if rep.Score.Coverage > 0 && i > 1 {
				met++
			}
			for e, c := range ceilings {
				if rep.Score.Coverage > c {
					t.Errorf("seed %d: plan %d has coverage %.12g, over ceiling %d of %.12g", seed, i, rep.Score.Coverage, e, c)
				}
			}
		}
	}
	if met < 5 {
		t.Errorf("only %d random plans earn anything", met)
	}
}
