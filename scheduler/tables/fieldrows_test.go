package tables

import (
	"math"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
)

// planned gives the rows of a plan of hand-picked visits: start and field.
func planned(t *testing.T, f *fixture, shots ...model.Exposure) *PlanTables {
	t.Helper()
	pt, err := f.build(f.outcome(&model.Plan{Exposures: shots}), 1)
	if err != nil {
		t.Fatal(err)
	}
	return pt
}

func fieldNamed(pt *PlanTables, name string) FieldRow {
	return pt.Fields[slices.IndexFunc(pt.Fields, func(r FieldRow) bool { return r.Field == name })]
}

// firstFit finds the first start of an exposure from an instant on.
func (f *fixture) firstFit(t *testing.T, field, demand, tel int, from float64, long float64) (night int, start float64) {
	t.Helper()
	for n := range f.sv.Nights() {
		for _, o := range f.cal.Open(tel, n) {
			for x := max(math.Ceil(o.From), from); x < o.To; x += 10 {
				if f.fits(field, demand, tel, n, x, x+long) {
					return n, x
				}
			}
		}
	}
	t.Fatalf("field %d has no room after %g", field, from)
	return 0, 0
}

func TestFieldAndDemandRows(t *testing.T) {
	f := prepare(t, smallSurvey())
	const field = extraField
	n1, a := f.firstFit(t, field, 0, 0, 0, 60)
	n2, b := f.firstFit(t, field, 0, 0, a+22*3600, 60) // beyond gap.max of 20 h
	n3, c := f.firstFit(t, field, 1, 0, b+600, 90)
	one := f.visit(field, 0, 0, n1, a, 0)[0]
	one.State, one.Quality = model.Done, 0.625 // the ledger's word counts
	pt := planned(t, f, one, f.visit(field, 0, 0, n2, b, 0)[0], f.visit(field, 1, 0, n3, c, 0)[0])
	r := fieldNamed(pt, f.sv.Fields[field].Name)
	if r.VisitsWanted != 3 || r.VisitsDone != 1 || r.VisitsPlanned != 2 || r.LimitedBy != LimitNothing || r.Bonus != f.sv.FinishBonus {
		t.Errorf("%+v; want 3 wanted, 1 done, 2 planned, finished", r)
	}
	if r.First != int64(a*1e6) || r.Last != int64(c*1e6) || !near(*r.LongestGap, (b-a)/86400, 1e-9) || b-a < 22*3600 {
		t.Errorf("first %d last %d longest gap %g; want %g, %g, %g", r.First, r.Last, *r.LongestGap, a, c, (b-a)/86400)
	}
	q := 0.0
	for i := range pt.Visits {
		q += pt.Visits[i].Quality
	}
	if !near(r.Coverage, q/3, 1e-12) || r.Weight != 1 || r.RA != 180 {
		t.Errorf("coverage %g weight %g ra %g; want %g, 1, 180", r.Coverage, r.Weight, r.RA, q/3)
	}
	var demands []DemandRow
	for _, d := range pt.Demands {
		if d.Field == r.Field {
			demands = append(demands, d)
		}
	}
	want := []DemandRow{{r.Field, "g", 2, 1, 1, 1}, {r.Field, "r", 1, 1, 0, 0}}
	if !slices.Equal(demands, want) {
		t.Errorf("demands %+v; want %+v", demands, want)
	}
	bare := fieldNamed(pt, f.sv.Fields[field+1].Name)
	if bare.First != 0 || bare.LongestGap != nil || bare.Coverage != 0 || bare.LimitedBy == LimitNothing {
		t.Errorf("a field without visits: %+v", bare)
	}
}

// TestUsableHours counts by the second what the rows sum from edges.
func TestUsableHours(t *testing.T) {
	f := prepare(t, smallSurvey())
	pt := planned(t, f)
	for _, field := range []int{extraField, 11} {
		sum := 0.0
		for site := range f.sv.Sites {
			for n := range f.sv.Nights() {
				night := f.cal.Night(site, n)
				for x := math.Floor(night.From) + 0.5; x < night.To; x += 5 {
					for _, tel := range f.sv.Sites[site].Telescopes {
						if f.fits(field, 0, tel, n, x, x) {
							sum += 5
							break
						}
					}
				}
			}
		}
		got := fieldNamed(pt, f.sv.Fields[field].Name).UsableHours
		if !near(got, sum/3600, 0.05) || got < 1 {
			t.Errorf("field %d: %g usable hours; want %g", field, got, sum/3600)
		}
	}
}

// TestLimits spoils one thing at a time of a field that is well placed.
func TestLimits(t *testing.T) {
	field := func(sv *survey.Survey) *survey.Field { return &sv.Fields[extraField] }
	demand := func(sv *survey.Survey) *survey.Demand { return &sv.Programs[0].Demands[0] }
	tests := []struct {
		want  string
		spoil func(sv *survey.Survey)
	}{
		{LimitCompetition, func(sv *survey.Survey) {}},
		{LimitTelescope, func(sv *survey.Survey) { field(sv).Tile = 2 * deg }},
		{LimitTelescope, func(sv *survey.Survey) { field(sv).Telescopes = []int{} }},
		{LimitWindows, func(sv *survey.Survey) { field(sv).Dec = -89 * deg; field(sv).Telescopes = []int{0} }},
		{LimitWindows, func(sv *survey.Survey) { demand(sv).Exposures[0].Duration = 20 * 3600 }},
		{LimitQuality, func(sv *survey.Survey) { field(sv).Rules[0].MinQuality = 0.999999 }},
		{LimitCadence, func(sv *survey.Survey) { demand(sv).GapMin = 5 * 86400 }},
		{LimitCadence, func(sv *survey.Survey) { demand(sv).PerNight, demand(sv).Visits = 1, 4 }},
		{LimitCompetition, func(sv *survey.Survey) { demand(sv).PerNight, demand(sv).Visits = 1, 3 }},
		// A set that is longer than any opening, one that isn't, and one whose
		// exposures each fit but never in their order.
		{LimitWindows, func(sv *survey.Survey) { follow(demand(sv), 20*3600, 60) }},
		{LimitCompetition, func(sv *survey.Survey) { follow(demand(sv), 1800, 60) }},
		{LimitWindows, func(sv *survey.Survey) { follow(demand(sv), 20, 10) }},
		// Of two demands the word that comes first tells.
		{LimitWindows, func(sv *survey.Survey) { demand(sv).GapMin = 5 * 86400; field(sv).Rules[1].SunAltitudeMax = -85 * deg }},
	}
	for i, tt := range tests {
		sv := smallSurvey()
		tt.spoil(sv)
		f := prepare(t, sv)
		if got := fieldNamed(planned(t, f), field(sv).Name).LimitedBy; got != tt.want {
			t.Errorf("%d: limited by %q; want %q", i, got, tt.want)
		}
	}
	if len(Limits()) != 6 || Limits()[0] != LimitNothing {
		t.Errorf("words: %q", Limits())
	}
}

// follow makes a set of a demand: the same exposure again, so long after.
func follow(d *survey.Demand, after, tolerance float64) {
	x := d.Exposures[0]
	x.After, x.Tolerance = after, tolerance
	d.Exposures = []survey.Exposure{d.Exposures[0], x}
}

// TestPolarNightsAreOneSequence: where it stays dark at noon, the first
// exposure of a night needs a slew from the last one of the night before.
func TestPolarNightsAreOneSequence(t *testing.T) {
	for _, tt := range []struct {
		latitude float64
		first    string
		joined   bool
	}{{88 * deg, "2027-12-20", true}, {33 * deg, "2027-12-20", false}} {
		sv := smallSurvey()
		sv.Sites[0].Latitude = tt.latitude
		sv.FirstNight = mustDay(tt.first)
		sv.LastNight = sv.FirstNight + 1
		f := prepare(t, sv)
		before, after := f.cal.Night(0, 0), f.cal.Night(0, 1)
		pt := planned(t, f, f.visit(0, 0, 0, 0, before.To-7200, 0)[0], f.visit(10, 0, 0, 1, after.From+7200, 0)[0])
		if got := pt.Visits[1].GapBefore; (got > 0) != tt.joined || pt.Visits[0].GapBefore != 0 {
			t.Errorf("latitude %g: gaps %g, %g; want one sequence: %v", tt.latitude/deg, pt.Visits[0].GapBefore, got, tt.joined)
		}
	}
}
