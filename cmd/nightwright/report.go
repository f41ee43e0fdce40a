package main

import (
	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

func (a *app) reportCommand() *cobra.Command {
	var ask work.ReportAsk
	c := a.command("report PLAN", 0, &cobra.Command{
		Short: "the plan as a page to decide by, with pictures",
		Long: `Writes one page that a committee can decide by: the verdict first, then where
the survey gets what it wants, demand against supply, the nights and their
prices, one night in lanes, progress, spacing of visits, what won't finish and
why, cautions, and where every number comes from. The page needs no network and
no scripts, prints well, and is light or dark as the reader's system is.

Nothing but the plan folder is needed. A forecast and a comparison of networks
are shown too, when folders forecast and comparison stand beside the plan and
are of it, or are named. The same plan gives the same page.`,
		Example: `  nightwright report mysurvey/plan
  nightwright report mysurvey/plan --night 2027-03-09 --out committee.html
  nightwright report mysurvey/plan --pictures pictures
  nightwright report mysurvey/plan --forecast parts --compare networks`,
	}, func(cmd *cobra.Command, args []string) error {
		ask.Beside = true
		r, err := work.Report(cmd.Context(), args[0], ask, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		if a.asJSON {
			return a.json(r)
		}
		p := a.printer()
		p.line("%s", r.Page)
		for _, f := range r.Pictures {
			p.line("%s", f)
		}
		if err := p.flush(); err != nil {
			return err
		}
		for _, l := range r.LeftOut {
			a.note("note: %s", l)
		}
		a.note("%s kB; open it in a browser", thousands((r.Bytes+999)/1000))
		return nil
	})
	c.Flags().StringVar(&ask.Out, "out", "", "write the page to this `FILE` (default: beside the plan folder, its name with -report.html)")
	c.Flags().StringVar(&ask.Pictures, "pictures", "", "write each picture as SVG and PNG into this `FOLDER` too")
	c.Flags().StringVar(&ask.Night, "night", "", "draw this `NIGHT`, such as 2027-03-09 (default: the one whose hours are worth most)")
	c.Flags().StringVar(&ask.Forecast, "forecast", "", "show the forecast in `FOLDER`")
	c.Flags().StringVar(&ask.Compare, "compare", "", "show the comparison of networks in `FOLDER`")
	return c
}
