// Package explain says why a plan is as it is: for a field, where its hours go
// and what its missing visits lost to; for a telescope's night, what fills it and
// what leaves it idle. It works out the sky of that field or night alone, so that
// it answers at once whatever the season's size.
//
// Instants are UTC: Unix seconds in intervals, Unix microseconds where a plan's
// rows are meant. Worths are in C (coverage).
package explain

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// Input is what explanations are made from.
type Input struct {
	Survey   *survey.Survey
	Exact    *visibility.Exact
	Calendar *constraints.Calendar
	Losses   [][]visibility.Interval // of each telescope; nil: none
	Plan     *tables.PlanTables
	Now      int64 // Unix us; windows before it are over; 0: none are
	Workers  int
}

// Field is why a field is where it is, or isn't.
type Field struct {
	Name      string   `json:"name"`
	Program   string   `json:"program"`
	Weight    float64  `json:"weight"`
	Wanted    int      `json:"wanted"`
	Got       int      `json:"got"`
	Finished  bool     `json:"finished"`
	LimitedBy string   `json:"limited_by"` // the plan's word
	Demands   []Demand `json:"demands"`
	Visits    []Visit  `json:"visits"` // those it has, by start
}

// Demand is one demand of the field.
type Demand struct {
	Name    string      `json:"name"`
	Wanted  int         `json:"wanted"`
	Got     int         `json:"got"`
	Worth   float64     `json:"worth"` // C of one visit of quality 1
	Months  []Month     `json:"months"`
	Rules   []RuleHours `json:"rules"`   // over the whole period
	Windows []Window    `json:"windows"` // of a demand that lacks visits: the best there are, best first
	Helps   []Help      `json:"helps"`
}

// Month is where a month's hours go, summed over the sites that have a
// telescope for the demand.
type Month struct {
	Name   string      `json:"name"`     // 2027-03
	Before float64     `json:"before_h"` // dark enough, and the field above the horizon, h
	After  float64     `json:"after_h"`  // no rule is broken, h
	Rules  []RuleHours `json:"rules"`
}

// RuleHours is what one rule takes.
type RuleHours struct {
	Rule  string  `json:"rule"`
	Turn  float64 `json:"in_turn_h"` // when rules are gone through in turn, h
	Alone float64 `json:"alone_h"`   // broken, whatever else is, h
	Only  float64 `json:"only_h"`    // broken, and nothing else is: what would open without it, h
}

// Visit is one exposure that the field has.
type Visit struct {
	Demand    string  `json:"demand"`
	Filter    string  `json:"filter"`
	Telescope string  `json:"telescope"`
	State     string  `json:"state"`
	Night     int32   `json:"night_days"` // days since 1970-01-01
	Start     int64   `json:"start_unix_us"`
	Quality   float64 `json:"quality"`
	Credit    float64 `json:"credit"`
}

// Window is a time at which a visit that is missing could have been.
type Window struct {
	Telescope string  `json:"telescope"`
	Night     int32   `json:"night_days"` // days since 1970-01-01
	From      float64 `json:"from_unix_s"`
	To        float64 `json:"to_unix_s"`
	Best      float64 `json:"best_start_unix_s"` // start at which a visit comes nearest to outdoing what is there
	Quality   float64 `json:"quality"`
	Worth     float64 `json:"worth"` // C of that visit
	Why       Why     `json:"why"`
	Price     float64 `json:"price"`              // C that its time costs at the plan's prices
	Rivals    []Rival `json:"rivals"`             // what is there now
	Near      int64   `json:"near_start_unix_us"` // own visit that is too near, its start; 0: none
	rivals    float64 // sum of their worths
}

// Rival is a visit that stands where another could.
type Rival struct {
	Field string  `json:"field"`
	Visit int64   `json:"visit"`
	Start int64   `json:"start_unix_us"`
	Worth float64 `json:"worth"` // its credit, and its field's bonus when that is finished
}

// Why says why a window has no visit of the field.
type Why string

// The reasons.
const (
	Over    Why = "over"     // before now
	Cadence Why = "cadence"  // gap.min or per_night to the field's own visits
	Taken   Why = "taken"    // visits stand there that are worth more
	Priced  Why = "price"    // its time is worth more than the visit
	Cheaper Why = "possible" // what stands there is worth less: moving it leads to more moves
	Empty   Why = "empty"    // nothing stands there: the search passed it by
)

// Help is something that would get the field more.
type Help struct {
	What   string  `json:"what"`
	Hours  float64 `json:"hours"`  // that it would open; 0: it opens none, it wins some
	Factor float64 `json:"factor"` // the weight times this; 0: not about weight
}

// ForField explains one field (an index of the survey).
func ForField(ctx context.Context, in Input, field int) (*Field, error) {
	sv := in.Survey
	f := &sv.Fields[field]
	p := &sv.Programs[f.Program]
	out := &Field{Name: f.Name, Program: p.Name, Weight: sv.WeightOf(f), Wanted: sv.Wanted(f)}
	for i := range in.Plan.Fields {
		if r := &in.Plan.Fields[i]; r.Field == f.Name {
			out.Got, out.LimitedBy = int(r.VisitsPlanned+r.VisitsDone), r.LimitedBy
			out.Finished = int64(out.Got) == r.VisitsWanted
		}
	}
	out.Visits = visitsOf(in.Plan, f.Name)
	x := &fieldJob{in: in, field: field, one: alone(sv, field), out: out}
	x.sky = constraints.Tables(x.one, in.Exact, in.Workers)
	var err error
	if x.windows, err = constraints.NewWindows(ctx, x.one, x.sky, in.Calendar, in.Workers); err != nil {
		return nil, err
	}
	whole, err := constraints.NewAccounts(ctx, x.one, x.sky, in.Calendar, nil, accountStep, in.Workers)
	if err != nil {
		return nil, err
	}
	for d := range p.Demands {
		g := Demand{Name: p.Demands[d].Name, Wanted: p.Demands[d].Visits, Rules: rules(whole.Of(0, d))}
		g.Worth = sv.WeightOf(f) / (float64(sv.Wanted(f)) * (1 + sv.FinishBonus) * sv.TotalWeight())
		for i := range in.Plan.Demands {
			if r := &in.Plan.Demands[i]; r.Field == f.Name && r.Demand == g.Name {
				g.Got = int(r.Planned + r.Done)
			}
		}
		out.Demands = append(out.Demands, g)
	}
	if err := x.months(ctx); err != nil {
		return nil, err
	}
	x.index()
	for d := range out.Demands {
		if g := &out.Demands[d]; g.Got < g.Wanted {
			x.lacking(d, g)
		}
	}
	return out, nil
}

// accountStep is the step at which hours are sampled, s.
const accountStep = 600

// alone is the survey with one field.
func alone(sv *survey.Survey, field int) *survey.Survey {
	one := *sv
	one.Fields = sv.Fields[field : field+1]
	return &one
}

func visitsOf(pt *tables.PlanTables, field string) []Visit {
	var out []Visit
	for i := range pt.Visits {
		if v := &pt.Visits[i]; v.Field == field {
			out = append(out, Visit{v.Demand, v.Filter, v.Telescope, v.State, v.Night, v.Start, v.Quality, v.Credit})
		}
	}
	return out
}

// rules lists what rules take, the most in turn first.
func rules(a *constraints.Account) []RuleHours {
	var out []RuleHours
	for k := range constraints.ReasonCount {
		if a.Alone[k] > 0 {
			out = append(out, RuleHours{constraints.Reason(k).String(), a.InOrder[k], a.Alone[k], a.Only[k]})
		}
	}
	slices.SortStableFunc(out, func(x, y RuleHours) int {
		switch {
		case x.Turn > y.Turn:
			return -1
		case x.Turn < y.Turn:
			return 1
		}
		return 0
	})
	return out
}

// months samples each calendar month of the period by itself.
func (x *fieldJob) months(ctx context.Context) error {
	sv := x.in.Survey
	for from := sv.FirstNight; from <= sv.LastNight; {
		name := from.String()[:7]
		to := from
		for to < sv.LastNight && strings.HasPrefix((to+1).String(), name) {
			to++
		}
		part := *sv
		part.FirstNight, part.LastNight = from, to
		cal := constraints.NewCalendar(&part, x.in.Exact, x.in.Losses)
		part.Fields = x.one.Fields
		a, err := constraints.NewAccounts(ctx, &part, x.sky, cal, nil, accountStep, x.in.Workers)
		if err != nil {
			return fmt.Errorf("explain: %w", err)
		}
		for d := range x.out.Demands {
			r := a.Of(0, d)
			x.out.Demands[d].Months = append(x.out.Demands[d].Months, Month{name, r.Before, r.Usable, rules(r)})
		}
		from = to + 1
	}
	return nil
}
