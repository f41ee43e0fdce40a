// Command bench measures the optimiser: families of surveys and seeds in one
// table of coverage, ceiling, gap and what it is made of, time and memory. It is
// for contributors; the table goes into the contributor's guide with its date.
package main

import (
	"flag"
	"fmt"
	"os"
	"runtime"
	"runtime/pprof"
	"strings"

	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scenarios/surveyfile"
)

func main() {
	if err := bench(); err != nil {
		fmt.Fprintln(os.Stderr, "bench:", err)
		os.Exit(1)
	}
}

// ask is what the flags ask for.
type ask struct {
	effort  string
	workers int
	phases  bool
	exact   int // s that an exact solver may take; 0: none
	lp      int // the same for the linear relaxation
	grid    float64
	means   means
	cut     cut
}

// cut makes a survey smaller, so that an exact solver gets it; 0: as it is.
type cut struct{ nights, fields, sites int }

// bench runs what the flags ask for.
func bench() error {
	var a ask
	families := flag.String("families", strings.Join(starter.FamilyNames(), ","), "families, or survey folders, separated by commas")
	seeds := flag.Int("seeds", 1, "seeds of each family")
	flag.StringVar(&a.effort, "effort", "normal", "quick, normal or thorough")
	flag.IntVar(&a.workers, "workers", runtime.NumCPU(), "workers")
	flag.BoolVar(&a.phases, "phases", false, "print when each phase ended")
	flag.IntVar(&a.exact, "exact", 0, "bracket the best plan by glpsol and cbc, each for at most so many seconds: for families such as tiny")
	flag.Float64Var(&a.grid, "grid", 300, "step of the starts of the exact programmes, s")
	flag.IntVar(&a.lp, "lp", 0, "compare the ceiling with the slot model's linear relaxation by glpsol and cbc, each for at most so many seconds")
	flag.IntVar(&a.cut.nights, "nights", 0, "take only so many nights")
	flag.IntVar(&a.cut.fields, "fields", 0, "take only so many fields")
	flag.IntVar(&a.cut.sites, "sites", 0, "take only so many sites")
	lost := flag.Int("replans", 0, "measure re-planning after so many lost site-nights instead")
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
	if *lost > 0 {
		for _, name := range strings.Split(*families, ",") {
			for seed := uint64(1); seed <= uint64(*seeds); seed++ {
				if err := replans(name, seed, &a, *lost); err != nil {
					return fmt.Errorf("%s: %w", name, err)
				}
			}
		}
		return nil
	}
	fmt.Println("The gap's parts are in points, hundredths of the ceiling: slews, filter changes, idle time, moment, choice.")
	fmt.Println()
	fmt.Println("| survey | seed | effort | coverage | ceiling | gap % | slews | filters | idle | moment | choice | exposures | s | CPU s | MB |")
	fmt.Println("| --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- |")
	for _, name := range strings.Split(*families, ",") {
		for seed := uint64(1); seed <= uint64(*seeds); seed++ {
			if err := run(name, seed, &a); err != nil {
				return fmt.Errorf("%s: %w", name, err)
			}
		}
		a.means.print(name)
	}
	return nil
}

func load(name string, seed uint64, c cut) (*survey.Survey, error) {
	sv := starter.Family(name, seed)
	if sv == nil {
		var issues []surveyfile.Issue
		if sv, _, issues = surveyfile.Load(name); sv == nil {
			return nil, fmt.Errorf("%d faults, the first: %v", surveyfile.Faults(issues), issues[0])
		}
	}
	if c.nights > 0 {
		sv.LastNight = min(sv.LastNight, sv.FirstNight+survey.Day(c.nights)-1)
	}
	if c.fields > 0 {
		sv.Fields = sv.Fields[:min(c.fields, len(sv.Fields))]
	}
	if c.sites > 0 && c.sites < len(sv.Sites) {
		sv.Sites = sv.Sites[:c.sites]
		var n int
		for n < len(sv.Telescopes) && sv.Telescopes[n].Site < c.sites {
			n++
		}
		sv.Telescopes = sv.Telescopes[:n]
	}
	return sv, nil
}
