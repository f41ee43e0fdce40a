package work

import (
	"cmp"
	"context"
	"math"
	"slices"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/formats"
	"nightwright/visibility"
)

// VisibleAsk is an object visibility query. Instants are UTC Unix seconds.
type VisibleAsk struct {
	RA, Dec  float64 // ICRS, deg
	From, To float64
	Shortest float64 // s, of a window
	Facility string  // a site's or a telescope's name; "": all
	Program  string  // whose rules hold; "": the first
}

// Visible works out when a position can be observed by the rules that a
// program's fields have, within open time, less the ledger's losses that the
// survey took. Rows are sorted by start.
func Visible(ctx context.Context, s *Survey, ask VisibleAsk, o Options) ([]formats.VisibilityRow, error) {
	program := 0
	if ask.Program != "" {
		names := make([]string, len(s.Programs))
		for i := range s.Programs {
			names[i] = s.Programs[i].Name
		}
		var err error
		if program, err = find("program", ask.Program, names); err != nil {
			return nil, err
		}
	}
	one, ok := s.withOneField(ask, program)
	if !ok {
		return nil, nil
	}
	cal := constraints.NewCalendar(one, s.Exact, s.Losses)
	sky := constraints.Tables(one, s.Exact, o.Workers)
	windows, err := constraints.NewWindows(ctx, one, sky, cal, o.Workers)
	if err != nil {
		return nil, err
	}
	var out []formats.VisibilityRow
	until := int64((s.LastNight + 2).Unix() * 1e6)
	for t := range one.Telescopes {
		name := one.Sites[one.Telescopes[t].Site].Name
		if ask.Facility != "" && !strings.EqualFold(ask.Facility, name) && !strings.EqualFold(ask.Facility, one.Telescopes[t].Name) {
			continue
		}
		for _, iv := range (single{one}).visibleOn(cal, windows, t, ask) {
			row := s.visibleRow(ask, one.Telescopes[t].Site, iv)
			row.ValidUntil, row.Facility = until, name+"/"+one.Telescopes[t].Name
			out = append(out, row)
		}
	}
	slices.SortStableFunc(out, func(a, b formats.VisibilityRow) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Facility, b.Facility))
	})
	return out, ctx.Err()
}

// single is a survey of one field.
type single struct{ *survey.Survey }

// withOneField makes a survey with a field at the position asked for and the
// nights that touch the time asked for; false when there are none.
func (s *Survey) withOneField(ask VisibleAsk, program int) (*survey.Survey, bool) {
	one := *s.Survey
	first, last := survey.Day(math.Floor(ask.From/86400))-2, survey.Day(math.Floor(ask.To/86400))+1
	one.FirstNight, one.LastNight = max(first, s.FirstNight), min(last, s.LastNight)
	if one.LastNight < one.FirstNight {
		return nil, false
	}
	rules, ok := s.usualRules(program)
	if !ok {
		return nil, false
	}
	one.Fields = []survey.Field{{
		Name: "position", RA: ask.RA * math.Pi / 180, Dec: ask.Dec * math.Pi / 180, Program: program, Weight: 1,
		NotBefore: math.Inf(-1), NotAfter: math.Inf(1), Rules: rules,
	}}
	return &one, true
}

// usualRules are those that most of a program's fields have.
func (s *Survey) usualRules(program int) ([]survey.Rules, bool) {
	var kinds [][]survey.Rules
	var counts []int
	for i := range s.Fields {
		f := &s.Fields[i]
		if f.Program != program {
			continue
		}
		k := slices.IndexFunc(kinds, func(r []survey.Rules) bool { return slices.Equal(r, f.Rules) })
		if k < 0 {
			k = len(kinds)
			kinds, counts = append(kinds, f.Rules), append(counts, 0)
		}
		counts[k]++
	}
	if len(kinds) == 0 {
		return nil, false
	}
	return kinds[slices.Index(counts, slices.Max(counts))], true
}

// visibleOn is when a telescope may observe the one field, for any demand.
func (one single) visibleOn(cal *constraints.Calendar, windows *constraints.Windows, t int, ask VisibleAsk) []visibility.Interval {
	var all []visibility.Interval
	for n := range one.Nights() {
		for d := range one.Programs[one.Fields[0].Program].Demands {
			if !one.Qualifies(&one.Fields[0], &one.Programs[one.Fields[0].Program].Demands[d], t) {
				continue
			}
			for _, w := range windows.Of(windows.Unit(0, d), windows.Class(t), n) {
				iv := windows.Interval(w)
				for _, open := range cal.Open(t, n) {
					from, to := max(iv.From, open.From, ask.From), min(iv.To, open.To, ask.To)
					if to > from {
						all = append(all, visibility.Interval{From: from, To: to})
					}
				}
			}
		}
	}
	slices.SortFunc(all, func(a, b visibility.Interval) int { return cmp.Compare(a.From, b.From) })
	var out []visibility.Interval
	for _, iv := range all {
		if k := len(out) - 1; k >= 0 && iv.From <= out[k].To {
			out[k].To = max(out[k].To, iv.To)
			continue
		}
		out = append(out, iv)
	}
	return slices.DeleteFunc(out, func(iv visibility.Interval) bool { return iv.To-iv.From < max(ask.Shortest, 1) })
}

// visibleRow measures a window on the exact path.
func (s *Survey) visibleRow(ask VisibleAsk, site int, iv visibility.Interval) formats.VisibilityRow {
	const step = 300.0
	place := constraints.Place(&s.Sites[site])
	p := visibility.Position{RA: ask.RA * math.Pi / 180, Dec: ask.Dec * math.Pi / 180}
	r := formats.VisibilityRow{
		Start: int64(math.Round(iv.From * 1e6)), Stop: int64(math.Round(iv.To * 1e6)),
		ElevationMin: math.Inf(1), ElevationMax: math.Inf(-1), MoonSeparationMin: math.Inf(1), MoonSepMx: math.Inf(-1),
	}
	for t := iv.From; ; t += step {
		t = min(t, iv.To)
		at := s.Exact.At(t)
		star := at.Star(place, p)
		moon := at.Moon(place)
		alt, sep := star.Altitude*180/math.Pi, visibility.Separation(star, moon.Horizontal)*180/math.Pi
		r.ElevationMin, r.ElevationMax = min(r.ElevationMin, alt), max(r.ElevationMax, alt)
		r.MoonSeparationMin, r.MoonSepMx = min(r.MoonSeparationMin, sep), max(r.MoonSepMx, sep)
		if t >= iv.To {
			return r
		}
	}
}
