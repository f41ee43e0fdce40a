package main

import (
	"encoding/csv"
	"strconv"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/tables"
)

func (a *app) auditCommand() *cobra.Command {
	var asCSV, all bool
	c := a.command("audit SURVEY PLAN", 0, &cobra.Command{
		Short: "check each visit and the totals afresh, from the survey alone",
		Long: `Checks a plan the slow, plain way, with code that shares nothing with the
optimiser: every rule at the start, the middle, the end and at least every 30 s
of each exposure, the time between exposures, spacing, sets and shares, and the
totals. Every breach is a row; with any, the exit code is 1.

The survey is taken as it is now: a plan made before a rule was tightened is
told so.`,
		Example: `  nightwright audit mysurvey mysurvey/plan
  nightwright audit mysurvey mysurvey/plan --csv > breaches.csv`,
	}, func(cmd *cobra.Command, args []string) error {
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		pt, err := work.ReadPlan(args[1])
		if err != nil {
			return err
		}
		a.tellChanged(s, pt)
		r, err := work.Audit(cmd.Context(), s, pt, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		if err := a.audited(r, asCSV, all); err != nil {
			return err
		}
		if !r.Legal() {
			return errNo
		}
		return nil
	})
	c.Flags().BoolVar(&asCSV, "csv", false, "write the breaches as CSV")
	c.Flags().BoolVar(&all, "all", false, "tell every breach, not the first "+strconv.Itoa(shownBreaches))
	return c
}

// breachRow is a breach for scripts, in JSON and CSV.
type breachRow struct {
	Visit     int64   `json:"visit,omitempty"`
	Field     string  `json:"field,omitempty"`
	Telescope string  `json:"telescope,omitempty"`
	Night     string  `json:"night,omitempty"`
	Rule      string  `json:"rule"`
	Measured  float64 `json:"measured"`
	Limit     float64 `json:"limit"`
	Unit      string  `json:"unit,omitempty"`
	What      string  `json:"what"`
}

var breachColumns = []string{"visit", "field", "telescope", "night", "rule", "measured", "limit", "unit", "what"}

func (r *breachRow) record() []string {
	return []string{number(r.Visit), r.Field, r.Telescope, r.Night, r.Rule, tables.Float(r.Measured), tables.Float(r.Limit), r.Unit, r.What}
}

// number writes an id; 0 stands for none.
func number(id int64) string {
	if id == 0 {
		return ""
	}
	return strconv.FormatInt(id, 10)
}

func (a *app) audited(r *audit.Report, asCSV, all bool) error {
	rows := []breachRow{}
	for i := range r.Breaches {
		b := &r.Breaches[i]
		rows = append(rows, breachRow{b.Visit, b.Field, b.Telescope, b.Night, b.Rule, b.Measured, b.Limit, b.Unit, b.What})
	}
	switch {
	case a.asJSON:
		return a.json(struct {
			Exposures int         `json:"exposures"`
			Visits    int         `json:"visits"`
			Instants  int64       `json:"instants_tested"`
			Coverage  float64     `json:"coverage"`
			Breaches  []breachRow `json:"breaches"`
		}{r.Exposures, r.Visits, r.Instants, r.Score.Coverage, rows})
	case asCSV:
		w := csv.NewWriter(a.stdout)
		if err := w.Write(breachColumns); err != nil {
			return err
		}
		for i := range rows {
			if err := w.Write(rows[i].record()); err != nil {
				return err
			}
		}
		w.Flush()
		return w.Error()
	}
	p := a.printer()
	p.audited(r, all)
	return p.flush()
}

// audited writes the judgement, and the breaches by rule and one by one.
func (p *printer) audited(r *audit.Report, all bool) {
	if r.Legal() {
		p.line("%s: no breach in %s of %s, tested at %s", p.green("passed"), count(r.Exposures, "exposure"), count(r.Visits, "visit"), count(int(r.Instants), "instant"))
		p.line("coverage, recounted: %.4f", r.Score.Coverage)
		return
	}
	p.line("%s: %s in %s", p.red("failed"), countBreaches(len(r.Breaches)), count(r.Exposures, "exposure"))
	byRule := map[string]int{}
	for i := range r.Breaches {
		byRule[r.Breaches[i].Rule]++
	}
	l := newList("<rule", "breaches")
	for _, rule := range audit.Rules() {
		if n := byRule[rule]; n > 0 {
			l.add(rule, thousands(n))
		}
	}
	p.table(l)
	shown := len(r.Breaches)
	if !all {
		shown = min(shown, shownBreaches)
	}
	p.line("")
	for i := range r.Breaches[:shown] {
		p.line("  %s", work.BreachLine(&r.Breaches[i]))
	}
	if n := len(r.Breaches) - shown; n > 0 {
		p.line("  and %s more: --all, --csv or --json tell them", thousands(n))
	}
}

// shownBreaches is how many breaches are told one by one.
const shownBreaches = 20

func countBreaches(n int) string {
	if n == 1 {
		return "1 breach"
	}
	return thousands(n) + " breaches"
}
