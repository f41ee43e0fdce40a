// Package slots writes small surveys as integer programmes over a grid of
// starts, for general exact solvers: an outside measure of plans and ceilings.
// Nothing but tests and the benchmark command imports it.
//
// There are two programmes. Each has a column for a visit of a want at given
// starts on one telescope:
//
//   - Restricted: starts lie on the grid, the windows are those of plans, and
//     the longest gap there can be follows every exposure. Whatever it allows is
//     a legal plan, so its optimum R is within reach: no ceiling may lie below.
//   - Favourable: a column stands for all starts of a cell of the grid, with
//     the best quality in it, the windows of the ceiling, and the least gap
//     after every exposure. Every legal plan maps to one of its solutions, so
//     its optimum U is out of reach: no plan may lie above.
//
// Values are in C (coverage), instants in UTC Unix microseconds.
package slots

import (
	"cmp"
	"slices"

	"nightwright/scheduler/model"
)

// Column is one visit at given starts: it is taken or not.
type Column struct {
	Want, Scope, Night int32
	Starts             []int64 // of its exposures; in the favourable programme the cells' starts
	Value              float64 // C
	Exposure           float64 // scaled exposure time, s
	busy               []model.Span
	use                float64 // s of the telescope-night, gaps included
}

// Term is a coefficient of a column in a row.
type Term struct {
	Column int
	Factor float64
}

// Row bounds a sum of columns: Terms <= Most.
type Row struct {
	Terms []Term
	Most  float64
}

// Program is an integer programme: maximise the columns' values under the rows.
// Columns from len(Columns) on stand for finished fields.
type Program struct {
	Columns []Column
	Bonus   []float64 // C of each finished field's column
	Rows    []Row
}

// ask is what the two programmes share while they are built.
type ask struct {
	p      *model.Problem
	grid   int64
	spread int64 // us by which two starts of a column may differ: 0, or a cell
	shares []Share
	out    *Program
}

// Share bounds a program's part of all scaled exposure time, to within one of
// its longest visits.
type Share struct{ Min, Max float64 }

// finish adds all rows once the columns stand.
func (a *ask) finish() {
	a.clashes()
	a.cadence()
	a.counts()
	a.budgets()
	a.shareRows()
}

// less adds a row unless nothing is in it.
func (a *ask) less(terms []Term, most float64) {
	if len(terms) > 0 {
		a.out.Rows = append(a.out.Rows, Row{terms, most})
	}
}

// stretch is a half-open interval that a column covers.
type stretch struct {
	model.Span
	column int
}

// cover adds, for each instant at which a stretch begins, that at most one of
// the stretches over it is taken. For intervals these are all cliques.
func (a *ask) cover(list []stretch) {
	slices.SortStableFunc(list, func(x, y stretch) int { return cmp.Compare(x.From, y.From) })
	var last []Term
	for i := range list {
		at := list[i].From
		if i+1 < len(list) && list[i+1].From == at {
			continue
		}
		var terms []Term
		for k := 0; k <= i; k++ {
			if list[k].To > at {
				terms = append(terms, Term{list[k].column, 1})
			}
		}
		if len(terms) > 1 && !slices.Equal(terms, last) {
			a.less(terms, 1)
			last = terms
		}
	}
}

// clashes keeps exposures of one telescope apart.
func (a *ask) clashes() {
	for t := range a.p.Scopes {
		var list []stretch
		for i := range a.out.Columns {
			c := &a.out.Columns[i]
			if int(c.Scope) != t {
				continue
			}
			for _, b := range c.busy {
				if b.To > b.From {
					list = append(list, stretch{b, i})
				}
			}
		}
		a.cover(list)
	}
}

// cadence keeps the starts of a want's visits a gap apart, over all telescopes,
// and counts them by night label.
func (a *ask) cadence() {
	byWant := make([][]int, len(a.p.Wants))
	for i := range a.out.Columns {
		byWant[a.out.Columns[i].Want] = append(byWant[a.out.Columns[i].Want], i)
	}
	for wi := range a.p.Wants {
		w := &a.p.Wants[wi]
		gap := w.Spacing
		if a.spread > 0 {
			// Starts a gap apart lie at least floor(gap / grid) cells apart.
			gap = max(0, w.GapMin-999) / a.grid * a.grid
		}
		if gap > 0 {
			var list []stretch
			for _, i := range byWant[wi] {
				s := a.out.Columns[i].Starts[0]
				list = append(list, stretch{model.Span{From: s, To: s + gap}, i})
			}
			a.cover(list)
		}
		if w.PerNight == 0 {
			continue
		}
		for n := range a.p.Nights {
			var terms []Term
			for _, i := range byWant[wi] {
				if int(a.out.Columns[i].Night) == n {
					terms = append(terms, Term{i, 1})
				}
			}
			a.less(terms, float64(w.PerNight))
		}
	}
}

// counts allows no more visits than are wanted, and a bonus only where all
// are got.
func (a *ask) counts() {
	fields := len(a.p.FieldWant) - 1
	a.out.Bonus = make([]float64, fields)
	byWant := make([][]Term, len(a.p.Wants))
	for i := range a.out.Columns {
		w := a.out.Columns[i].Want
		byWant[w] = append(byWant[w], Term{i, 1})
	}
	for f := range fields {
		a.out.Bonus[f] = a.p.Bonus(f)
		for wi := a.p.FieldWant[f]; wi < a.p.FieldWant[f+1]; wi++ {
			visits := float64(a.p.Wants[wi].Visits)
			a.less(byWant[wi], visits)
			got := []Term{{len(a.out.Columns) + f, visits}}
			for _, t := range byWant[wi] {
				got = append(got, Term{t.Column, -1})
			}
			a.less(got, 0)
		}
	}
}

// budgets bounds the time used of each telescope-night: by keep_free, and in
// the favourable programme by the open time too.
func (a *ask) budgets() {
	byNight := make([][]Term, len(a.p.Scopes)*a.p.Nights)
	for i := range a.out.Columns {
		c := &a.out.Columns[i]
		k := int(c.Scope)*a.p.Nights + int(c.Night)
		byNight[k] = append(byNight[k], Term{i, c.use})
	}
	for t := range a.p.Scopes {
		for n := range a.p.Nights {
			terms := byNight[t*a.p.Nights+n]
			least := model.Sec(a.p.Scopes[t].LeastGap)
			if a.p.Scopes[t].KeepFree > 0 {
				most := model.Sec(a.p.Budget(t, n))
				if a.spread > 0 {
					most += least
				}
				a.less(terms, most)
			}
			if a.spread > 0 {
				var open int64
				spans := a.p.OpenOuter(t, n)
				for _, o := range spans {
					open += o.To - o.From
				}
				a.less(terms, model.Sec(open)+least*float64(len(spans)))
			}
		}
	}
}

// shareRows bounds programs' parts of the exposure time.
func (a *ask) shareRows() {
	longest := a.p.LongestVisits()
	for pi, s := range a.shares {
		row := func(factor func(own bool) float64) {
			var terms []Term
			for i := range a.out.Columns {
				c := &a.out.Columns[i]
				terms = append(terms, Term{i, c.Exposure * factor(int(a.p.Wants[c.Want].Program) == pi)})
			}
			a.less(terms, longest[pi])
		}
		if s.Min > 0 {
			row(func(own bool) float64 { return s.Min - one(own) })
		}
		if s.Max < 1 {
			row(func(own bool) float64 { return one(own) - s.Max })
		}
	}
}

func one(own bool) float64 {
	if own {
		return 1
	}
	return 0
}

// Asked returns the share bounds that a survey asks for.
func Asked(p *model.Problem) []Share {
	out := make([]Share, len(p.Survey.Programs))
	for i := range out {
		out[i] = Share{p.Survey.Programs[i].ShareMin, p.Survey.Programs[i].ShareMax}
	}
	return out
}
