package main

import (
	"fmt"
	"math"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scenarios/weather"
)

func (a *app) weatherCommand() *cobra.Command {
	var cols weather.Columns
	c := a.command("weather fit FILE", 0, &cobra.Command{
		Short: "a site's weather parameters from a record",
		Long: `Fits the two-state sky of a site to a record by the day or by the hour: CSV with
a head line. Tells the clear fraction of each month and the persistence as they
go into a survey file, and how well such a chain describes the record: runs, and
correlations from row to row.

--open says when the sky was open, --where which rows to take: a column, one of
= != < <= > >=, and a value, several with | between. Rows with an empty cell,
and times that are missing, are gaps: nothing is counted across them.`,
		Example: `  nightwright weather fit record.csv --open 'precipitation<=0'
  nightwright weather fit record.csv --time day --open 'sky=clear|thin' --where station=12`,
	}, func(_ *cobra.Command, args []string) error {
		if args[0] != "fit" {
			return work.Inputf("weather %s is not known; want: nightwright weather fit FILE", args[0])
		}
		f, err := work.FitWeather(args[1], cols)
		if err != nil {
			return err
		}
		if a.asJSON {
			return a.json(f)
		}
		p := a.printer()
		p.weather(args[1], f)
		return p.flush()
	})
	c.Flags().StringVar(&cols.Time, "time", "", "`COLUMN` of dates or instants (default: date or time)")
	c.Flags().StringVar(&cols.Open, "open", "", "`CONDITION` under which the sky was open (default: open=1)")
	c.Flags().StringVar(&cols.Where, "where", "", "take only rows that meet this `CONDITION`")
	return c
}

// weather writes a fit: first what goes into a survey file.
func (p *printer) weather(name string, f *weather.Fit) {
	day := func(at int64) string { return time.Unix(at, 0).UTC().Format(time.DateOnly) }
	p.line("%s: %s from %s to %s, %s, %s without a value", p.bold(name), count(f.Rows, "row"), day(f.From), day(f.To), count(f.Gaps, "gap"), thousands(f.Missing))
	p.line("")
	for _, l := range survey(f) {
		p.line("    %s", l)
	}
	p.head("Rows (a row is %s)", duration(f.Step))
	p.line("  open %s; after an open row %s, after a closed one %s: r %.3f", percent(f.Mean, 1), percent(f.OpenOpen, 1), percent(f.ClosedOpen, 1), f.Lag1)
	l := newList("<runs", "count", "mean", "of the chain", "longest")
	l.add("open", thousands(f.OpenRuns.Count), fixed(f.OpenRuns.Mean, 2), fixed(f.OpenRuns.Geometric, 2), thousands(f.OpenRuns.Longest))
	l.add("closed", thousands(f.ClosedRuns.Count), fixed(f.ClosedRuns.Mean, 2), fixed(f.ClosedRuns.Geometric, 2), thousands(f.ClosedRuns.Longest))
	p.table(l)
	p.head("Correlation at a distance of so many rows")
	l = newList("rows", "record", "chain", "with months")
	for _, g := range f.Lags {
		l.add(thousands(g.K), fixed(g.Record, 3), fixed(g.Chain, 3), fixed(g.Months, 3))
	}
	p.table(l)
	p.line("")
	for _, s := range verdict(f) {
		p.line("%s", s)
	}
}

// survey writes the fit as lines of a survey file.
func survey(f *weather.Fit) []string {
	var months []string
	for _, m := range f.Months {
		months = append(months, fixed(m, 2))
	}
	return []string{
		"weather:",
		"  clear: [" + strings.Join(months[:6], ", ") + ",",
		"          " + strings.Join(months[6:], ", ") + "]",
		fmt.Sprintf("  persistence: %.0fh", math.Max(1, math.Round(f.Persistence/3600))),
	}
}

func duration(s float64) string {
	switch {
	case math.Mod(s, 86400) == 0:
		return count(int(s/86400), "day")
	case math.Mod(s, 3600) == 0:
		return count(int(s/3600), "hour")
	}
	return count(int(s/60), "minute")
}

// verdict says how well a two-state chain does.
func verdict(f *weather.Fit) []string {
	var out []string
	if f.SlowDecay {
		out = append(out, "The record remembers longer than a chain of one clear fraction: the season is",
			"in it. The months' fractions carry that; the persistence is of what they leave.")
	} else {
		out = append(out, "A chain of two states remembers as long as the record does.")
	}
	if f.Season <= 0 {
		out = append(out, "From row to row nothing is remembered once the months are known.")
	}
	switch {
	case f.RunChi2P < 0:
		out = append(out, "There are too few runs to judge their lengths.")
	case f.RunChi2P < 0.01:
		out = append(out, fmt.Sprintf("Open runs are not geometric (chi-square %.1f in %d classes, chance %.4f).", f.RunChi2, f.RunClasses, f.RunChi2P))
	default:
		out = append(out, fmt.Sprintf("Open runs are as long as a chain's (chi-square %.1f in %d classes, chance %.2f).", f.RunChi2, f.RunClasses, f.RunChi2P))
	}
	if f.HourlyPersistenceFromDailies {
		out = append(out, "Rows of a day say little of hours: within a night the sky may change faster.")
	}
	var thin []string
	for m, n := range f.MonthRows {
		if n == 0 {
			thin = append(thin, time.Month(m+1).String())
		}
	}
	switch n := len(thin); {
	case n > 3:
		out = append(out, fmt.Sprintf("%d months have no row: they are taken from those about.", n))
	case n > 0:
		out = append(out, "No row is in "+enumerate(thin)+": taken from the months about.")
	}
	return out
}
