package main

import (
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/ledger"
)

func (a *app) loseCommand() *cobra.Command {
	var ask work.LoseAsk
	c := a.command("lose SURVEY --site S|--telescope T --from T --to T --cause C", 0, &cobra.Command{
		Short: "record lost time, past or to come",
		Long: `Records time that a site or a telescope lost, or will lose, in the survey's
ledger. Plans made from then on don't use it. --from and --to are instants, or
nights: then the time runs from the start of the one night to the end of the
other. Time that is lost twice counts once, for the cause that was told first.

With --regained the time is given back: it wasn't lost after all. Nothing is
taken out of the ledger; the correction stands beside what it corrects.`,
		Example: `  nightwright lose mysurvey --site "Salt Mesa" --from 2027-03-09T02:10:00Z --to 2027-03-09T05:00:00Z --cause weather
  nightwright lose mysurvey --telescope C1 --from 2027-03-10 --to 2027-03-12 --cause technical --why "mirror cell"
  nightwright lose mysurvey --telescope C1 --from 2027-03-12 --to 2027-03-12 --regained`,
	}, func(cmd *cobra.Command, args []string) error {
		switch {
		case ask.Regained && ask.Cause != "":
			return work.Inputf("--cause and --regained were both given; want one of them")
		case !ask.Regained && !slices.Contains(ledger.Causes(), ask.Cause):
			return work.Inputf("--cause is %q; want %s", ask.Cause, strings.Join(ledger.Causes(), ", "))
		}
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		r, in, err := work.Lose(cmd.Context(), s, ask, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		if a.asJSON {
			return a.json(recordJSON("", r))
		}
		where := ask.Site + ask.Telescope // one of them is empty
		what := "lost to " + ask.Cause
		if ask.Regained {
			what = "regained"
		}
		p := a.printer()
		if r.Entry == 0 {
			p.line("%s: the same was recorded before; nothing changed. Another --why makes it new", p.bold(where))
		} else {
			p.line("%s: %s to %s UTC %s, entry %d of %s", p.bold(where), clock(int64(in.From*1e6)), clock(int64(in.To*1e6)), what, r.Entry, r.Ledger)
		}
		return p.flush()
	})
	flags := c.Flags()
	flags.StringVar(&ask.Site, "site", "", "the site's `NAME`: all its telescopes lost the time")
	flags.StringVar(&ask.Telescope, "telescope", "", "the telescope's `NAME`")
	flags.StringVar(&ask.From, "from", "", "first `INSTANT`, such as 2027-03-09T02:10:00Z, or night")
	flags.StringVar(&ask.To, "to", "", "`INSTANT` of the end, or last night")
	flags.StringVar(&ask.Cause, "cause", "", "the `CAUSE`: "+strings.Join(ledger.Causes(), ", "))
	flags.StringVar(&ask.Why, "why", "", "in `WORDS`, for the record")
	flags.BoolVar(&ask.Regained, "regained", false, "the time wasn't lost after all")
	return c
}
