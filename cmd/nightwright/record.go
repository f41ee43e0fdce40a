package main

import (
	"errors"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

func (a *app) recordCommand() *cobra.Command {
	var ask work.RecordAsk
	c := a.command("record SURVEY FILE", 0, &cobra.Command{
		Short: "take what was really done and lost into the survey's ledger",
		Long: `Takes a CSV file of exposures that were done, and of time that was lost, into
ledger.db in the survey folder: all of it or nothing. Every fault is told
with its line. A row that was recorded before changes nothing, so that a file
can be read again.

The head line names the columns, in any order. Of an exposure:
  field, telescope, start_utc, and end_utc or exposure_s
  filter, program, demand   where the survey leaves a choice
  set                       of exposures of sets: the plan's number
  quality                   the telescope's own, 0 to 1; it wins over the
                            computed one; below min_quality the exposure stays
                            on record and counts for nothing
  site, night, visit, note  if you like
Of lost time: site or telescope; start_utc and end_utc, or night for a whole
one; cause (weather, technical, people, other); note.

A column kind says done or lost in each row; without it a file with a column
field holds exposures, and one with a column cause lost time. A sheet's CSV is
such a file: write done over planned where the exposure was taken, or lost and a
cause, put the true times in, and record it; rows that still say planned are
passed over.

A row is known by its telescope (or site) and start_utc. One that was recorded
before with other words is refused. With --correct it is right, and what stood
before stays in the ledger as replaced: done for another field, time or
quality; lost for an exposure that wasn't taken, or for another end or cause.
Time that wasn't lost at all is given back with 'nightwright lose --regained'.`,
		Example: `  nightwright record mysurvey tonight.csv
  nightwright record mysurvey sheet.csv
  nightwright record mysurvey mended.csv --correct
  nightwright record mysurvey old-season.csv --keep-unmatched`,
	}, func(cmd *cobra.Command, args []string) error {
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		ask.File = args[1]
		r, err := work.Record(cmd.Context(), s, ask, a.options())
		a.endProgress()
		var faults *work.FaultsError
		if errors.As(err, &faults) {
			for _, f := range faults.Faults {
				a.say("%s", f)
			}
			return work.Inputf("%s in %s; nothing was recorded", count(len(faults.Faults), "fault"), ask.File)
		}
		if err != nil {
			return err
		}
		if len(r.Ignored) > 0 {
			a.note("note: %s says nothing to the ledger: %s", count(len(r.Ignored), "column"), strings.Join(r.Ignored, ", "))
		}
		if a.asJSON {
			return a.json(recordJSON(ask.File, r))
		}
		p := a.printer()
		p.recorded(ask.File, r)
		return p.flush()
	})
	c.Flags().StringVar(&ask.Telescope, "telescope", "", "the telescope's `NAME`, for rows that have none")
	c.Flags().BoolVar(&ask.Correct, "correct", false, "rows that differ from what was recorded of the same telescope and start are right")
	c.Flags().BoolVar(&ask.KeepUnmatched, "keep-unmatched", false, "keep exposures that overlap others or belong to no demand, as unmatched: they count for nothing")
	return c
}

// recordSummary is what a file did to the ledger, for scripts.
type recordSummary struct {
	File      string `json:"file,omitempty"`
	Ledger    string `json:"ledger"`
	Entry     int64  `json:"entry"` // 0: nothing was new
	Done      int    `json:"exposures"`
	Unmatched int    `json:"unmatched"`
	Below     int    `json:"below_min_quality"`
	Corrected int    `json:"corrected"`
	Withdrawn int    `json:"withdrawn"`
	Lost      int    `json:"lost"`
	Regained  int    `json:"regained"`
	Seen      int    `json:"seen_before"`
	Skipped   int    `json:"passed_over"`
}

func recordJSON(file string, r *work.RecordResult) recordSummary {
	return recordSummary{file, r.Ledger, r.Entry, r.Done, r.Unmatched, r.Below, r.Corrected, r.Withdrawn, r.Lost, r.Regained, r.Seen, r.Skipped}
}

// recorded tells what a file did to the ledger.
func (p *printer) recorded(file string, r *work.RecordResult) {
	if r.Entry == 0 {
		p.line("%s: nothing new; %s recorded before", file, count(r.Seen, "row"))
		return
	}
	p.line("%s: recorded, entry %d of %s", p.bold(file), r.Entry, r.Ledger)
	add := func(n int, noun, what string) {
		if n > 0 {
			p.line("  %s %s", count(n, noun), what)
		}
	}
	add(r.Done, "exposure", "done, from "+clock(r.FirstStart)+" to "+clock(r.LastEnd)+" UTC")
	add(r.Corrected, "exposure", "corrected")
	add(r.Withdrawn, "exposure", "taken back: not taken after all")
	add(r.Unmatched, "exposure", "unmatched: kept, and counted for nothing")
	add(r.Below, "exposure", "below min_quality: kept, and counted for nothing")
	add(r.Lost, "period", "of lost time")
	add(r.Regained, "period", "of time regained")
	add(r.Seen, "row", "recorded before: nothing changed by it")
	add(r.Skipped, "row", "passed over: neither done nor lost")
}
