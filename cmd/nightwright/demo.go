package main

import (
	"time"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

// demoDir is where the demo goes unless told otherwise.
const demoDir = "nightwright-demo"

func (a *app) demoCommand() *cobra.Command {
	var f planFlags
	c := a.command("demo [DIR]", 1, &cobra.Command{
		Short: "the whole job on a small survey: write, plan, audit, list, report",
		Long: `Writes the demo survey (3 invented sites, 30 nights, 300 fields) into DIR, plans
it, has every visit audited, and writes the sheets of each telescope's first
night and the report. DIR is nightwright-demo unless given; a demo that is
already there is planned again, anything else is left alone.`,
		Example: `  nightwright demo
  nightwright demo /tmp/demo --effort thorough`,
	}, func(cmd *cobra.Command, args []string) error {
		dir := demoDir
		if len(args) > 0 {
			dir = args[0]
		}
		ask, err := f.ask(cmd, "")
		if err != nil {
			return err
		}
		began := time.Now()
		r, err := work.Demo(cmd.Context(), dir, ask, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		a.note("written, planned, audited, listed and reported in %.1f s", time.Since(began).Seconds())
		if a.asJSON {
			return a.json(struct {
				Survey string   `json:"survey_folder"`
				Sheets []string `json:"sheets"`
				Report string   `json:"report"`
				planSummary
			}{dir, r.Sheets, r.Report, planJSON(r.Plan)})
		}
		p := a.printer()
		p.plan(r.Survey, r.Plan)
		p.line("")
		p.line("Look at")
		l := newList("<", "<")
		l.add(r.Report, "the report: open it in a browser")
		l.add(dir+"/survey.yaml", "the survey, every key explained")
		l.add(r.Plan.Folder, "the plan: tables and plan.json")
		for _, file := range r.Sheets {
			l.add(file, "a night's list; also .csv and .html")
		}
		p.bare(l)
		p.planNext(r.Survey, r.Plan)
		return p.flush()
	})
	f.add(c.Flags(), "quick")
	return c
}
