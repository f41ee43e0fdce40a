package main

import (
	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/sheet"
	"nightwright/scheduler/tables"
)

func (a *app) sheetCommand() *cobra.Command {
	var telescope, night, out string
	var asCSV, asHTML bool
	c := a.command("sheet SURVEY PLAN --telescope T --night D", 0, &cobra.Command{
		Short: "one telescope's list for one night: text, CSV, or HTML to print",
		Long: `Writes what one telescope observes in one night: when each exposure starts, how
late it may start and what bounds that, filters, airmass and Moon, the reserved
blocks, and what the Sun and Moon do. Times are UTC, with the site's local time
beside them.`,
		Example: `  nightwright sheet mysurvey mysurvey/plan --telescope C1 --night 2027-03-01
  nightwright sheet mysurvey mysurvey/plan --telescope C1 --night 2027-03-01 --out tonight.html`,
	}, func(cmd *cobra.Command, args []string) error {
		switch {
		case telescope == "" || night == "":
			return work.Inputf("sheet wants --telescope and --night; for example: nightwright sheet %s %s --telescope C1 --night 2027-03-01", quote(args[0]), quote(args[1]))
		case asCSV && asHTML:
			return work.Inputf("--csv and --html were both given; want one of them")
		}
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		pt, err := work.ReadPlan(args[1])
		if err != nil {
			return err
		}
		a.tellChanged(s, pt)
		list, err := work.Sheet(cmd.Context(), s, pt, telescope, night, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		switch {
		case out != "":
			if err := work.WriteSheet(list, out); err != nil {
				return err
			}
			a.note("wrote %s: %s", out, count(list.Totals.Exposures, "exposure"))
			return nil
		case asCSV:
			return list.WriteCSV(a.stdout)
		case asHTML:
			return list.WriteHTML(a.stdout)
		case a.asJSON:
			return a.json(sheetJSON(list))
		}
		return list.WriteText(a.stdout)
	})
	flags := c.Flags()
	flags.StringVar(&telescope, "telescope", "", "the telescope's `NAME`")
	flags.StringVar(&night, "night", "", "the night, `YYYY-MM-DD`: the date of its evening")
	flags.StringVar(&out, "out", "", "write to this `FILE`, which ends in .txt, .csv or .html")
	flags.BoolVar(&asCSV, "csv", false, "write CSV")
	flags.BoolVar(&asHTML, "html", false, "write HTML, to print")
	return c
}

// tellChanged says which files of the survey differ from those of the plan.
func (a *app) tellChanged(s *work.Survey, pt *tables.PlanTables) {
	for _, name := range s.Changed(pt) {
		a.note("warning: %s changed since the plan was made", name)
	}
}

// sheetSummary is a sheet for scripts.
type sheetSummary struct {
	Survey    string      `json:"survey"`
	Site      string      `json:"site"`
	Telescope string      `json:"telescope"`
	Night     string      `json:"night"`
	Exposures int         `json:"exposures"`
	Visits    int         `json:"visits"`
	Lines     []sheetLine `json:"lines"`
}

type sheetLine struct {
	Start    string `json:"start_utc"`
	End      string `json:"end_utc"`
	Latest   string `json:"latest_start_utc,omitempty"`
	LatestBy string `json:"latest_by,omitempty"`
	Reserved string `json:"reserved,omitempty"`
	Visit    int64  `json:"visit,omitempty"`
	Field    string `json:"field,omitempty"`
	Filter   string `json:"filter,omitempty"`
}

func sheetJSON(l *sheet.Sheet) sheetSummary {
	s := sheetSummary{l.Survey, l.Site, l.Telescope, l.Night.String(), l.Totals.Exposures, l.Totals.Visits, []sheetLine{}}
	for i := range l.Lines {
		x := &l.Lines[i]
		row := sheetLine{Start: instant(x.Start), End: instant(x.End), Reserved: x.Reserved}
		if x.Visit != nil {
			row.Visit, row.Field, row.Filter = x.Visit.Visit, x.Visit.Field, x.Visit.Filter
			row.Latest, row.LatestBy = instant(x.Latest), string(x.LatestBy)
		}
		s.Lines = append(s.Lines, row)
	}
	return s
}

// instant writes UTC Unix seconds in RFC 3339, to the microsecond.
func instant(unix float64) string { return tables.Instant(int64(unix*1e6 + 0.5)) }
