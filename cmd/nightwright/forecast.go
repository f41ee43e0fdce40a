package main

import (
	"fmt"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"nightwright/cmd/nightwright/work"
)

// seasonsFlags are the flags of commands that simulate seasons.
type seasonsFlags struct {
	ask    work.SeasonsAsk
	seed   uint64
	submit string
	shards int
	sbatch string
	asCSV  bool
}

func (f *seasonsFlags) add(flags *pflag.FlagSet, seasons int) {
	flags.IntVar(&f.ask.Seasons, "seasons", seasons, "simulate `N` seasons")
	flags.Uint64Var(&f.seed, "seed", 0, "seed `N` of the skies (default: the survey's)")
	flags.StringVar(&f.ask.Shard, "shard", "", "simulate only part `K/N` of the seasons, into a file of its own in --out")
	flags.StringVar(&f.ask.Out, "out", "", "write the results to `FOLDER`")
	flags.BoolVar(&f.asCSV, "csv", false, "write the main table as CSV on stdout instead of the summary")
	flags.IntVar(&f.shards, "shards", 16, "with --submit: cut the seasons into `N` shards")
	flags.StringVar(&f.sbatch, "sbatch", "", "with --submit: more `OPTIONS` of sbatch, such as '--time=2:00:00 --partition=day'")
	flags.StringVar(&f.submit, "submit", "", "run the shards as an array job, `HOW`: slurm submits it, script prints the script")
}

// asked takes the seed over when it was given.
func (f *seasonsFlags) asked(cmd *cobra.Command) {
	if cmd.Flags().Changed("seed") {
		f.ask.Seed = &f.seed
	}
}

func (a *app) forecastCommand() *cobra.Command {
	var f seasonsFlags
	var policies string
	hindsight := 0
	c := a.command("forecast SURVEY PLAN", 0, &cobra.Command{
		Short: "what seasons of weather make of a plan: each field's chance, the spread",
		Long: `Plays many seasons out under simulated weather, hour by hour, and tells how much
coverage they give, with its spread; the chance that each field is finished by
the end of each month; the hours that clouds take; and, for some seasons, how
far a way of acting is from a plan that knew the weather (--hindsight).

Ways of acting:
  planned    follow the plan's lists; free time goes to what clouds took, and to
             what the plan left out
  fixed      take the visit worth most of its time, at the plan's prices
  resolved   the same at prices worked out anew each evening
  densest    the same with no thought of later

Season k of a seed has the same skies for all of them. The tables seasons, bands
and chances and forecast.json go to the folder forecast in the survey folder.
With --shard each part of the seasons goes to a file of its own; 'gather' joins
them, to the same bytes. A part that stands there already is left as it is.`,
		Example: `  nightwright forecast mysurvey mysurvey/plan
  nightwright forecast mysurvey mysurvey/plan --seasons 200 --policies resolved,fixed --hindsight 3
  nightwright forecast mysurvey mysurvey/plan --seasons 1000 --shard 3/16 --out parts
  nightwright forecast mysurvey mysurvey/plan --seasons 1000 --submit slurm --out parts`,
	}, func(cmd *cobra.Command, args []string) error {
		f.asked(cmd)
		if f.submit != "" {
			return a.submit(cmd, args, &f)
		}
		s, err := a.survey(args[0])
		if err != nil {
			return err
		}
		pt, err := work.ReadPlan(args[1])
		if err != nil {
			return err
		}
		a.noWeather(s)
		r, err := work.Forecast(cmd.Context(), s, pt, work.ForecastAsk{SeasonsAsk: f.ask, Policies: words(policies), Hindsight: hindsight}, a.options())
		if err != nil {
			return err
		}
		return a.seasonsDone(r, &pt.Summary, f.asCSV)
	})
	f.add(c.Flags(), 100)
	c.Flags().StringVar(&policies, "policies", "planned,fixed,resolved", "`WAYS` of acting, with commas")
	c.Flags().IntVar(&hindsight, "hindsight", 0, "plan the first `N` seasons with their weather known; each takes as long as a quick plan")
	return c
}

// words splits a list at its commas.
func words(s string) []string {
	var out []string
	for _, w := range strings.Split(s, ",") {
		if w = strings.TrimSpace(w); w != "" {
			out = append(out, w)
		}
	}
	return out
}

// noWeather tells of sites whose sky is always open.
func (a *app) noWeather(s *work.Survey) {
	if names := s.NoWeather(); len(names) > 0 {
		a.note("warning: the survey gives no weather for %s: the sky there is taken as always open", enumerate(names))
	}
}

func (a *app) gatherCommand() *cobra.Command {
	var out string
	var asCSV bool
	c := a.command("gather DIR", 0, &cobra.Command{
		Short: "join the shards of a forecast or a comparison",
		Long: `Joins the parts that 'forecast --shard' or 'compare --shard' wrote into a
folder, to the same bytes as one run of all seasons would give. Parts that are
missing, there twice, damaged, or of another survey, plan, seed or number of
seasons are refused by name; nothing is written then.`,
		Example: `  nightwright gather parts
  nightwright gather parts --out mysurvey/forecast`,
	}, func(_ *cobra.Command, args []string) error {
		r, err := work.Gather(args[0], out)
		if err != nil {
			return err
		}
		return a.seasonsDone(r, nil, asCSV)
	})
	c.Flags().StringVar(&out, "out", "", "write the tables to `FOLDER` (default: beside the parts)")
	c.Flags().BoolVar(&asCSV, "csv", false, "write the main table as CSV on stdout instead of the summary")
	return c
}

// seasonsJSON is what --json writes of a forecast, a comparison or a part.
type seasonsJSON struct {
	Folder string `json:"folder"`
	Part   string `json:"part,omitempty"`
	Stood  bool   `json:"stood_already,omitempty"`
	Result any    `json:"result,omitempty"`
}

// partDone tells where a part is.
func (a *app) partDone(r *work.SeasonsResult) error {
	if r.Redone != "" {
		a.note("%s: written again", r.Redone)
	}
	switch {
	case a.asJSON:
		return a.json(seasonsJSON{Folder: r.Folder, Part: r.Part, Stood: r.Stood})
	case r.Stood:
		fmt.Fprintf(a.stdout, "%s stands there already, whole\n", r.Part)
	default:
		fmt.Fprintf(a.stdout, "wrote %s\n", r.Part)
	}
	return nil
}
