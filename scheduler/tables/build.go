package tables

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// ceilingSlack is how far rounding may carry the recount over the ceiling.
const ceilingSlack = 1e-12

// builder carries what Build's steps share.
type builder struct {
	sv      *survey.Survey
	exact   *visibility.Exact
	cal     *constraints.Calendar
	win     *constraints.Windows
	out     *model.Outcome
	workers int
	places  []visibility.Position // of fields
	sites   []visibility.Site
	shots   []model.Exposure // by start, telescope and visit
	looks   []look           // of shots
	tally   *tally
}

// Build turns an outcome into the rows of a plan folder. Geometry, sky and
// quality come from the exact path at each exposure's middle, and coverage is
// recounted from them. The result doesn't depend on the number of workers.
//
// It errs when ctx ends, when the plan doesn't fit the survey, and when the
// recounted coverage is over the outcome's ceiling: either is a fault of the
// solver. The caller sets Summary.Program; WriteFolder sets the checksums.
func Build(ctx context.Context, sv *survey.Survey, exact *visibility.Exact, cal *constraints.Calendar, windows *constraints.Windows, outcome *model.Outcome, workers int) (*PlanTables, error) {
	b := &builder{
		sv: sv, exact: exact, cal: cal, win: windows, out: outcome, workers: workers,
		places: constraints.Positions(sv), sites: constraints.Sites(sv),
		shots: slices.Clone(outcome.Plan.Exposures),
	}
	if err := b.check(); err != nil {
		return nil, err
	}
	slices.SortStableFunc(b.shots, func(x, y model.Exposure) int {
		return cmp.Or(cmp.Compare(x.Start, y.Start), cmp.Compare(sv.Telescopes[x.Telescope].Name, sv.Telescopes[y.Telescope].Name), cmp.Compare(x.Visit, y.Visit))
	})
	if err := b.look(ctx); err != nil {
		return nil, err
	}
	b.setGaps()
	b.tally = b.count()
	pt := &PlanTables{}
	pt.Visits = b.visitRows()
	var err error
	if pt.Fields, pt.Demands, err = b.fieldRows(ctx); err != nil {
		return nil, err
	}
	pt.Nights = b.nightRows()
	pt.Prices = b.priceRows()
	pt.Summary = b.summary(pt)
	if c := pt.Summary.Coverage; c > outcome.Ceiling+ceilingSlack {
		return nil, fmt.Errorf("tables: the recounted coverage %.15g is over the ceiling %.15g; the ceiling is wrong", c, outcome.Ceiling)
	}
	Fields.Sort(pt.Fields)
	Demands.Sort(pt.Demands)
	Nights.Sort(pt.Nights)
	Prices.Sort(pt.Prices)
	return pt, nil
}

// check holds a plan's ids against the survey.
func (b *builder) check() error {
	in := func(x int32, n int) bool { return x >= 0 && int(x) < n }
	for i := range b.shots {
		s := &b.shots[i]
		ok := in(s.Field, len(b.sv.Fields)) && in(s.Telescope, len(b.sv.Telescopes))
		if ok {
			demands := b.sv.Programs[b.sv.Fields[s.Field].Program].Demands
			ok = in(s.Demand, len(demands)) && in(s.Step, len(demands[s.Demand].Exposures))
		}
		if !ok || s.End <= s.Start {
			return fmt.Errorf("tables: visit %d of the plan doesn't fit the survey: %+v", s.Visit, *s)
		}
	}
	return nil
}

// step returns what an exposure is of.
func (b *builder) step(s *model.Exposure) *survey.Exposure {
	return &b.demand(s).Exposures[s.Step]
}

func (b *builder) demand(s *model.Exposure) *survey.Demand {
	return &b.sv.Programs[b.sv.Fields[s.Field].Program].Demands[s.Demand]
}

func (b *builder) count() *tally {
	shots := make([]shot, len(b.shots))
	for i := range b.shots {
		s := &b.shots[i]
		shots[i] = shot{s.Field, s.Demand, s.Set, s.Start, b.looks[i].quality, s.State == model.Done}
	}
	return count(b.sv, shots)
}

// unit returns what quality 1 of one visit of a field adds to C.
func (b *builder) unit(field int, total float64) float64 {
	f := &b.sv.Fields[field]
	return b.sv.WeightOf(f) / (float64(b.sv.Wanted(f)) * (1 + b.sv.FinishBonus) * total)
}

func (b *builder) visitRows() []VisitRow {
	rows := make([]VisitRow, len(b.shots))
	for i := range b.shots {
		s, l := &b.shots[i], &b.looks[i]
		f, t := &b.sv.Fields[s.Field], &b.sv.Telescopes[s.Telescope]
		rows[i] = VisitRow{
			Visit: s.Visit, Set: s.Set, Field: f.Name, Program: b.sv.Programs[f.Program].Name,
			Demand: b.demand(s).Name, Filter: b.sv.Filters[b.step(s).Filter].Name,
			Site: b.sv.Sites[t.Site].Name, Telescope: t.Name, Night: int32(b.sv.FirstNight) + s.Night,
			Start: s.Start, End: s.End, Exposure: float64(s.End-s.Start) / 1e6, GapBefore: l.gap,
			RA: written(f.RA), Dec: written(f.Dec), Altitude: degrees(l.star.Altitude), Azimuth: degrees(l.star.Azimuth),
			Airmass: l.airmass, SunAltitude: degrees(l.sun), MoonAltitude: degrees(l.moon), MoonSeparation: degrees(l.separation),
			SkyMagnitude: l.sky, Quality: l.quality, State: s.State.String(),
		}
	}
	total := b.sv.TotalWeight()
	for i := range b.tally.visits {
		v := &b.tally.visits[i]
		if !v.counts {
			continue
		}
		// A set's quality is the mean of its exposures': each carries its part.
		unit := b.unit(int(v.field), total) / float64(len(v.shots))
		for _, k := range v.shots {
			rows[k].Credit = unit * b.looks[k].quality
		}
	}
	return rows
}

func degrees(x float64) float64 { return x * (180 / math.Pi) }

// written gives a position's angle back as a survey file has it: the detour
// by radians costs its last digits, which this rounds away (1e-10 deg is less
// than a millionth of an arc second).
func written(x float64) float64 { return math.Round(degrees(x)*1e10) / 1e10 }

// errStopped is ctx's error, told with where it struck.
func errStopped(ctx context.Context) error {
	if err := ctx.Err(); err != nil {
		return errors.Join(errors.New("tables: stopped before the rows were ready"), err)
	}
	return nil
}
