package main

import (
	"cmp"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/tables"
)

// planFlags are the flags of commands that plan.
type planFlags struct {
	effort string
	seed   uint64
	limit  time.Duration
}

func (f *planFlags) add(flags *pflag.FlagSet, effort string) {
	flags.StringVar(&f.effort, "effort", effort, "how long to search, `HOW`: "+strings.Join(work.Efforts(), ", "))
	flags.Uint64Var(&f.seed, "seed", 0, "seed `N` of everything random (default: the survey's)")
	flags.DurationVar(&f.limit, "time-limit", 0, "stop searching after `TIME`, such as 90s; such a plan can't be repeated")
	flags.Lookup("time-limit").DefValue = "0s"
}

// ask turns the flags into what the job takes.
func (f *planFlags) ask(cmd *cobra.Command, out string) (work.PlanAsk, error) {
	ask := work.PlanAsk{Out: out, Effort: f.effort, TimeLimit: f.limit}
	if !slices.Contains(work.Efforts(), f.effort) {
		return ask, work.Inputf("--effort is %q; want %s", f.effort, strings.Join(work.Efforts(), ", "))
	}
	if f.limit < 0 {
		return ask, work.Inputf("--time-limit is %v; want more than 0, such as 90s", f.limit)
	}
	if cmd.Flags().Changed("seed") {
		ask.Seed = &f.seed
	}
	return ask, nil
}

func (a *app) planCommand() *cobra.Command {
	var f planFlags
	var out, weather, now string
	var asCSV bool
	c := a.command("plan SURVEY", 0, &cobra.Command{
		Short: "plan the survey: which telescope takes which field at which time",
		Long: `Plans the survey so that the weighted coverage is as high as it can get, proves
a ceiling that no legal plan can exceed, has every visit checked afresh by the
audit, and writes a plan folder: Parquet tables, plan.json, and a copy of the
survey's files. A plan that fails its audit isn't written.

With --weather expected each night is filled to the part that the sites' weather
leaves on the mean, by the visits worth most; what is left free takes up what
clouds take. Prices are those of the scarcer time, and expected_ceiling bounds
the mean coverage that any way of acting can have.

What the ledger has as done is taken as it is and counts; the plan goes on from
the end of the last exposure there, or from --now.

What lies between ceiling and plan is told in parts: slews, filter changes, idle
time, moment (better moments of the visits' own nights), and choice: nights and
fields, and how far the ceiling itself is too high.

The same survey and seed give the same plan, whatever the number of workers.
Interrupted (Ctrl-C), it has the best plan so far audited and writes it, marked
in plan.json; where a plan stands already it goes beside it, into a folder with
-interrupted at the end of its name. A second Ctrl-C ends it at once.`,
		Example: `  nightwright plan mysurvey
  nightwright plan mysurvey --effort thorough --out tonight
  nightwright plan mysurvey --json > summary.json`,
	}, func(cmd *cobra.Command, args []string) error {
		ask, err := f.ask(cmd, out)
		if err != nil {
			return err
		}
		if ask.Weather = weather; weather != "" && weather != "expected" {
			return work.Inputf("--weather is %q; want expected, or leave it out to plan for clear skies", weather)
		}
		ask.Now = now
		s, err := a.survey(args[0])
		if err != nil {
			return err
		}
		if weather != "" {
			a.noWeather(s)
		}
		if m := s.MemoryNote(); m != "" {
			a.note("%s", m)
		}
		began := time.Now()
		ask.Keep = true
		r, err := work.Plan(cmd.Context(), s, ask, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		a.note("planned, audited and written in %.1f s", time.Since(began).Seconds())
		if r.Unrecorded != nil {
			a.note("warning: the ledger doesn't have this plan: %v", r.Unrecorded)
		}
		var kept error
		if r.Interrupted {
			kept = errKept
			a.say("nightwright: interrupted; the best plan so far was audited and is in %s", r.Folder)
			if r.Beside {
				a.say("nightwright: the plan that stood there before still stands")
			}
		}
		switch {
		case a.asJSON:
			return cmp.Or(a.json(planJSON(r)), kept)
		case asCSV:
			return cmp.Or(tables.Visits.WriteCSV(a.stdout, r.Tables.Visits), kept)
		}
		p := a.printer()
		p.plan(s, r)
		p.planNext(s, r)
		return cmp.Or(p.flush(), kept)
	})
	f.add(c.Flags(), "normal")
	c.Flags().StringVar(&weather, "weather", "", "plan for `WHAT` weather: expected; without it for clear skies")
	c.Flags().StringVar(&now, "now", "", "plan nothing before this `INSTANT`, such as 2027-03-10T12:00:00Z (default: the end of what was done)")
	c.Flags().StringVar(&out, "out", "", "write the plan to `FOLDER` (default: plan in the survey folder); a plan there is replaced")
	c.Flags().BoolVar(&asCSV, "csv", false, "write the visits as CSV on stdout instead of the summary")
	return c
}

// planSummary is what --json writes: plan.json with where it is.
type planSummary struct {
	Folder   string `json:"folder"`
	Breaches int    `json:"audit_breaches"`
	tables.Summary
}

func planJSON(r *work.PlanResult) planSummary {
	return planSummary{r.Folder, len(r.Audit.Breaches), r.Tables.Summary}
}
