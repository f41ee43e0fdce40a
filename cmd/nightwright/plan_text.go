package main

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/tables"
)

// plan writes the summary of a plan: the verdict first.
func (p *printer) plan(s *work.Survey, r *work.PlanResult) {
	m := &r.Tables.Summary
	p.line("%s: planned, %s", p.bold(m.Survey), p.green("every visit passed the audit"))
	if m.Status != "steps_done" {
		p.line("%s", p.red(fmt.Sprintf("The search was cut short (%s): a longer one may do better", m.Status)))
	}
	p.line("")
	p.line("  coverage %.4f   ceiling %.4f   gap %s", m.Coverage, m.Ceiling, percent(m.Gap, 1))
	if m.Expected > 0 {
		p.line("  planned for the expected weather, under which no way of acting has a mean")
		p.line("  coverage above %.4f (expected_ceiling)", m.Expected)
	}
	p.gapParts(m)
	p.line("  visits   %s of %s wanted   fields finished %s of %s",
		thousands(int(m.VisitsGot)), thousands(int(m.VisitsWanted)), thousands(int(m.FieldsFinished)), thousands(int(m.FieldsWanted)))
	p.line("  hours    dark %s   open %s   used %s (%s of open)",
		hours(m.Hours.Dark), hours(m.Hours.Open), hours(m.Hours.Used), percent(m.Hours.Used, m.Hours.Open))
	p.line("  nights   %s to %s; effort %s, seed %d", m.FirstNight, m.LastNight, m.Effort, m.Seed)
	p.programs(m)
	p.telescopes(m, r.Tables.Nights)
	p.nights(r.Tables.Nights)
}

// gapParts says what the gap is made of, in its own unit.
func (p *printer) gapParts(m *tables.Summary) {
	var parts []string
	for _, g := range m.GapParts {
		parts = append(parts, fixed(100*g.Coverage/max(m.Ceiling, 1e-12), 1)+" "+strings.ReplaceAll(g.Name, "_", " "))
	}
	if len(parts) > 0 && m.Gap >= 0.0005 {
		p.line("  of that  %s", strings.Join(parts, ", "))
	}
}

func (p *printer) programs(m *tables.Summary) {
	p.head("Programs")
	l := newList("<program", "visits", "wanted", "finished", "fields", "coverage", "share")
	for _, g := range m.Programs {
		l.add(clip(g.Program, 20), thousands(int(g.VisitsGot)), thousands(int(g.VisitsWanted)),
			thousands(int(g.FieldsFinished)), thousands(int(g.FieldsWanted)), fixed(g.Coverage, 4), percent(g.Share, 1))
	}
	p.table(l)
	for _, g := range m.Programs {
		if g.ShareBreach > 0 {
			p.line("  %s", p.red(fmt.Sprintf("%s misses its share by %s: %s", g.Program, percent(g.ShareBreach, 1), g.ShareWhy)))
		}
	}
}

// telescopes lists sites and telescopes; the price is what one more hour there
// is worth, as the mean over its open time.
func (p *printer) telescopes(m *tables.Summary, nights []tables.NightRow) {
	p.head("Telescopes (price: what one more hour would add to the ceiling, in millionths)")
	l := newList("<site", "<telescope", "visits", "dark h", "open h", "used h", "price")
	for _, t := range m.Telescopes {
		sum, open := 0.0, 0.0
		for i := range nights {
			if n := &nights[i]; n.Telescope == t.Telescope {
				sum += n.PricePerHour * n.OpenHours
				open += n.OpenHours
			}
		}
		price := "-"
		if open > 0 {
			price = millionths(sum / open)
		}
		l.add(clip(t.Site, 20), clip(t.Telescope, 12), thousands(int(t.Visits)), hours(t.Hours.Dark), hours(t.Hours.Open), hours(t.Hours.Used), price)
	}
	p.table(l)
}

// noPrice is under what a price of an hour is nothing: a millionth of a
// millionth of coverage is what is left of the price search.
const noPrice = 1e-12

// extremes is how many of the dearest and of the cheapest nights are shown.
const extremes = 3

// nights lists the telescope-nights whose hours are worth the most and the
// least: the ones to guard, and the ones to give away.
func (p *printer) nights(rows []tables.NightRow) {
	var open []*tables.NightRow
	for i := range rows {
		if rows[i].OpenHours > 0 {
			open = append(open, &rows[i])
		}
	}
	if len(open) == 0 {
		p.head("No telescope is open in any night of the period")
		return
	}
	slices.SortStableFunc(open, func(a, b *tables.NightRow) int { return cmp.Compare(b.PricePerHour, a.PricePerHour) })
	list := func(rows []*tables.NightRow) {
		l := newList("<night", "<telescope", "price", "open h", "used h", "visits", "Moon")
		for _, n := range rows {
			l.add(tables.Date(n.Night), clip(n.Telescope, 12), millionths(n.PricePerHour), hours(n.OpenHours), hours(n.UsedHours),
				thousands(int(n.Visits)), percent(n.MoonIllumination, 1))
		}
		p.table(l)
	}
	if open[0].PricePerHour < noPrice {
		p.head("No night is scarce: an hour more would add nothing to the ceiling")
		return
	}
	k := min(extremes, (len(open)+1)/2)
	p.head("Dearest nights: lose these last")
	list(open[:k])
	if len(open) > k {
		p.head("Cheapest nights: maintenance costs least here")
		cheap := slices.Clone(open[len(open)-k:])
		slices.Reverse(cheap)
		list(cheap)
	}
}

// planNext says where the plan is and what to run next.
func (p *printer) planNext(s *work.Survey, r *work.PlanResult) {
	p.line("")
	p.line("The plan is in %s. Next:", r.Folder)
	if len(r.Tables.Visits) > 0 {
		v := &r.Tables.Visits[0]
		p.line("  nightwright sheet %s %s --telescope %s --night %s", quote(s.Path), quote(r.Folder), quote(v.Telescope), tables.Date(v.Night))
	}
	p.line("  nightwright report %s", quote(r.Folder))
	p.line("  nightwright audit %s %s", quote(s.Path), quote(r.Folder))
	p.line("  nightwright export %s --as csv", quote(r.Folder))
}

func fixed(x float64, decimals int) string { return strconv.FormatFloat(x, 'f', decimals, 64) }

// millionths writes a price in 1e-6 of coverage an hour, three figures.
func millionths(x float64) string {
	x *= 1e6
	switch {
	case math.Abs(x) < 1e6*noPrice:
		return "0"
	case math.Abs(x) >= 100:
		return thousands(int(math.Round(x)))
	}
	return strconv.FormatFloat(x, 'g', 3, 64)
}
