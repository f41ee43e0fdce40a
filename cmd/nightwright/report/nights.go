package report

import (
	"context"
	"fmt"
	"math"
	"slices"
	"time"

	"nightwright/cmd/nightwright/draw"
	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// calendar is each site's nights and its telescopes', as the calendar shows
// them, and the nights' dates.
func (g *gathered) calendar(ctx context.Context) ([]draw.CalendarSite, []float64) {
	sv := g.Survey
	days := make([]float64, sv.Nights())
	for n := range days {
		days[n] = (sv.FirstNight + survey.Day(n)).Unix()
	}
	at := map[string]int{}
	for t := range sv.Telescopes {
		at[sv.Telescopes[t].Name] = t
	}
	use := make([][]draw.CalendarUse, len(sv.Telescopes))
	for t := range use {
		use[t] = make([]draw.CalendarUse, len(days))
	}
	for i := range g.Tables.Nights {
		r := &g.Tables.Nights[i]
		t, ok := at[r.Telescope]
		if n := int(r.Night) - int(sv.FirstNight); ok && n >= 0 && n < len(days) {
			use[t][n] = draw.CalendarUse{Open: r.OpenHours, Used: r.UsedHours, Price: r.PricePerHour, Visits: int(r.Visits)}
		}
	}
	sites := make([]draw.CalendarSite, len(sv.Sites))
	for s := range sites {
		sites[s] = draw.CalendarSite{Name: sv.Sites[s].Name, Nights: make([]draw.CalendarNight, len(days))}
		for _, t := range sv.Sites[s].Telescopes {
			sites[s].Telescopes = append(sites[s].Telescopes, sv.Telescopes[t].Name)
			sites[s].Use = append(sites[s].Use, use[t])
		}
	}
	model.Parallel(g.Workers, len(sites)*len(days), func(i int) {
		if ctx.Err() == nil {
			s, n := i/len(days), i%len(days)
			sites[s].Nights[n] = g.calendarNight(s, n)
		}
	})
	return sites, days
}

func (g *gathered) calendarNight(s, n int) draw.CalendarNight {
	place := constraints.Place(&g.Survey.Sites[s])
	day := g.Survey.FirstNight + survey.Day(n)
	row := g.Exact.Almanac(place, int32(day))
	return draw.CalendarNight{
		Label: day.String(), Midnight: day.Unix() + 86400 - place.Longitude/(2*math.Pi)*86400,
		Set: below(row.Night, row.Horizon), Nautical: below(row.Night, row.Nautical), Dark: below(row.Night, row.Dark),
		Moon: g.Exact.MoonAbove(place, row.Night), Illumination: row.Illumination,
	}
}

// below is the time of a night in which the Sun is under a passage's altitude.
func below(night visibility.Interval, p visibility.Passage) []visibility.Interval {
	switch p.State {
	case visibility.AlwaysAbove:
		return nil
	case visibility.AlwaysBelow:
		return []visibility.Interval{night}
	case visibility.SetsOnly:
		return []visibility.Interval{{From: p.Down, To: night.To}}
	case visibility.RisesOnly:
		return []visibility.Interval{{From: night.From, To: p.Up}}
	}
	return []visibility.Interval{{From: p.Down, To: p.Up}}
}

// lanes is one night of each telescope that has visits in it.
func (g *gathered) lanes(day survey.Day) []draw.Lane {
	sv := g.Survey
	lanes := make([]draw.Lane, len(sv.Telescopes))
	model.Parallel(g.Workers, len(lanes), func(t int) { lanes[t] = g.lane(t, day) })
	return slices.DeleteFunc(lanes, func(l draw.Lane) bool { return len(l.Blocks) == 0 && len(l.Open) == 0 })
}

func (g *gathered) lane(t int, day survey.Day) draw.Lane {
	sv := g.Survey
	tel := &sv.Telescopes[t]
	n := int(day - sv.FirstNight)
	c := g.calendarNight(tel.Site, n)
	l := draw.Lane{
		Title: tel.Name + ", " + sv.Sites[tel.Site].Name, Set: c.Set, Nautical: c.Nautical, Dark: c.Dark, Open: g.Calendar.Open(t, n),
		Span: g.Calendar.Night(tel.Site, n),
	}
	if len(c.Set) > 0 {
		l.Span = visibility.Interval{From: max(l.Span.From, c.Set[0].From-1200), To: min(l.Span.To, c.Set[len(c.Set)-1].To+1200)}
	}
	curveOf := map[string]int{}
	used := 0.0
	for i := range g.Tables.Visits {
		v := &g.Tables.Visits[i]
		if v.Telescope != tel.Name || v.Night != int32(day) {
			continue
		}
		k, ok := curveOf[v.Field]
		if !ok {
			k = len(l.Curves)
			curveOf[v.Field] = k
			l.Curves = append(l.Curves, g.altitudes(tel.Site, g.fieldID[v.Field], l.Span))
		}
		from, to := float64(v.Start)/1e6, float64(v.End)/1e6
		used += v.Exposure + v.GapBefore
		l.Blocks = append(l.Blocks, draw.Block{From: from, To: to, Kind: g.program[v.Program], Curve: k,
			Hint: fmt.Sprintf("%s %s, %s, %.0f s in %s, altitude %.0f°", time.UnixMicro(v.Start).UTC().Format("15:04:05"), v.Field, v.Program, v.Exposure, v.Filter, v.Altitude)})
	}
	place := constraints.Place(&sv.Sites[tel.Site])
	for _, at := range steps(l.Span) {
		l.Moon.T = append(l.Moon.T, at)
		l.Moon.Altitude = append(l.Moon.Altitude, g.Exact.Moon(place, at).Altitude)
	}
	open := 0.0
	for i := range g.Tables.Nights {
		if r := &g.Tables.Nights[i]; r.Telescope == tel.Name && r.Night == int32(day) {
			open = r.OpenHours
		}
	}
	l.Note = fmt.Sprintf("%d exposures, %.1f of %.1f h used, Moon %.0f %%", len(l.Blocks), used/3600, open, 100*c.Illumination)
	return l
}

func (g *gathered) altitudes(site, field int, span visibility.Interval) draw.Curve {
	place := constraints.Place(&g.Survey.Sites[site])
	f := &g.Survey.Fields[field]
	p := visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec}
	var c draw.Curve
	for _, at := range steps(span) {
		c.T = append(c.T, at)
		c.Altitude = append(c.Altitude, g.Exact.Star(place, p, at).Altitude)
	}
	return c
}

// steps are instants of a night at which curves are drawn.
func steps(span visibility.Interval) []float64 {
	const n = 48
	out := make([]float64, n+1)
	for k := range out {
		out[k] = span.From + (span.To-span.From)*float64(k)/n
	}
	return out
}
