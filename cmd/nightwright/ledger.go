package main

import (
	"time"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/ledger"
)

func (a *app) ledgerCommand() *cobra.Command {
	var ask work.FollowAsk
	c := a.command("ledger SURVEY", 0, &cobra.Command{
		Short: "are we on track? what was done and lost against the plan",
		Long: `Tells what the survey's ledger holds: visits done against those planned by
then, per program and telescope, and the open time that was lost, by cause. A
visit counts when it is whole, of a demand that still wanted it, and not below
min_quality.

"By then" is the end of what the ledger tells of, or --now. Reading needs no
right to write.`,
		Example: `  nightwright ledger mysurvey
  nightwright ledger mysurvey --plan march --now 2027-03-15T12:00:00Z
  nightwright ledger mysurvey --json`,
	}, func(cmd *cobra.Command, args []string) error {
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		r, err := work.Follow(cmd.Context(), s, ask, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		for _, name := range r.Changed {
			a.note("warning: %s changed since the plan was made", name)
		}
		if r.Unknown && r.Entries > 0 {
			a.note("note: the ledger doesn't know the plan in %s; it was made elsewhere, or before the ledger was", r.Folder)
		}
		if a.asJSON {
			return a.json(ledgerJSON(s, r))
		}
		p := a.printer()
		p.ledger(s, r)
		return p.flush()
	})
	c.Flags().StringVar(&ask.Plan, "plan", "", "compare with the plan in `FOLDER` (default: plan in the survey folder)")
	c.Flags().StringVar(&ask.Now, "now", "", "compare up to this `INSTANT` (default: the end of what the ledger tells of)")
	return c
}

// ledgerSummary is whether a survey is on track, for scripts.
type ledgerSummary struct {
	Survey   string                `json:"survey"`
	Ledger   string                `json:"ledger"`
	Entries  int64                 `json:"entries"`
	Plan     string                `json:"plan,omitempty"`
	Until    string                `json:"until_utc,omitempty"`
	Wanted   int                   `json:"visits_wanted"`
	All      ledger.Tally          `json:"all"`
	Below    int                   `json:"visits_below_min_quality"`
	Broken   int                   `json:"sets_not_whole"`
	Surplus  int                   `json:"visits_surplus"`
	Strange  int                   `json:"exposures_unmatched"`
	Before   int                   `json:"visits_before_period"`
	Programs []ledger.ProgramTrack `json:"programs"`
	Places   []ledger.PlaceTrack   `json:"telescopes"`
	Nights   []ledger.NightTrack   `json:"nights"`
	Lost     []lostJSON            `json:"lost"`
	Plans    []planMadeJSON        `json:"plans"`
}

type lostJSON struct {
	Entry     int64  `json:"entry"`
	What      string `json:"what"`
	Site      string `json:"site"`
	Telescope string `json:"telescope,omitempty"`
	Start     string `json:"start_utc"`
	End       string `json:"end_utc"`
	Cause     string `json:"cause,omitempty"`
	Why       string `json:"why,omitempty"`
}

type planMadeJSON struct {
	Entry    int64   `json:"entry"`
	Path     string  `json:"path"`
	SHA256   string  `json:"sha256"`
	Coverage float64 `json:"coverage"`
	Ceiling  float64 `json:"ceiling"`
	MadeFor  string  `json:"survey_sha256"`
	Knew     int64   `json:"knew_entries"`
}

func ledgerJSON(s *work.Survey, r *work.FollowResult) ledgerSummary {
	out := ledgerSummary{
		Survey: s.Name, Ledger: r.Ledger, Entries: r.Entries, Plan: r.Folder, Wanted: r.Wanted, All: r.All,
		Below: r.Below, Broken: r.Broken, Surplus: r.Surplus, Strange: r.Strange, Before: r.Before,
		Programs: r.Programs, Places: r.Places, Nights: append([]ledger.NightTrack{}, r.Nights...),
		Lost: []lostJSON{}, Plans: []planMadeJSON{},
	}
	if r.Until != 0 {
		out.Until = ledger.Instant(r.Until)
	}
	for _, x := range r.Lost {
		out.Lost = append(out.Lost, lostJSON{x.Entry, string(x.What), x.Site, x.Telescope, ledger.Instant(x.Start), ledger.Instant(x.End), x.Cause, x.Why})
	}
	for _, x := range r.Plans {
		out.Plans = append(out.Plans, planMadeJSON{x.Entry, x.Path, x.SHA256, x.Coverage, x.Ceiling, x.MadeFor, x.Knew})
	}
	return out
}

// clock writes Unix microseconds for reading, to the minute.
func clock(us int64) string {
	return time.UnixMicro(us).UTC().Round(time.Minute).Format("2006-01-02 15:04")
}
