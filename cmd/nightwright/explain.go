package main

import (
	"fmt"
	"math"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/explain"
	"nightwright/scheduler/tables"
)

func (a *app) explainCommand() *cobra.Command {
	var telescope, night string
	c := a.command("explain SURVEY PLAN FIELD", 1, &cobra.Command{
		Short: "why a field is where it is in a plan, or isn't; or why a night looks as it does",
		Long: `Tells of a field how many hours it has before and after each rule, month by
month; the visits it has; for each demand that lacks some, the best windows and
why none of its visits is there: what stands there and its worth, its own visits
too near, or the price of the hour against the visit's worth; and what would
help most. Worths and prices are in millionths of coverage.

With --night and --telescope in place of FIELD it tells of a telescope's night
what shuts it, how its time is spent, which visits would be the first to go, and
who could have used what is idle.`,
		Example: `  nightwright explain mysurvey mysurvey/plan W0042
  nightwright explain mysurvey mysurvey/plan --night 2027-03-09 --telescope C1`,
	}, func(cmd *cobra.Command, args []string) error {
		byNight := telescope != "" || night != ""
		switch {
		case byNight && len(args) == 3:
			return work.Inputf("explain takes a field, or --night and --telescope; got both")
		case byNight && (telescope == "" || night == ""):
			return work.Inputf("explain wants --night and --telescope together")
		case !byNight && len(args) < 3:
			return work.Inputf("explain wants a field, or --night and --telescope; for example: nightwright explain %s %s --night 2027-03-01 --telescope C1", quote(args[0]), quote(args[1]))
		}
		s, err := a.survey(args[0])
		if err != nil {
			return err
		}
		pt, err := work.ReadPlan(args[1])
		if err != nil {
			return err
		}
		a.tellChanged(s, pt)
		var told any
		p := a.printer()
		if byNight {
			n, err := work.ExplainNight(cmd.Context(), s, pt, telescope, night, a.options())
			if err != nil {
				return err
			}
			told = n
			p.explainNight(n)
		} else {
			f, err := work.ExplainField(cmd.Context(), s, pt, args[2], a.options())
			if err != nil {
				return err
			}
			told = f
			p.explainField(f)
		}
		a.endProgress()
		if a.asJSON {
			return a.json(told)
		}
		return p.flush()
	})
	c.Flags().StringVar(&telescope, "telescope", "", "the telescope's `NAME`")
	c.Flags().StringVar(&night, "night", "", "the night, `YYYY-MM-DD`: the date of its evening")
	return c
}

// explainField writes why a field is where it is.
func (p *printer) explainField(f *explain.Field) {
	verdict := fmt.Sprintf("has %d of %s", f.Got, count(f.Wanted, "visit"))
	if f.Finished {
		verdict = p.green("has all its visits")
	} else if f.LimitedBy != "" {
		verdict += ", limited by " + f.LimitedBy
	}
	p.line("%s of %s, weight %g: %s", p.bold(f.Name), f.Program, f.Weight, verdict)
	for i := range f.Demands {
		p.explainDemand(&f.Demands[i])
	}
	p.head("Visits")
	if len(f.Visits) == 0 {
		p.line("  none")
		return
	}
	l := newList("<start (UTC)", "<telescope", "<demand", "<filter", "quality", "worth", "<state")
	for _, v := range f.Visits {
		l.add(clock(v.Start), clip(v.Telescope, 12), clip(v.Demand, 12), v.Filter, fixed(v.Quality, 3), millionths(v.Credit), v.State)
	}
	p.table(l)
}

func (p *printer) explainDemand(d *explain.Demand) {
	p.head("%s: %d of %s", d.Name, d.Got, count(d.Wanted, "visit"))
	l := newList("<month", "hours before", "after", "<taken in turn by")
	for _, m := range d.Months {
		l.add(m.Name, fixed(m.Before, 1), fixed(m.After, 1), takers(m.Rules))
	}
	p.table(l)
	if d.Got >= d.Wanted {
		return
	}
	p.line("")
	if len(d.Windows) == 0 {
		p.line("  There is no window that an exposure fits into.")
	} else {
		p.line("  The best windows without a visit (a perfect visit is worth %s):", millionths(d.Worth))
		for i := range d.Windows {
			p.explainWindow(&d.Windows[i])
		}
	}
	if len(d.Helps) > 0 {
		p.line("  What would help:")
	}
	for _, h := range d.Helps {
		switch {
		case h.Factor > 0:
			p.line("    %s:", h.What)
			p.line("      %.2f times as much wins the nearest of these", h.Factor)
		case h.Hours > 0:
			p.line("    %s %s h more would be open", h.What, fixed(h.Hours, 1))
		default:
			p.line("    %s", h.What)
		}
	}
}

// takers names the rules that take most in turn.
func takers(list []explain.RuleHours) string {
	var out []string
	for _, r := range list {
		if r.Turn > 0.05 && len(out) < 4 {
			out = append(out, fmt.Sprintf("%s %.1f", r.Rule, r.Turn))
		}
	}
	if len(out) == 0 {
		return "-"
	}
	return strings.Join(out, ", ")
}

func (p *printer) explainWindow(w *explain.Window) {
	p.line("    %s %s, %s UTC, quality %.3f, worth %s", tables.Date(w.Night), clip(w.Telescope, 12), clock(int64(math.Round(w.Best*1e6))), w.Quality, millionths(w.Worth))
	switch w.Why {
	case explain.Over:
		p.line("      that is over")
	case explain.Cadence:
		near := "as many as per_night allows are there"
		if w.Near != 0 {
			near = "its own visit at " + clock(w.Near) + " is nearer than gap.min"
		}
		p.line("      %s", near)
	case explain.Taken:
		p.line("      %s, worth more", rivals(w.Rivals))
	case explain.Priced:
		p.line("      its time is priced at %s, more than the visit is worth", millionths(w.Price))
	case explain.Cheaper:
		p.line("      %s,", rivals(w.Rivals))
		p.line("      worth less: to move that would lead to more moves")
	case explain.Empty:
		p.line("      nothing stands there; its time is priced at %s", millionths(w.Price))
	}
}

func rivals(list []explain.Rival) string {
	var out []string
	for i, r := range list {
		if i == 2 {
			out = append(out, fmt.Sprintf("and %d more", len(list)-i))
			break
		}
		out = append(out, fmt.Sprintf("%s (visit %d, %s)", r.Field, r.Visit, millionths(r.Worth)))
	}
	verb := " stands there"
	if len(list) > 1 {
		verb = " stand there"
	}
	return strings.Join(out, ", ") + verb
}

// explainNight writes why a night looks as it does.
func (p *printer) explainNight(n *explain.Night) {
	r := &n.Row
	p.line("%s at %s, night of %s: %s, %s of %s open hours used",
		p.bold(n.Telescope), n.Site, tables.Date(n.Night), count(int(r.Visits), "visit"), fixed(r.UsedHours, 1), fixed(r.OpenHours, 1))
	p.line("")
	p.line("  dark %s h   exposing %s h   gaps %s h   Moon %s lit", fixed(r.DarkHours, 1), fixed(r.ExposureHours, 1), fixed(r.UsedHours-r.ExposureHours, 1), percent(r.MoonIllumination, 1))
	p.line("  an hour is worth %s; on this telescope's mean night %s", millionths(r.PricePerHour), millionths(n.MeanPrice))
	if n.KeepFree > 0 {
		p.line("  keep_free leaves %s h of the open time", fixed(n.Budget/3600, 1))
	}
	if len(n.Shut) > 0 {
		p.head("Shut")
		l := newList("<from (UTC)", "<to", "<why")
		for _, s := range n.Shut {
			l.add(clock(int64(s.From*1e6)), clock(int64(s.To*1e6)), s.Why)
		}
		p.table(l)
	}
	if len(n.Programs) > 0 {
		p.head("Spent on")
		l := newList("<program", "visits", "exposing h", "worth")
		for _, g := range n.Programs {
			l.add(clip(g.Program, 20), thousands(g.Visits), fixed(g.Hours, 1), millionths(g.Credit))
		}
		p.table(l)
		p.head("The first to go: worth least for their time")
		l = newList("<start (UTC)", "<field", "visit", "worth")
		for _, c := range n.Cheapest {
			l.add(clock(c.Start), clip(c.Field, 24), fmt.Sprint(c.Visit), millionths(c.Worth))
		}
		p.table(l)
	}
	p.head("Idle")
	if len(n.Idle) == 0 {
		p.line("  no stretch of five minutes")
		return
	}
	for _, i := range n.Idle {
		p.line("  %s to %s UTC, %s min", clock(int64(i.From*1e6)), clock(int64(i.To*1e6)), fixed((i.To-i.From)/60, 0))
		p.line("    %s", idleText(&i))
	}
}

func idleText(i *explain.Idle) string {
	free := i.Lacking - i.Barred
	switch {
	case i.Lacking == 0:
		return "no field that lacks visits is up"
	case free == 0:
		return fmt.Sprintf("%s up that lack visits, all barred by gap.min or per_night", count(i.Lacking, "field"))
	}
	return fmt.Sprintf("%s up that lack visits, %d barred by cadence; %s is worth %s", count(i.Lacking, "field"), i.Barred, i.Field, millionths(i.Worth))
}
