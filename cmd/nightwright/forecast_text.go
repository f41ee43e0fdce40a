package main

import (
	"cmp"
	"fmt"
	"slices"

	"nightwright/cmd/nightwright/work"
	"nightwright/scenarios/seasons"
	"nightwright/scheduler/tables"
)

// seasonsDone writes the result of a forecast, a comparison, or a part of one.
func (a *app) seasonsDone(r *work.SeasonsResult, plan *tables.Summary, asCSV bool) error {
	a.endProgress()
	if r.Part != "" {
		return a.partDone(r)
	}
	if a.asJSON {
		if r.Forecast != nil {
			return a.json(seasonsJSON{Folder: r.Folder, Result: r.Forecast.Summary})
		}
		return a.json(seasonsJSON{Folder: r.Folder, Result: compareJSON(r.Compare)})
	}
	switch {
	case asCSV && r.Forecast != nil:
		return tables.Seasons.WriteCSV(a.stdout, r.Forecast.Seasons)
	case asCSV:
		return tables.Networks.WriteCSV(a.stdout, r.Compare.Networks)
	}
	p := a.printer()
	if r.Forecast != nil {
		p.forecast(r, plan)
	} else {
		p.compare(r)
	}
	return p.flush()
}

// forecast writes what seasons give: the verdict first.
func (p *printer) forecast(r *work.SeasonsResult, plan *tables.Summary) {
	f := r.Forecast
	if plan != nil {
		p.line("%s: %s of weather", p.bold(plan.Survey), count(f.Summary.Seasons, "season"))
		p.line("  under clear skies the plan has a coverage of %.4f, at most %.4f can be had", plan.Coverage, plan.Ceiling)
	} else {
		p.line("%s of weather", count(f.Summary.Seasons, "season"))
	}
	p.head("Coverage by way of acting (1 in 20: what one season in twenty falls below)")
	l := newList("<policy", "mean", "95 % interval", "1 in 20", "finished", "lost h", "used h", "wasted h")
	for _, s := range f.Summary.Policies {
		l.add(s.Policy, fixed(s.Coverage.Mean, 4), span(s.Coverage, 4), fixed(s.P05, 4), fixed(s.FieldsFinished.Mean, 1),
			hours(s.LostHours.Mean), hours(s.UsedHours), hours(s.WastedHours))
	}
	p.table(l)
	p.hindsight(f.Summary.Policies)
	p.chances(f)
	p.line("")
	p.line("The tables are in %s: seasons, bands and chances.", r.Folder)
}

// span writes an interval.
func span(i seasons.Interval, decimals int) string {
	return fixed(i.Low, decimals) + "-" + fixed(i.High, decimals)
}

// hindsight says how far each policy is from plans that knew the weather.
func (p *printer) hindsight(list []seasons.PolicySummary) {
	if len(list) == 0 || list[0].OfHindsightPlan == nil {
		return
	}
	p.head("Against hindsight, %s planned with their weather known", count(list[0].HindsightSeasons, "season"))
	l := newList("<policy", "of such a plan", "interval", "of the ceiling")
	for _, s := range list {
		interval := "-"
		if s.HindsightSeasons > 1 {
			interval = fmt.Sprintf("%.1f-%.1f %%", 100*s.OfHindsightPlan.Low, 100*s.OfHindsightPlan.High)
		}
		l.add(s.Policy, percent(s.OfHindsightPlan.Mean, 1), interval, percent(s.OfHindsightLimit.Mean, 1))
	}
	p.table(l)
}

// worstFields is how many fields with the least chance are shown.
const worstFields = 8

// chances sums up the fields' chances of the best policy, and names the
// fields that are least likely to be finished.
func (p *printer) chances(f *seasons.ForecastTables) {
	best := ""
	top := -1.0
	for _, s := range f.Summary.Policies {
		if s.Coverage.Mean > top {
			best, top = s.Policy, s.Coverage.Mean
		}
	}
	var last []tables.ChanceRow
	end := int32(0)
	for _, c := range f.Chances {
		end = max(end, c.MonthEnd)
	}
	for _, c := range f.Chances {
		if c.Policy == best && c.MonthEnd == end {
			last = append(last, c)
		}
	}
	if len(last) == 0 {
		return
	}
	bins := []struct {
		name string
		low  float64
	}{{"95 % or more", 0.95}, {"50 to 95 %", 0.5}, {"5 to 50 %", 0.05}, {"under 5 %", -1}}
	counts := make([]int, len(bins))
	for _, c := range last {
		k := slices.IndexFunc(bins, func(b struct {
			name string
			low  float64
		}) bool {
			return c.Chance >= b.low
		})
		counts[k]++
	}
	p.head("Chance to be finished by %s (%s)", tables.Date(end), best)
	l := newList("<chance", "fields")
	for i, b := range bins {
		l.add(b.name, thousands(counts[i]))
	}
	p.table(l)
	slices.SortStableFunc(last, func(a, b tables.ChanceRow) int { return cmp.Compare(a.Chance, b.Chance) })
	names := ""
	for i := range min(worstFields, len(last)) {
		if names != "" {
			names += ", "
		}
		names += fmt.Sprintf("%s %.0f %%", clip(last[i].Field, 16), 100*last[i].Chance)
		if len(names) > pageWidth-24 {
			break
		}
	}
	p.line("  least likely: %s", names)
}
