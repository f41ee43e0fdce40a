// Command bench measures the optimiser: families of surveys and seeds in one
// table of coverage, ceiling, gap, time and memory. It is for contributors;
// the table goes into the contributor's guide with its date.
package main

import (
	"context"
	"flag"
	"fmt"
	"os"
	"runtime"
	"runtime/pprof"
	"strings"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

func main() {
	if err := bench(); err != nil {
		fmt.Fprintln(os.Stderr, "bench:", err)
		os.Exit(1)
	}
}

// bench runs what the flags ask for.
func bench() error {
	families := flag.String("families", strings.Join(starter.FamilyNames(), ","), "families, or survey folders, separated by commas")
	seeds := flag.Int("seeds", 1, "seeds of each family")
	effort := flag.String("effort", "normal", "quick, normal or thorough")
	workers := flag.Int("workers", runtime.NumCPU(), "workers")
	phases := flag.Bool("phases", false, "print when each phase ended")
	profile := flag.String("cpuprofile", "", "file for a CPU profile")
	flag.Parse()
	if *profile != "" {
		f, err := os.Create(*profile)
		if err != nil {
			return err
		}
		if err := pprof.StartCPUProfile(f); err != nil {
			return err
		}
		defer pprof.StopCPUProfile()
	}
	fmt.Println("| survey | seed | effort | coverage | ceiling | gap % | visits | seconds | MB |")
	fmt.Println("| --- | --- | --- | --- | --- | --- | --- | --- | --- |")
	for _, name := range strings.Split(*families, ",") {
		for seed := uint64(1); seed <= uint64(*seeds); seed++ {
			if err := run(name, seed, *effort, *workers, *phases); err != nil {
				return fmt.Errorf("%s: %w", name, err)
			}
		}
	}
	return nil
}

func load(name string, seed uint64) (*survey.Survey, error) {
	for _, f := range starter.FamilyNames() {
		if f == name {
			return starter.Family(name, seed), nil
		}
	}
	sv, _, issues := surveyfile.Load(name)
	if sv == nil {
		return nil, fmt.Errorf("%d faults, the first: %v", surveyfile.Faults(issues), issues[0])
	}
	return sv, nil
}

func run(name string, seed uint64, effort string, workers int, phases bool) error {
	begin := time.Now()
	sv, err := load(name, seed)
	if err != nil {
		return err
	}
	last := ""
	say := func(what string) {
		if phases {
			fmt.Fprintf(os.Stderr, "%8.2f s  %s\n", time.Since(begin).Seconds(), what)
		}
	}
	say("survey read")
	clock := ephemeris.NewClock(nil, sv.Orientation)
	exact := visibility.NewExact(clock)
	cal := constraints.NewCalendar(sv, exact, nil)
	say("calendar")
	sky := constraints.Tables(sv, exact, workers)
	say("sky")
	win, err := constraints.NewWindows(context.Background(), sv, sky, cal, workers)
	if err != nil {
		return err
	}
	say("windows")
	out, err := scheduler.Solve(context.Background(),
		scheduler.Input{Survey: sv, Sky: sky, Calendar: cal, Windows: win, Workers: workers},
		scheduler.Params{Effort: effort, Seed: seed, Progress: func(p model.Progress) {
			line := fmt.Sprintf("%-16s %5d/%d  coverage %.6f  ceiling %.6f", p.Phase, p.Done, p.Total, p.Coverage, p.Ceiling)
			if p.Phase != last || p.Done == p.Total {
				say(line)
			}
			last = p.Phase
		}})
	if err != nil {
		return err
	}
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	fmt.Printf("| %s | %d | %s | %.6f | %.6f | %.2f | %d | %.1f | %d |\n", name, seed, effort, out.Coverage, out.Ceiling,
		100*model.Gap(out.Coverage, out.Ceiling), len(out.Plan.Exposures), time.Since(begin).Seconds(), m.Sys>>20)
	for _, s := range out.Stats {
		say(fmt.Sprintf("%-18s %d", s.Name, s.Value))
	}
	return nil
}
