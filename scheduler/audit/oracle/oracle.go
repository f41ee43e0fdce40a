// Package oracle finds the best plan of a micro-survey by trying them all, on
// a coarse grid of starts and with nothing but the audit to say what is legal
// and what it earns. It is for tests: no ceiling may lie below what it finds,
// and no search on the same grid above it.
//
// What it returns is a legal plan, so its coverage is a lower bound of the
// best there is; with starts off the grid there may be better.
package oracle

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/scheduler/audit"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Limits of what is tried; a survey beyond them is refused, not cut short.
const (
	maxVisits     = 8
	maxCandidates = 20_000     // legal ones
	maxTried      = 300_000    // legal or not
	maxNodes      = 20_000_000 // of the search
)

// highestSun is the Sun's altitude above which nothing is legal.
const highestSun = -5 * math.Pi / 180

// Oracle judges plans of one survey. It is not safe for concurrent use.
type Oracle struct {
	sv    *survey.Survey
	exact *visibility.Exact
	judge *audit.Judge
}

// New prepares the judge of a survey; exact nil: made from the survey's own
// leap seconds and Earth orientation.
func New(ctx context.Context, sv *survey.Survey, exact *visibility.Exact) (*Oracle, error) {
	if exact == nil {
		exact = visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))
	}
	j, err := audit.NewJudge(ctx, sv, exact, nil, 1)
	if err != nil {
		return nil, err
	}
	return &Oracle{sv, exact, j}, nil
}

// Legal reports whether a plan breaks nothing. Of its rows only who, what and
// when are read: names, Visit, Set, Night, Start, End and State.
func (o *Oracle) Legal(visits []audit.Visit) bool {
	r := o.judged(visits)
	return r.Legal()
}

// Coverage returns what a plan earns, legal or not.
func (o *Oracle) Coverage(visits []audit.Visit) float64 { return o.judged(visits).Score.Coverage }

func (o *Oracle) judged(visits []audit.Visit) *audit.Report {
	r, err := o.judge.Check(context.Background(), audit.Plan{Visits: visits, LegalityOnly: true})
	if err != nil { // only a stopped context errs
		panic(fmt.Sprintf("oracle: %v", err))
	}
	return r
}

// candidate is one visit that is legal alone.
type candidate struct {
	rows  []audit.Visit // of the set, or one
	value float64       // of C, bonus apart
	id    int
}

// want is one demand of one field with its candidates, the best first.
type want struct {
	field, demand, visits int
	list                  []candidate
	rest                  float64 // most that this want and those after it can earn
}

// Best tries every plan whose starts are multiples of step (s) since 1970,
// within sets also every offset by a multiple of step within the tolerance. It
// errs when the survey is too large to be sure: over 8 visits, or too many
// plans.
func (o *Oracle) Best(ctx context.Context, step float64) (coverage float64, visits []audit.Visit, err error) {
	b := &best{o: o, ctx: ctx, bonus: make([]float64, len(o.sv.Fields)), pairs: map[[2]int]bool{}}
	total, count := 0.0, 0
	for f := range o.sv.Fields {
		total += o.sv.WeightOf(&o.sv.Fields[f])
		count += o.sv.Wanted(&o.sv.Fields[f])
	}
	if count > maxVisits {
		return 0, nil, fmt.Errorf("oracle: the survey wants %d visits; at most %d can be tried out", count, maxVisits)
	}
	if n := o.tries(step); n > maxTried {
		return 0, nil, fmt.Errorf("oracle: %.0f starts; at most %d can be tried out, take a longer step", n, maxTried)
	}
	for f := range o.sv.Fields {
		field := &o.sv.Fields[f]
		if total > 0 {
			b.bonus[f] = o.sv.WeightOf(field) / total * o.sv.FinishBonus / (1 + o.sv.FinishBonus)
		}
		for d := range o.sv.Programs[field.Program].Demands {
			w := want{field: f, demand: d, visits: o.sv.Programs[field.Program].Demands[d].Visits}
			o.candidates(&w, step, b.bonus[f])
			b.wants = append(b.wants, w)
		}
	}
	// Ids order the memory of pairs; the bound adds up from the back.
	n := 0
	for i := len(b.wants) - 1; i >= 0; i-- {
		w := &b.wants[i]
		for k := range w.list {
			w.list[k].id = n
			n++
		}
		if i+1 < len(b.wants) {
			w.rest = b.wants[i+1].rest
		}
		for k := range min(w.visits, len(w.list)) {
			w.rest += w.list[k].value
		}
	}
	if n > maxCandidates {
		return 0, nil, fmt.Errorf("oracle: %d candidates; at most %d can be tried out, take a longer step", n, maxCandidates)
	}
	for _, x := range b.bonus {
		b.spare += x
	}
	if err := b.search(0, 0, 0, 0); err != nil {
		return 0, nil, err
	}
	return b.coverage, b.plan, nil
}

// tries is how many starts a step makes, for visits alone.
func (o *Oracle) tries(step float64) float64 {
	n := 0.0
	for f := range o.sv.Fields {
		for _, d := range o.sv.Programs[o.sv.Fields[f].Program].Demands {
			ways := 86400 / step
			for _, x := range d.Exposures {
				ways *= 1 + 2*math.Floor(x.Tolerance/step)
			}
			n += ways
		}
	}
	return n * float64(len(o.sv.Telescopes)*o.sv.Nights())
}

// candidates lists the legal starts of a demand on every telescope and night.
func (o *Oracle) candidates(w *want, step, bonus float64) {
	for t := range o.sv.Telescopes {
		s := &o.sv.Sites[o.sv.Telescopes[t].Site]
		place := visibility.Site{Latitude: s.Latitude, Longitude: s.Longitude, Elevation: s.Elevation}
		for n := range o.sv.Nights() {
			day := o.sv.FirstNight + survey.Day(n)
			night := o.exact.Night(place, int32(day))
			for at := math.Ceil(night.From/step) * step; at < night.To; at += step {
				if o.exact.Sun(place, at).Altitude > highestSun {
					continue
				}
				o.steps(w, t, day, []float64{at}, step, bonus)
			}
		}
	}
	slices.SortStableFunc(w.list, func(a, b candidate) int { return cmp.Compare(b.value, a.value) })
}

// steps extends the starts of a set to all its exposures, and keeps what is legal.
func (o *Oracle) steps(w *want, scope int, day survey.Day, starts []float64, step, bonus float64) {
	d := &o.sv.Programs[o.sv.Fields[w.field].Program].Demands[w.demand]
	if k := len(starts); k < len(d.Exposures) {
		x := &d.Exposures[k]
		for m := -math.Floor(x.Tolerance / step); m <= math.Floor(x.Tolerance/step); m++ {
			o.steps(w, scope, day, append(slices.Clone(starts), starts[k-1]+x.After+m*step), step, bonus)
		}
		return
	}
	rows := o.rows(w, scope, day, starts)
	r := o.judged(rows)
	if !r.Legal() {
		return
	}
	value := r.Score.Coverage
	if r.Score.FieldsFinished > o.idle() {
		value -= bonus
	}
	w.list = append(w.list, candidate{rows: rows, value: value})
}

// idle counts fields that want nothing, which are finished from the start.
func (o *Oracle) idle() int64 {
	var n int64
	for f := range o.sv.Fields {
		if o.sv.Wanted(&o.sv.Fields[f]) == 0 {
			n++
		}
	}
	return n
}

func (o *Oracle) rows(w *want, scope int, day survey.Day, starts []float64) []audit.Visit {
	f, t := &o.sv.Fields[w.field], &o.sv.Telescopes[scope]
	p := &o.sv.Programs[f.Program]
	d := &p.Demands[w.demand]
	rows := make([]audit.Visit, len(starts))
	for k, at := range starts {
		x := &d.Exposures[k]
		start := int64(math.Round(at * 1e6))
		rows[k] = audit.Visit{
			Visit: int64(k + 1), Field: f.Name, Program: p.Name, Demand: d.Name, Filter: o.sv.Filters[x.Filter].Name,
			Site: o.sv.Sites[t.Site].Name, Telescope: t.Name, Night: int32(day),
			Start: start, End: start + int64(math.Round(x.Duration*t.ExposureScale*1e6)), State: "planned",
		}
		if d.IsSet() {
			rows[k].Set = 1
		}
	}
	return rows
}

// best is one search: branch and bound over wants, candidates by value.
type best struct {
	o        *Oracle
	ctx      context.Context
	wants    []want
	bonus    []float64 // by field
	spare    float64   // of all bonuses
	pairs    map[[2]int]bool
	chosen   []*candidate
	nodes    int
	coverage float64
	plan     []audit.Visit
}

var errTooMany = errors.New("oracle: too many plans to try; take a longer step or a smaller survey")

// search decides what to take of want i from its candidate k on, with taken of
// it chosen already and earned so far, bonuses apart.
func (b *best) search(i, k, taken int, earned float64) error {
	if b.nodes++; b.nodes > maxNodes {
		return errTooMany
	}
	if b.nodes%1024 == 0 && b.ctx.Err() != nil {
		return b.ctx.Err()
	}
	if i == len(b.wants) {
		b.keep()
		return nil
	}
	w := &b.wants[i]
	after := 0.0
	if i+1 < len(b.wants) {
		after = b.wants[i+1].rest
	}
	for ; taken < w.visits && k < len(w.list); k++ {
		most := earned + after
		for m := k; m < min(k+w.visits-taken, len(w.list)); m++ {
			most += w.list[m].value
		}
		if most+b.spare <= b.coverage {
			return nil // what follows earns less still, and so does stopping here
		}
		c := &w.list[k]
		if !b.fits(c) {
			continue
		}
		b.chosen = append(b.chosen, c)
		if len(b.chosen) < 3 || b.o.Legal(b.joined()) {
			if err := b.search(i, k+1, taken+1, earned+c.value); err != nil {
				return err
			}
		}
		b.chosen = b.chosen[:len(b.chosen)-1]
	}
	if earned+after+b.spare <= b.coverage {
		return nil
	}
	return b.search(i+1, 0, 0, earned) // no more of this want
}

// fits tells whether a visit is legal beside each one chosen. What breaks a
// rule between two visits breaks it whatever else is in the plan: a detour
// over a third is never quicker than the direct way.
func (b *best) fits(c *candidate) bool {
	for _, x := range b.chosen {
		a, d := &x.rows[0], &c.rows[0]
		if a.Telescope != d.Telescope && (a.Field != d.Field || a.Demand != d.Demand) {
			continue // they share nothing
		}
		key := [2]int{x.id, c.id}
		ok, known := b.pairs[key]
		if !known {
			ok = b.o.Legal(joined([]*candidate{x, c}))
			b.pairs[key] = ok
		}
		if !ok {
			return false
		}
	}
	return true
}

func (b *best) joined() []audit.Visit { return joined(b.chosen) }

// joined numbers the rows of several visits through.
func joined(list []*candidate) []audit.Visit {
	var rows []audit.Visit
	for i, c := range list {
		for _, r := range c.rows {
			r.Visit = int64(len(rows) + 1)
			if r.Set != 0 {
				r.Set = int64(i + 1)
			}
			rows = append(rows, r)
		}
	}
	return rows
}

// keep takes the plan when it is legal and earns more.
func (b *best) keep() {
	rows := b.joined()
	r := b.o.judged(rows)
	if r.Legal() && (r.Score.Coverage > b.coverage || b.plan == nil) {
		b.coverage, b.plan = r.Score.Coverage, rows
	}
}
