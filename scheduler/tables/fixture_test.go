package tables

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const deg = math.Pi / 180

// night0 is the first night of the fixtures, 2027-03-09.
var night0 = mustDay("2027-03-09")

func mustDay(s string) survey.Day {
	d, err := survey.ParseDay(s)
	if err != nil {
		panic(err)
	}
	return d
}

// fixture is a small survey in invented places, with everything made from it.
type fixture struct {
	sv    *survey.Survey
	exact *visibility.Exact
	cal   *constraints.Calendar
	win   *constraints.Windows
}

// smallSurvey has two sites with three telescopes, an equatorial one with a
// flip among them, 24 fields, single exposures and a set of two filters.
func smallSurvey() *survey.Survey {
	rules := survey.Rules{AltitudeMin: 30 * deg, AirmassMax: 2, SunAltitudeMax: -15 * deg, MoonSeparationMin: 25 * deg, MoonIlluminationMax: 1, HourAngleMax: 75 * deg, MinQuality: 0.1}
	sv := &survey.Survey{
		Name: "Ember Arc", FirstNight: night0, LastNight: night0 + 2, Slot: 600, Seed: 7, FinishBonus: 0.25,
		Filters: []visibility.Filter{
			{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
			{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 0.8},
		},
		Programs: []survey.Program{
			{Name: "wide", Weight: 1, ShareMax: 1, Demands: []survey.Demand{
				{Name: "g", Visits: 2, Exposures: []survey.Exposure{{Filter: 0, Duration: 60}}, GapMin: 3600, GapMax: 20 * 3600},
				{Name: "r", Visits: 1, Exposures: []survey.Exposure{{Filter: 1, Duration: 90}}, GapMax: math.Inf(1)},
			}},
			{Name: "colour", Weight: 2, ShareMin: 0.1, ShareMax: 0.9, Demands: []survey.Demand{
				{Name: "pair", Visits: 2, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Filter: 0, Duration: 60}, {Filter: 1, Duration: 45, After: 600, Tolerance: 300}}},
			}},
		},
		Sites: []survey.Site{
			{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140, TimeZone: "Etc/GMT+7", Telescopes: []int{0, 2}},
			{Name: "Salt Mesa", Latitude: -30.4 * deg, Longitude: 21 * deg, Elevation: 1800, Telescopes: []int{1}},
		},
	}
	tel := survey.Telescope{
		Name: "C1", Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg}, AltitudeMin: 20 * deg, AltitudeMax: 87 * deg,
		Slew: survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3}, Readout: 8, Filters: []int{0, 1}, FilterChange: 45, ExposureScale: 1,
		Reserved: []survey.Reserved{{At: survey.AtOpening, Takes: 900, Why: "standards"}, {At: survey.AtEvery, Every: 7200, Takes: 180, Why: "focus"}},
	}
	south, gem := tel, tel
	south.Name, south.Site, south.ExposureScale, south.Reserved = "S1", 1, 1.5, nil
	gem.Name, gem.Mount, gem.Flip, gem.Reserved = "C2", survey.Equatorial, &survey.Flip{Time: 60, PastMeridian: 5 * deg}, nil
	sv.Telescopes = []survey.Telescope{tel, south, gem}
	for i := range 24 {
		f := survey.Field{
			Name: fmt.Sprintf("E%03d", i), RA: float64(i) * 15 * deg, Dec: float64(i%5*12-24) * deg, Program: i % 2, Weight: 1 + float64(i%3),
			NotBefore: math.Inf(-1), NotAfter: math.Inf(1), PMRA: float64(i%4) * 1e-6,
		}
		for range sv.Programs[f.Program].Demands {
			f.Rules = append(f.Rules, rules)
		}
		sv.Fields = append(sv.Fields, f)
	}
	return sv
}

func prepare(t testing.TB, sv *survey.Survey) *fixture {
	t.Helper()
	f := &fixture{sv: sv, exact: visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation))}
	f.cal = constraints.NewCalendar(sv, f.exact, nil)
	var err error
	f.win, err = constraints.NewWindows(context.Background(), sv, constraints.Tables(sv, f.exact, 2), f.cal, 2)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

// fits reports whether an exposure lies within open time and a window.
func (f *fixture) fits(field, demand, t, night int, from, to float64) bool {
	in := func(x visibility.Interval) bool { return x.From <= from && to <= x.To }
	legal := slices.ContainsFunc(f.win.Of(f.win.Unit(field, demand), f.win.Class(t), night), func(w constraints.Window) bool { return in(f.win.Interval(w)) })
	return legal && slices.ContainsFunc(f.cal.Open(t, night), in)
}

// extraField is visible long enough from both sites.
const extraField = 12

// pack fills the nights in the plainest way: on each telescope every spacing
// seconds the next demand that is legal there, cadence apart. It keeps to the
// counts that are wanted, but for the r demand of extraField, which gets 1 more.
func (f *fixture) pack(spacing float64) *model.Plan {
	sv := f.sv
	plan := &model.Plan{}
	type want struct{ field, demand, left int }
	var wants []want
	for i := range sv.Fields {
		for d := range sv.Programs[sv.Fields[i].Program].Demands {
			n := sv.Programs[sv.Fields[i].Program].Demands[d].Visits
			if i == extraField && d == 1 {
				n++
			}
			wants = append(wants, want{i, d, n})
		}
	}
	set := int64(0)
	for night := range sv.Nights() {
		for turn := range sv.Telescopes {
			t := (turn + 2) % len(sv.Telescopes) // the one that flips first
			for _, o := range f.cal.Open(t, night) {
				for at := math.Ceil(o.From); at+1000 < o.To; at += spacing {
					k := slices.IndexFunc(wants, func(w want) bool {
						if w.left == 0 {
							return false
						}
						start := at
						for _, x := range sv.Programs[sv.Fields[w.field].Program].Demands[w.demand].Exposures {
							start += x.After
							if !f.fits(w.field, w.demand, t, night, start, start+x.Duration*sv.Telescopes[t].ExposureScale) {
								return false
							}
						}
						return true
					})
					if k < 0 {
						continue
					}
					w := &wants[k]
					w.left--
					set += 1
					plan.Exposures = append(plan.Exposures, f.visit(w.field, w.demand, t, night, at, set)...)
				}
			}
		}
	}
	slices.SortFunc(plan.Exposures, func(a, b model.Exposure) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope))
	})
	for i := range plan.Exposures {
		plan.Exposures[i].Visit = int64(i + 1)
	}
	return plan
}

// visit makes the exposures of one visit.
func (f *fixture) visit(field, demand, t, night int, at float64, set int64) []model.Exposure {
	d := &f.sv.Programs[f.sv.Fields[field].Program].Demands[demand]
	if !d.IsSet() {
		set = 0
	}
	var out []model.Exposure
	for k, x := range d.Exposures {
		at += x.After
		out = append(out, model.Exposure{
			Set: set, Field: int32(field), Demand: int32(demand), Step: int32(k), Telescope: int32(t), Night: int32(night), State: model.Planned,
			Start: int64(at * 1e6), End: int64((at + x.Duration*f.sv.Telescopes[t].ExposureScale) * 1e6),
		})
	}
	return out
}

// outcome dresses a plan up with prices that grow from slot to slot.
func (f *fixture) outcome(plan *model.Plan) *model.Outcome {
	out := &model.Outcome{
		Plan: plan, Ceiling: 1, Status: model.StepsDone, Effort: "quick", Seed: f.sv.Seed,
		Stats:  []model.Stat{{Name: "placed", Value: int64(len(plan.Exposures))}},
		Shares: []model.ShareOutcome{{Program: 1, Breach: 0.01, Why: "too little time"}},
	}
	for t := range f.sv.Telescopes {
		for night := range f.sv.Nights() {
			for _, o := range f.cal.Open(t, night) {
				for slot := math.Floor(o.From/f.sv.Slot) * f.sv.Slot; slot < o.To; slot += f.sv.Slot {
					if n := len(out.Prices); n > 0 && out.Prices[n-1].Telescope == int32(t) && out.Prices[n-1].SlotStart >= int64(slot) {
						continue
					}
					out.Prices = append(out.Prices, model.Price{Telescope: int32(t), SlotStart: int64(slot), PerHour: 1e-4 * float64(1+len(out.Prices))})
				}
			}
		}
	}
	return out
}

// built is a fixture with its rows.
func built(t testing.TB) (*fixture, *model.Outcome, *PlanTables) {
	t.Helper()
	f := prepare(t, smallSurvey())
	out := f.outcome(f.pack(1200))
	pt, err := f.build(out, 2)
	if err != nil {
		t.Fatal(err)
	}
	return f, out, pt
}

func (f *fixture) build(out *model.Outcome, workers int) (*PlanTables, error) {
	return Build(context.Background(), f.sv, f.exact, f.cal, f.win, out, workers)
}
