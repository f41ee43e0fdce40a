package main

import (
	"context"
	"fmt"
	"os"
	"time"

	"nightwright/constraints"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// run plans one survey and prints its row.
func run(name string, seed uint64, a *ask) error {
	resetPeak()
	begin, cpu := time.Now(), userSeconds()
	sv, err := load(name, seed, a.cut)
	if err != nil {
		return err
	}
	last := ""
	say := func(what string) {
		if a.phases {
			fmt.Fprintf(os.Stderr, "%8.2f s  %s\n", time.Since(begin).Seconds(), what)
		}
	}
	say("survey read")
	clock := ephemeris.NewClock(nil, sv.Orientation)
	exact := visibility.NewExact(clock)
	cal := constraints.NewCalendar(sv, exact, nil)
	say("calendar")
	sky := constraints.Tables(sv, exact, a.workers)
	say("sky")
	win, err := constraints.NewWindows(context.Background(), sv, sky, cal, a.workers)
	if err != nil {
		return err
	}
	say("windows")
	in := scheduler.Input{Survey: sv, Sky: sky, Calendar: cal, Windows: win, Workers: a.workers}
	out, err := scheduler.Solve(context.Background(), in,
		scheduler.Params{Effort: a.effort, Seed: seed, Progress: func(p model.Progress) {
			line := fmt.Sprintf("%-16s %5d/%d  coverage %.6f  ceiling %.6f", p.Phase, p.Done, p.Total, p.Coverage, p.Ceiling)
			if p.Phase != last || p.Done == p.Total {
				say(line)
			}
			last = p.Phase
		}})
	if err != nil {
		return err
	}
	a.means.gap = append(a.means.gap, 100*model.Gap(out.Coverage, out.Ceiling))
	fmt.Printf("| %s | %d | %s | %.4f | %.4f | %.2f |", name, seed, a.effort, out.Coverage, out.Ceiling, 100*model.Gap(out.Coverage, out.Ceiling))
	for _, p := range out.Parts {
		fmt.Printf(" %.2f |", 100*p.Worth/max(out.Ceiling, 1e-12))
	}
	fmt.Printf(" %d | %.1f | %.1f | %s |\n", len(out.Plan.Exposures), time.Since(begin).Seconds(), userSeconds()-cpu, peak())
	for _, s := range out.Stats {
		say(fmt.Sprintf("%-18s %d", s.Name, s.Value))
	}
	if a.exact == 0 && a.lp == 0 {
		return nil
	}
	p, err := model.NewProblem(sv, sky, cal, win, a.workers)
	if err != nil {
		return err
	}
	o := outside{p: p, exact: exact, out: out, ask: a}
	if a.exact > 0 {
		if err := o.bracket(a.exact); err != nil {
			return err
		}
	}
	if a.lp > 0 {
		return o.relaxation(a.lp)
	}
	return nil
}
