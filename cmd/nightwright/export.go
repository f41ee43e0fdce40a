package main

import (
	"io"
	"strings"

	"github.com/google/renameio/v2"
	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

func (a *app) exportCommand() *cobra.Command {
	var o work.ExportOptions
	var out string
	c := a.command("export PLAN", 0, &cobra.Command{
		Short: "write a plan in another format",
		Long: `Writes a plan, or one of its tables, in another format. Nothing but the plan
folder is needed.

  csv        a table: the same columns as in Parquet, instants in UTC, one row
             an exposure in the visits table
  ecsv       the same with units and descriptions in its head (ECSV 1.0)
  votable    the same as VOTable 1.4; instants are modified Julian dates
  ical       an event for each telescope and night (iCalendar)
  obsloctap  the planned observations, a row an exposure (ObsLocTAP 1.0 in a
             VOTable); held visits are Scheduled, other planned ones Planned
  moc        the sky that the exposures see (MOC 2.0), as JSON with --json

--stamp says when the calendar or the planned observations were written down
(DTSTAMP, t_planning). Without it they say 00:00 UTC of the plan's first night,
so that the same plan gives the same bytes.`,
		Example: `  nightwright export mysurvey/plan --as csv > visits.csv
  nightwright export mysurvey/plan --as votable --table nights --out nights.vot
  nightwright export mysurvey/plan --as ical --stamp 2027-01-20T09:00:00Z --out nights.ics
  nightwright export mysurvey/plan --as moc --json`,
	}, func(cmd *cobra.Command, args []string) error {
		o.JSON = a.asJSON
		return a.writeOut(out, func(w io.Writer) error { return work.Export(w, args[0], o) })
	})
	c.Flags().StringVar(&o.As, "as", "", "the `FORMAT`: "+strings.Join(work.ExportFormats(), ", "))
	c.Flags().StringVar(&o.Table, "table", "", "the `TABLE`: "+strings.Join(work.ExportNames(), ", ")+" (default visits)")
	c.Flags().StringVar(&o.Stamp, "stamp", "", "the `INSTANT` that stands for now")
	c.Flags().StringVar(&out, "out", "", "write to this `FILE` instead of stdout")
	return c
}

// writeOut writes to a file, whole or not at all, or to stdout.
func (a *app) writeOut(out string, write func(w io.Writer) error) error {
	if out == "" {
		return write(a.stdout)
	}
	w, err := renameio.NewPendingFile(out, renameio.WithPermissions(0o644))
	if err != nil {
		return err
	}
	defer w.Cleanup()
	if err := write(w); err != nil {
		return err
	}
	if err := w.CloseAtomicallyReplace(); err != nil {
		return err
	}
	a.note("wrote %s", out)
	return nil
}
