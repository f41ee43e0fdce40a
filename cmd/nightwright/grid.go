package main

import (
	"time"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/tables"
)

func (a *app) gridCommand() *cobra.Command {
	var f tableFlags
	var ask work.GridAsk
	var step time.Duration
	c := a.command("grid SURVEY", 0, &cobra.Command{
		Short: "the time-slot grid: where each field stands, and what blocks it",
		Long: `Writes a row per site, field and time slot: altitude and azimuth (airless),
airmass, Sun, Moon, sky brightness, whether the field can be observed from the
site at that instant by any of its demands, and if not, the rules that block it.

Values are those at the slot's start. Without --night or --from and --to it is
every slot from noon to noon of every night; a grid of more than 5,000,000 rows
is refused.`,
		Example: `  nightwright grid mysurvey --site "Cinder Ridge" --field W0017 --night 2027-03-05
  nightwright grid mysurvey --from 2027-03-05T00:00:00Z --to 2027-03-06T00:00:00Z --step 1h --csv
  nightwright grid mysurvey --night 2027-03-05 --out grid.parquet`,
	}, func(cmd *cobra.Command, args []string) error {
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		if ask.Step = step; step == 0 && cmd.Flags().Changed("step") {
			return work.Inputf("--step is 0s; want 1s or more, or no --step for the survey's slot")
		}
		rows, err := work.Grid(cmd.Context(), s, ask, a.options())
		if err != nil {
			return err
		}
		return show(a, tables.Grid, rows, f)
	})
	a.tableFlags(c, &f)
	flags := c.Flags()
	flags.StringArrayVar(&ask.Sites, "site", nil, "only the site `NAME`; may be repeated")
	flags.StringArrayVar(&ask.Fields, "field", nil, "only the field `NAME`; may be repeated")
	flags.StringArrayVar(&ask.Nights, "night", nil, "only the night `YYYY-MM-DD`; may be repeated")
	flags.StringVar(&ask.From, "from", "", "first `INSTANT`, UTC, such as 2027-03-05T00:00:00Z")
	flags.StringVar(&ask.To, "to", "", "stop before this `INSTANT`, UTC")
	flags.DurationVar(&step, "step", 0, "time between rows, such as 10m (default: the survey's slot)")
	flags.Lookup("step").DefValue = "0s"
	flags.StringVar(&ask.Filter, "filter", "", "the sky's brightness in the filter `NAME` (default: the survey's first)")
	return c
}
