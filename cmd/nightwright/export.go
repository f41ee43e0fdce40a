package main

import (
	"strings"

	"github.com/google/renameio/v2"
	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

func (a *app) exportCommand() *cobra.Command {
	var as, table, out string
	c := a.command("export PLAN", 0, &cobra.Command{
		Short: "write a plan in another format",
		Long: `Writes a table of a plan in another format. csv: the same columns as in the
plan's Parquet tables, instants in UTC, one row an exposure in the visits table.
Nothing but the plan folder is needed.`,
		Example: `  nightwright export mysurvey/plan --as csv > visits.csv
  nightwright export mysurvey/plan --as csv --table nights --out nights.csv`,
	}, func(cmd *cobra.Command, args []string) error {
		if as != "csv" {
			return work.Inputf("--as is %q; want csv", as)
		}
		pt, err := work.ReadPlan(args[0])
		if err != nil {
			return err
		}
		if out == "" {
			return work.ExportCSV(a.stdout, pt, table)
		}
		w, err := renameio.NewPendingFile(out, renameio.WithPermissions(0o644))
		if err != nil {
			return err
		}
		defer w.Cleanup()
		if err := work.ExportCSV(w, pt, table); err != nil {
			return err
		}
		if err := w.CloseAtomicallyReplace(); err != nil {
			return err
		}
		a.note("wrote %s", out)
		return nil
	})
	c.Flags().StringVar(&as, "as", "", "the `FORMAT`: csv")
	c.Flags().StringVar(&table, "table", "visits", "the `TABLE`: "+strings.Join(work.ExportNames(), ", "))
	c.Flags().StringVar(&out, "out", "", "write to this `FILE` instead of stdout")
	return c
}
