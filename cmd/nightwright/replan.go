package main

import (
	"fmt"
	"time"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

// defaultHold and defaultStability are those of replan.
const (
	defaultHold      = 24 * time.Hour
	defaultStability = 0.25
)

func (a *app) replanCommand() *cobra.Command {
	ask := work.ReplanAsk{Stability: defaultStability}
	c := a.command("replan SURVEY PLAN --now T", 0, &cobra.Command{
		Short: "plan the rest of the season again from what was done and lost",
		Long: `Takes a plan and the ledger, and plans what is left of the season: what was done
is credited, visits that were missed are looked for again, what comes before
--now is over, and nothing planned within --hold after it moves. What is planned
later stays too, unless a visit that was lost is worth more than the visits that
make room for it and the charge for moving them: --stability, in visits of mean
worth. At 1 little moves, at 0 every field may be placed again. Visits that fall
into lost or closed time, or that the survey doesn't want any more, can't stay;
those inside the hold are listed.

Changes of the survey go through the same door: fields added, gone or weighed
otherwise, closures, a telescope gone or back, an urgent field with not_after.
(Close a telescope that goes rather than take it out: what it did counts on.)

Writes a new plan folder with changes.parquet, which says what became of each
visit, and leaves PLAN as it is. --frontier also tries five stabilities and
prints what each would win back and move.`,
		Example: `  nightwright replan mysurvey mysurvey/plan --now 2027-03-10T12:00:00Z
  nightwright replan mysurvey mysurvey/plan --now 2027-03-10T12:00:00Z --stability 1 --out mysurvey/plan
  nightwright replan mysurvey mysurvey/plan --now 2027-03-10T12:00:00Z --hold 48h --frontier`,
	}, func(cmd *cobra.Command, args []string) error {
		switch {
		case ask.Now == "":
			return work.Inputf("replan wants --now, the present time in UTC; for example: nightwright replan %s %s --now 2027-03-10T12:00:00Z", quote(args[0]), quote(args[1]))
		case !(ask.Stability >= 0 && ask.Stability <= 1):
			return work.Inputf("--stability is %g; want 0 to 1", ask.Stability)
		case ask.Hold < 0:
			return work.Inputf("--hold is %v; want 0 or more, such as 24h", ask.Hold)
		}
		s, err := a.survey(args[0])
		if err != nil {
			return err
		}
		ask.Plan = args[1]
		began := time.Now()
		r, err := work.Replan(cmd.Context(), s, ask, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		for _, text := range r.Changes {
			a.note("note: since the plan was made: %s", text)
		}
		if r.Homeless > 0 {
			a.note("warning: %s of telescopes that the survey has no more can't be counted; put the telescope back, with a closure", count(r.Homeless, "done exposure"))
		}
		if r.Left > 0 {
			a.note("note: %s of the plan is of fields, demands or telescopes that the survey has no more", count(r.Left, "exposure"))
		}
		a.note("planned again, audited and written in %.1f s", time.Since(began).Seconds())
		if r.Unrecorded != nil {
			a.note("warning: the ledger doesn't have this plan: %v", r.Unrecorded)
		}
		if a.asJSON {
			return a.json(replanJSON(r))
		}
		p := a.printer()
		p.replan(s, r)
		return p.flush()
	})
	f := c.Flags()
	f.StringVar(&ask.Now, "now", "", "the present `INSTANT` in UTC, such as 2027-03-10T12:00:00Z")
	f.DurationVar(&ask.Hold, "hold", defaultHold, "move nothing that starts within `TIME` after now")
	f.Float64Var(&ask.Stability, "stability", defaultStability, "what moving a visit is charged, `X` of 0 to 1 visits of mean worth")
	f.BoolVar(&ask.Frontier, "frontier", false, "also print won back against moved for five stabilities")
	f.StringVar(&ask.Out, "out", "", "write the plan to `FOLDER` (default: plan-NOW in the survey folder); a plan there is replaced")
	return c
}

// replanSummary is what --json writes.
type replanSummary struct {
	planSummary
	Differences []string                  `json:"survey_changes"`
	HeldLost    []heldLost                `json:"held_lost"`
	Frontier    []scheduler.FrontierPoint `json:"frontier,omitempty"`
}

type heldLost struct {
	Field     string `json:"field"`
	Telescope string `json:"telescope"`
	Start     string `json:"start_utc"`
	Why       string `json:"why"`
}

func replanJSON(r *work.ReplanResult) replanSummary {
	out := replanSummary{planSummary: planSummary{r.Folder, len(r.Audit.Breaches), r.Tables.Summary}, Differences: []string{}, HeldLost: []heldLost{}, Frontier: r.Frontier}
	out.Differences = append(out.Differences, r.Changes...)
	for _, h := range r.HeldLost {
		out.HeldLost = append(out.HeldLost, heldLost{h.Field, h.Telescope, ledger.Instant(h.Start), h.Why})
	}
	return out
}

// listed is how many rows of a list are shown before the rest is counted.
const listed = 12

// replan tells what became of the plan: the verdict first.
func (p *printer) replan(s *work.Survey, r *work.ReplanResult) {
	m, x := &r.Tables.Summary, r.Tables.Summary.Replan
	p.line("%s: planned again, %s", p.bold(m.Survey), p.green("every visit passed the audit"))
	p.line("")
	p.line("  from     %s on", x.Now)
	p.line("  coverage %.4f   earlier %.4f   of that could stay %.4f", m.Coverage, r.Earlier.Coverage, x.Before)
	p.line("  ceiling  %.4f   gap %s   with the hold kept %.4f", m.Ceiling, percent(m.Gap, 1), x.CeilingHeld)
	p.line("  lost     %s, worth %.5f", count(x.VisitsLost, "visit"), x.CreditLost)
	won := "-"
	if x.CreditLost > 0 {
		won = percent(x.CreditWon, x.CreditLost)
	}
	p.line("  won back %.5f (%s of it), %s", x.CreditWon, won, count(x.VisitsNew, "new visit"))
	p.line("  moved    %s to another telescope or night, %s made room", count(x.VisitsMoved, "visit"), count(x.VisitsDropped, "visit"))
	p.line("  kept     %s, %s of them held for %s h, %s at another time of its night",
		thousands(x.VisitsKept), thousands(x.VisitsHeld), fixed(x.HoldHours, 0), thousands(r.Shifted))
	p.line("  done     %s", count(x.VisitsDone, "visit"))
	if len(r.Moves) > 0 {
		p.head("Exposures by telescope")
		l := newList("<telescope", "lost", "made room", "moved away", "moved here", "new")
		for _, t := range r.Moves {
			l.add(clip(t.Telescope, 12), thousands(t.Lost), thousands(t.Dropped), thousands(t.MovedAway), thousands(t.Here), thousands(t.Fresh))
		}
		p.table(l)
	}
	p.heldLost(r.HeldLost)
	p.frontier(r.Frontier)
	p.line("")
	p.line("The plan is in %s, each change in its changes.parquet. Next:", r.Folder)
	if v := firstPlanned(r.Tables.Visits); v != nil {
		p.line("  nightwright sheet %s %s --telescope %s --night %s", quote(s.Path), quote(r.Folder), quote(v.Telescope), tables.Date(v.Night))
	}
	p.line("  nightwright audit %s %s", quote(s.Path), quote(r.Folder))
}

// firstPlanned is the first visit that is still to come; nil: there is none.
func firstPlanned(rows []tables.VisitRow) *tables.VisitRow {
	for i := range rows {
		if rows[i].State != "done" {
			return &rows[i]
		}
	}
	return nil
}

func (p *printer) heldLost(list []work.HeldLost) {
	if len(list) == 0 {
		return
	}
	p.head("Inside the hold, and can't be taken")
	l := newList("<start (UTC)", "<telescope", "<field", "<why")
	for _, h := range list[:min(listed, len(list))] {
		l.add(clock(h.Start), clip(h.Telescope, 12), clip(h.Field, 24), h.Why)
	}
	p.table(l)
	if more := len(list) - listed; more > 0 {
		p.line("  and %d more", more)
	}
}

func (p *printer) frontier(list []scheduler.FrontierPoint) {
	if len(list) == 0 {
		return
	}
	p.head("What other stabilities would do")
	l := newList("stability", "won back", "coverage", "moved", "new")
	for _, x := range list {
		l.add(fmt.Sprintf("%.2f", x.Stability), fixed(x.WonC, 5), fixed(x.Coverage, 5), thousands(x.Moved), thousands(x.New))
	}
	p.table(l)
}
