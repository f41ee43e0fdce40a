package sheet

import (
	"context"
	"math"
	"slices"
	"testing"
	"time"
	_ "time/tzdata"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const deg = math.Pi / 180

// fixture is a survey of one site and two telescopes with all made from it.
type fixture struct {
	sv    *survey.Survey
	exact *visibility.Exact
	cal   *constraints.Calendar
	win   *constraints.Windows
	plan  []model.Exposure
}

func oneSite() *survey.Survey {
	night, _ := survey.ParseDay("2027-03-09")
	rules := survey.Rules{AltitudeMin: 30 * deg, AirmassMax: 2, SunAltitudeMax: -15 * deg, MoonSeparationMin: 25 * deg, MoonIlluminationMax: 1, HourAngleMax: 75 * deg, MinQuality: 0.1}
	sv := &survey.Survey{
		Name: "Ember Arc", FirstNight: night, LastNight: night + 1, Slot: 600,
		Filters: []visibility.Filter{
			{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
			{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 0.8},
		},
		Programs: []survey.Program{{Name: "wide", Weight: 1, ShareMax: 1, Demands: []survey.Demand{
			{Name: "g", Visits: 3, Exposures: []survey.Exposure{{Filter: 0, Duration: 60}}, GapMin: 3600, GapMax: math.Inf(1)},
			{Name: "r", Visits: 3, Exposures: []survey.Exposure{{Filter: 1, Duration: 90}}, GapMax: math.Inf(1)},
			{Name: "pair", Visits: 1, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Filter: 0, Duration: 60}, {Filter: 1, Duration: 45, After: 600, Tolerance: 120}}},
		}}},
		Sites: []survey.Site{{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140, TimeZone: "America/Denver", Telescopes: []int{0, 1}}},
	}
	tel := survey.Telescope{
		Name: "C1", Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg}, AltitudeMin: 20 * deg, AltitudeMax: 87 * deg,
		Slew: survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3}, Readout: 8, Filters: []int{0, 1}, FilterChange: 45, ExposureScale: 1,
		Reserved: []survey.Reserved{{At: survey.AtOpening, Takes: 900, Why: "standards"}, {At: survey.AtEvery, Every: 7200, Takes: 180, Why: "focus"}, {At: survey.AtClosing, Takes: 300, Why: "flats"}},
	}
	gem := tel
	gem.Name, gem.Mount, gem.Flip, gem.Reserved = "C2", survey.Equatorial, &survey.Flip{Time: 60, PastMeridian: 2 * deg}, nil
	sv.Telescopes = []survey.Telescope{tel, gem}
	for i, name := range []string{"E000", "E001", "E002", "a field with a name that is far too long for a line of eighty columns, ümläuts and all"} {
		sv.Fields = append(sv.Fields, survey.Field{
			Name: name, RA: float64(150+i*15) * deg, Dec: float64(10*i-5) * deg, Weight: 1,
			NotBefore: math.Inf(-1), NotAfter: math.Inf(1), Rules: []survey.Rules{rules, rules, rules},
		})
	}
	return sv
}

func prepare(t *testing.T, sv *survey.Survey) *fixture {
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

// add puts a visit into the plan.
func (f *fixture) add(field, demand, tel, night int, at float64, set int64) {
	start := at
	for k, x := range f.sv.Programs[0].Demands[demand].Exposures {
		start += x.After
		f.plan = append(f.plan, model.Exposure{
			Visit: int64(len(f.plan) + 1), Set: set, Field: int32(field), Demand: int32(demand), Step: int32(k), Telescope: int32(tel), Night: int32(night),
			State: model.Planned, Start: int64(start * 1e6), End: int64((start + x.Duration) * 1e6),
		})
	}
}

// tables builds the plan's rows.
func (f *fixture) tables(t *testing.T) *tables.PlanTables {
	t.Helper()
	slices.SortFunc(f.plan, func(a, b model.Exposure) int { return int((a.Start - b.Start) / 1e3) })
	pt, err := tables.Build(context.Background(), f.sv, f.exact, f.cal, f.win, &model.Outcome{Plan: &model.Plan{Exposures: f.plan}, Ceiling: 1}, 1)
	if err != nil {
		t.Fatal(err)
	}
	return pt
}

func (f *fixture) sheet(t *testing.T, telescope string, night int) *Sheet {
	t.Helper()
	zone, err := time.LoadLocation(f.sv.Sites[0].TimeZone)
	if err != nil {
		t.Fatal(err)
	}
	s, err := Build(f.sv, f.exact, f.cal, f.tables(t), Ask{Telescope: telescope, Night: f.sv.FirstNight + survey.Day(night), Zone: zone})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// at is an instant of 2027-03-10 UTC, in which most of the first night lies.
func at(hour, minute, second int) float64 {
	return float64(time.Date(2027, 3, 10, hour, minute, second, 0, time.UTC).Unix())
}

// busy is a night with a little of everything.
func busy(t *testing.T) *fixture {
	f := prepare(t, oneSite())
	f.add(0, 0, 0, 0, at(4, 0, 0), 0)
	f.add(1, 0, 0, 0, at(4, 2, 0), 0)
	f.add(1, 2, 0, 0, at(4, 5, 0), 1)
	f.add(3, 1, 0, 0, at(4, 30, 0), 0)
	f.add(2, 1, 0, 0, at(7, 0, 0), 0)
	f.add(0, 0, 1, 0, at(5, 10, 0), 0) // the other telescope, an hour and ten after the first
	return f
}
