package main

import (
	"context"
	"fmt"
	"math/rand/v2"
	"syscall"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// replans measures re-planning: a survey is planned, then site-nights are lost
// one at a time, all before them done as planned, and the rest is planned again
// at several stabilities. The sweep over all fields that stability 0 adds is what
// the others are held against.
func replans(name string, seed uint64, a *ask, nights int) error {
	effort, workers := a.effort, a.workers
	sv, err := load(name, seed, a.cut)
	if err != nil {
		return err
	}
	exact := visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation))
	plain := constraints.NewCalendar(sv, exact, nil)
	sky := constraints.Tables(sv, exact, workers)
	win, err := constraints.NewWindows(context.Background(), sv, sky, plain, workers)
	if err != nil {
		return err
	}
	in := scheduler.Input{Survey: sv, Sky: sky, Calendar: plain, Windows: win, Workers: workers}
	out, err := scheduler.Solve(context.Background(), in, scheduler.Params{Effort: effort, Seed: seed})
	if err != nil {
		return err
	}
	old := &scheduler.Earlier{Exposures: out.Plan.Exposures, Prices: out.Prices, Done: map[int64]bool{}}
	for f := range sv.Fields {
		old.Weights, old.Wanted = append(old.Weights, sv.WeightOf(&sv.Fields[f])), append(old.Wanted, int32(sv.Wanted(&sv.Fields[f])))
	}
	for _, e := range old.Exposures {
		old.Visit, old.Set = max(old.Visit, e.Visit), max(old.Set, e.Set)
	}
	rng := rand.New(rand.NewPCG(seed, 5))
	stabilities := []float64{0, 0.1, 0.25, 0.5, 1}
	sums := make([]measured, len(stabilities))
	for range nights {
		site, night := rng.IntN(len(sv.Sites)), 1+rng.IntN(max(1, sv.Nights()*2/3))
		lossy := in
		lossy.Past, lossy.Calendar = lostNight(sv, exact, plain, out.Plan, site, night)
		if lossy.Windows, err = constraints.NewWindows(context.Background(), sv, sky, lossy.Calendar, workers); err != nil {
			return err
		}
		for i, x := range stabilities {
			if err := sums[i].take(lossy, old, x); err != nil {
				return err
			}
		}
	}
	fmt.Println("| survey | stability | lost visits | won back of the lost worth | of what the sweep wins | moved or dropped | deciding, CPU s | whole, CPU s |")
	fmt.Println("| --- | --- | --- | --- | --- | --- | --- | --- |")
	for i, x := range stabilities {
		m, n := &sums[i], float64(nights)
		fmt.Printf("| %s, seed %d, %s | %g | %.1f | %.1f %% | %.1f %% | %.1f | %.2f | %.2f |\n", name, seed, effort, x, m.lost/n, 100*m.won/m.worth, 100*m.won/sums[0].won, m.moved/n, m.decide/n, m.whole/n)
	}
	return nil
}

// measured sums re-plans up.
type measured struct{ lost, worth, won, moved, decide, whole float64 }

func (m *measured) take(in scheduler.Input, old *scheduler.Earlier, stability float64) error {
	begun, from, to := processor(), 0.0, 0.0
	out, err := scheduler.Replan(context.Background(), in, old, scheduler.ReplanParams{
		Hold: 24 * 3600e6, Stability: stability,
		Progress: func(p model.Progress) {
			switch {
			case p.Phase == "winning back" && p.Done == 0:
				from = processor()
			case p.Phase == "ceiling" && p.Done == 0:
				to = processor()
			}
		},
	})
	if err != nil {
		return err
	}
	t := &out.Tally
	m.lost += float64(t.Lost)
	m.worth += t.LostC
	m.won += t.WonC
	m.moved += float64(t.Moved + t.Dropped)
	m.decide += to - from
	m.whole += processor() - begun
	return nil
}

// processor is the CPU time that the program took so far, s.
func processor() float64 {
	var r syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &r) != nil {
		return float64(time.Now().UnixMicro()) * 1e-6
	}
	return float64(r.Utime.Sec) + float64(r.Utime.Usec)*1e-6
}

// lostNight has everything before the end of a site's night done as planned, but
// for that site in that night.
func lostNight(sv *survey.Survey, exact *visibility.Exact, cal *constraints.Calendar, plan *model.Plan, site, night int) (*scheduler.Past, *constraints.Calendar) {
	in := cal.Night(site, night)
	past := &scheduler.Past{From: model.MicroOf(in.To)}
	losses := make([][]visibility.Interval, len(sv.Telescopes))
	for _, t := range sv.Sites[site].Telescopes {
		losses[t] = []visibility.Interval{in}
	}
	sets := map[int64]int{}
	for _, e := range plan.Exposures {
		lost := sv.Telescopes[e.Telescope].Site == site && int(e.Night) == night
		if lost || e.End > past.From {
			continue
		}
		d := &sv.Programs[sv.Fields[e.Field].Program].Demands[e.Demand]
		e.State, e.Quality = model.Done, 0.7
		k, ok := sets[e.Set]
		if !ok || e.Set == 0 {
			k = len(past.Visits)
			sets[e.Set] = k
			past.Visits = append(past.Visits, scheduler.PastVisit{GivenVisit: model.GivenVisit{
				Field: e.Field, Demand: e.Demand, Night: e.Night, Start: e.Start, Quality: e.Quality,
			}})
		}
		v := &past.Visits[k]
		v.Seconds += model.Sec(e.End - e.Start)
		v.Exposures = append(v.Exposures, int32(len(past.Exposures)))
		v.Counts = len(v.Exposures) == len(d.Exposures)
		v.Binds = v.Counts
		past.Exposures = append(past.Exposures, e)
	}
	return past, constraints.NewCalendar(sv, exact, losses)
}
