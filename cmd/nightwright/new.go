package main

import (
	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

func (a *app) newCommand() *cobra.Command {
	var like string
	var demand float64
	c := a.command("new DIR", 0, &cobra.Command{
		Short: "write a survey folder to start from",
		Long: `Writes a survey folder to start from: survey.yaml with every key explained, and
its field list. DIR must be new or empty.

  demo    3 sites, 30 nights, some 300 fields: seconds to plan
  season  6 sites in both hemispheres, 182 nights, 6,000 fields: minutes`,
		Example: `  nightwright new mysurvey
  nightwright new big --like season --demand 0.7`,
	}, func(cmd *cobra.Command, args []string) error {
		if cmd.Flags().Changed("demand") && !(demand > 0) {
			return work.Inputf("--demand is %g; want more than 0, such as 0.7, 1, 1.5 or 3", demand)
		}
		r, err := work.New(args[0], like, demand)
		if err != nil {
			return err
		}
		if a.asJSON {
			return a.json(r)
		}
		p := a.printer()
		p.line("wrote %s: %s", r.Folder, enumerate(r.Files))
		p.line("Change survey.yaml to what you have, then run")
		p.line("  nightwright check %s", quote(r.Folder))
		return p.flush()
	})
	c.Flags().StringVar(&like, "like", "demo", "which starter, `KIND`: "+work.LikeNames())
	c.Flags().Float64Var(&demand, "demand", 0, "time the visits take, `X` times the open time (default: the starter's own)")
	c.Flags().Lookup("demand").DefValue = "0"
	return c
}
