package main

import (
	"bytes"
	"encoding/json"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scenarios/seasons"
	"nightwright/scheduler/tables"
)

func (a *app) compareCommand() *cobra.Command {
	var f seasonsFlags
	choose, noShapley := 0, false
	c := a.command("compare SURVEY", 0, &cobra.Command{
		Short: "networks of sites against each other under the same skies",
		Long: `Plays the survey's networks (without any: all sites, and every removal of one)
through the same simulated seasons, each with prices of its own for the weather
expected, and tells: mean coverage with its 95 % interval; the difference from
the first network, season by season; how often each gets most; coverage by cost;
the longest dark gap round the clock; what is left when any one site is down for
a month. For each site: what it adds to all others, its Shapley share of the
coverage (exact up to 10 sites, sampled above), and what it is best at.

--choose K tries every set of K sites, or, where there are too many, adds the
best site K times and tells how far from the best set that may be.`,
		Example: `  nightwright compare mysurvey
  nightwright compare mysurvey --choose 3 --seasons 200
  nightwright compare mysurvey --seasons 1000 --shard 3/16 --out parts`,
	}, func(cmd *cobra.Command, args []string) error {
		f.asked(cmd)
		if cmd.Flags().Changed("choose") && choose < 1 {
			return work.Inputf("--choose is %d; want 1 or more sites", choose)
		}
		if f.submit != "" {
			return a.submit(cmd, args, &f)
		}
		s, err := a.survey(args[0])
		if err != nil {
			return err
		}
		a.noWeather(s)
		r, greed, err := work.Compare(cmd.Context(), s, work.CompareAsk{SeasonsAsk: f.ask, Choose: choose, NoShapley: noShapley}, a.options())
		if err != nil {
			return err
		}
		if greed != nil && !a.asJSON && !f.asCSV {
			a.endProgress()
			p := a.printer()
			p.greed(greed)
			if err := p.flush(); err != nil {
				return err
			}
		}
		return a.seasonsDone(r, nil, f.asCSV)
	})
	f.add(c.Flags(), 50)
	c.Flags().IntVar(&choose, "choose", 0, "choose `K` of the survey's sites")
	c.Flags().BoolVar(&noShapley, "no-shapley", false, "leave the sites' Shapley shares out: they take a run of every set of sites")
	return c
}

// compareResult is a comparison for scripts: the tables' rows by their columns.
type compareResult struct {
	seasons.CompareSummary
	Networks  json.RawMessage `json:"networks"`
	Pairs     json.RawMessage `json:"pairs"`
	Worths    json.RawMessage `json:"sites"`
	Strengths json.RawMessage `json:"strengths"`
}

func compareJSON(t *seasons.CompareTables) compareResult {
	return compareResult{
		t.Summary, jsonRows(tables.Networks, t.Networks), jsonRows(tables.Pairs, t.Pairs),
		jsonRows(tables.Worths, t.Worths), jsonRows(tables.Strengths, t.Strengths),
	}
}

// jsonRows is a table as JSON. A buffer takes all that is written, so that
// there is no error to tell.
func jsonRows[T any](t tables.Table[T], rows []T) json.RawMessage {
	var b bytes.Buffer
	if err := work.WriteJSONRows(&b, t, rows); err != nil {
		return json.RawMessage("null")
	}
	return b.Bytes()
}

// greed tells how a network was chosen step by step.
func (p *printer) greed(g *seasons.Greed) {
	p.line("Too many sets to try them all: the best site was added step by step")
	l := newList("<sites", "coverage")
	for i := range g.Networks {
		l.add(clip(g.Networks[i].Name, 56), fixed(g.Coverage[i], 4))
	}
	p.table(l)
	last := g.Coverage[len(g.Coverage)-1]
	p.line("  no set of that size gets more than %.4f (%s above), if sites never help", g.Bound, percent(g.Bound-last, last))
	p.line("  a larger network more than a smaller one; at most that was broken by %.4f", g.Slack)
	p.line("")
}

// compare writes networks against each other.
func (p *printer) compare(r *work.SeasonsResult) {
	t := r.Compare
	p.line("%s of weather, the same skies for all networks", count(t.Summary.Seasons, "season"))
	if len(t.Networks) == 0 {
		return
	}
	p.head("Networks (difference from %s; best: how often none gets more)", clip(t.Networks[0].Network, 20))
	l := newList("<network", "coverage", "difference", "+- 95 %", "best", "cost", "per cost")
	for _, n := range t.Networks {
		diff, interval := "-", "-"
		if n.Order > 1 {
			diff, interval = signed(n.Difference), fixed((n.DifferenceHigh-n.DifferenceLow)/2, 4)
		}
		l.add(clip(n.Network, 22), fixed(n.Coverage, 4), diff, interval, percent(n.BestChance, 1), fixed(n.Cost, 2), fixed(n.PerCost, 4))
	}
	p.table(l)
	p.head("Longest dark gap round the clock; what is left with a site down for a month")
	l = newList("<network", "dark gap", "a site open", "left", "<when down")
	for _, n := range t.Networks {
		l.add(clip(n.Network, 22), hours(n.DarkGap)+" h", percent(n.Round, 1), percent(n.Redundancy, 1), clip(n.WorstDown, 14))
	}
	p.table(l)
	p.worths(t)
	p.line("")
	p.line("The tables are in %s: networks, pairs, worths and strengths.", r.Folder)
}

func signed(x float64) string {
	if x < 0 {
		return fixed(x, 4)
	}
	return "+" + fixed(x, 4)
}

// worths writes what each site adds and what it is best at.
func (p *printer) worths(t *seasons.CompareTables) {
	if len(t.Worths) == 0 {
		return
	}
	p.head("Sites (adds: coverage that all others lack; share: Shapley, %s)", t.Summary.Shapley)
	l := newList("<site", "alone", "adds", "share", "per cost", "<best at")
	for _, w := range t.Worths {
		share, per := fixed(w.Shapley, 4), fixed(w.ShapleyPerCost, 4)
		if t.Summary.Shapley == "none" {
			share, per = "-", "-"
		}
		l.add(clip(w.Site, 16), fixed(w.Alone, 4), fixed(w.Marginal, 4), share, per, bestAt(t.Strengths, w.Site))
	}
	p.table(l)
}

// noticed is the strength from which a site counts as good at something, and
// enough the part of all credit that makes a bin worth naming.
const (
	noticed = 1.1
	enough  = 0.05
)

// bestAt names the bin of each kind in which a site is strongest.
func bestAt(rows []tables.StrengthRow, site string) string {
	best := map[string]tables.StrengthRow{}
	for _, r := range rows {
		if r.Site == site && r.Network >= enough && r.Strength >= noticed && r.Strength > best[r.Kind].Strength {
			best[r.Kind] = r
		}
	}
	var out []string
	if b, ok := best["declination"]; ok {
		out = append(out, "dec "+b.Bin)
	}
	if b, ok := best["moon"]; ok {
		out = append(out, b.Bin+" nights")
	}
	if b, ok := best["month"]; ok {
		out = append(out, "month "+b.Bin)
	}
	if len(out) == 0 {
		return "-"
	}
	return strings.Join(out, ", ")
}
