package report

import (
	"cmp"
	"context"
	"fmt"
	"slices"

	"nightwright/cmd/nightwright/draw"
	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// Input is what a report is made from.
type Input struct {
	Tables   *tables.PlanTables
	Survey   *survey.Survey // that the plan was made from
	Exact    *visibility.Exact
	Calendar *constraints.Calendar
	Night    string // the night that is drawn, YYYY-MM-DD; "": the one whose hours are worth most
	PlanSum  string // SHA-256 of plan.json
	Forecast *Forecast
	Networks []Network
	Worths   []Worth
	Seasons  int // that the networks were compared over
	Workers  int
}

// Forecast is what simulated seasons make of the plan.
type Forecast struct {
	Seasons  int
	Ways     []Way // of acting, the best first
	Band     *draw.Band
	Finish   []ChanceRow // chance that a field finishes under the best way, the least first
	Likely   int         // fields that finish in at least half of the seasons
	Promised float64     // what the plan promises on clear nights
}

// Way is how a way of acting does in simulated seasons.
type Way struct {
	Name            string
	Mean, Low, High float64 // coverage: mean with its 95 % interval
	P05, P95        float64 // between which nine seasons of ten lie
	FieldsFinished  float64
}

// ChanceRow is a field's chance to get all its visits.
type ChanceRow struct {
	Field  string
	Chance float64
}

// Network is one set of sites in a comparison.
type Network struct {
	Name            string
	Sites           string
	Mean, Low, High float64 // coverage with its 95 % interval
	Note            string
	Base            bool // the network that others are compared with
}

// Worth is what a site adds to a network.
type Worth struct {
	Site                string
	Alone, Adds, Share  float64 // coverage
	AddsLow, AddsHigh   float64
	ShareLow, ShareHigh float64
}

// Report is a finished report.
type Report struct {
	Pictures []*draw.Canvas // in the order of the page

	in    *Input
	model page
}

// Build works out the report. It errs when ctx ends, when the plan doesn't
// fit the survey, or when there is no such night.
func Build(ctx context.Context, in Input) (*Report, error) {
	r := &Report{in: &in}
	g, err := gather(&in)
	if err != nil {
		return nil, err
	}
	night, err := in.night()
	if err != nil {
		return nil, err
	}
	m := &r.model
	m.head(&in, g)
	sky := draw.SkyMap("sky", "What each field gets", g.skyFields())
	ascension, months := g.balances()
	balance := draw.Balances("balance", "Demand against supply", ascension, months)
	sites, days := g.calendar(ctx)
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	calendar := draw.Calendar("calendar", "The nights", sites, days)
	lanes := draw.Lanes("night", "One night: "+night.String(), g.programs, g.lanes(night))
	course := g.course()
	if in.Forecast != nil {
		course.Band = in.Forecast.Band
	}
	progress := draw.Progress("progress", "Progress", course)
	cadence := draw.Histogram("cadence", "Spacing of visits", "pairs of consecutive visits of a field", "time from one visit of a demand to the next", g.programs, g.cadence())
	m.Sky, m.Balance, m.Calendar, m.Lanes, m.Progress, m.Cadence = inline(sky), inline(balance), inline(calendar), inline(lanes), inline(progress), inline(cadence)
	m.Night = night.String()
	r.Pictures = []*draw.Canvas{sky, balance, calendar, lanes, progress, cadence}
	if len(in.Networks) > 0 {
		c := draw.Estimates("networks", "Networks compared", "coverage, with the interval that holds the mean in 95 of 100", networkRows(in.Networks))
		m.Networks = inline(c)
		r.Pictures = append(r.Pictures, c)
	}
	return r, ctx.Err()
}

func networkRows(all []Network) []draw.Estimate {
	var out []draw.Estimate
	for _, n := range all {
		out = append(out, draw.Estimate{Label: n.Name, Value: n.Mean, Low: n.Low, High: n.High, Note: cmp.Or(n.Note, n.Sites), Highlighted: n.Base})
	}
	return out
}

// night finds the night to draw: the one asked for, else the one whose used
// hours are worth the most.
func (in *Input) night() (survey.Day, error) {
	first, last := in.Survey.FirstNight, in.Survey.LastNight
	if in.Night != "" {
		day, err := survey.ParseDay(in.Night)
		if err != nil || day < first || day > last {
			return 0, fmt.Errorf("there is no night %q in the plan; want one from %s to %s", in.Night, first, last)
		}
		return day, nil
	}
	worth := make([]float64, in.Survey.Nights())
	for i := range in.Tables.Nights {
		if n := &in.Tables.Nights[i]; int(n.Night) >= int(first) && int(n.Night) <= int(last) {
			worth[int(n.Night)-int(first)] += n.PricePerHour * n.UsedHours
		}
	}
	best := 0
	for k, w := range worth {
		if w > worth[best] {
			best = k
		}
	}
	return first + survey.Day(best), nil
}

// limitWords says in a sentence's part what a word of limited_by means.
var limitWords = map[string]string{
	tables.LimitTelescope:   "no telescope may serve a demand of them",
	tables.LimitWindows:     "the rules leave no open time into which an exposure fits",
	tables.LimitQuality:     "in the middle of no window is quality as high as min_quality",
	tables.LimitCadence:     "the spacing that is asked for leaves room for fewer visits",
	tables.LimitCompetition: "there was room, but the time was worth more to others",
}

// unfinished lists the fields that miss visits, those whose misses weigh most
// first.
func unfinished(rows []tables.FieldRow) []*tables.FieldRow {
	var out []*tables.FieldRow
	for i := range rows {
		if f := &rows[i]; f.VisitsPlanned+f.VisitsDone < f.VisitsWanted {
			out = append(out, f)
		}
	}
	slices.SortStableFunc(out, func(a, b *tables.FieldRow) int {
		return cmp.Or(cmp.Compare(b.Weight*(1-b.Coverage), a.Weight*(1-a.Coverage)), cmp.Compare(a.Field, b.Field))
	})
	return out
}
