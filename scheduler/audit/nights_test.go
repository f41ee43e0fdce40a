package audit

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// TestNightsAgree holds the judge's nights, dark time and open time against
// the almanac's, found another way, at places from pole to pole and on both
// sides of the date line.
func TestNightsAgree(t *testing.T) {
	for _, p := range []struct{ lat, lon float64 }{
		{33.2, -106.8}, {-30.4, -70.9}, {0, 180}, {0, -180}, {66, 25}, {78.2, 15.6}, {-80, 77}, {90, 0}, {-90, 0}, {51.5, -0.1},
	} {
		sv := smallSurvey()
		first, _ := survey.ParseDay("2027-03-08")
		sv.FirstNight, sv.LastNight = first, first+25 // the poles' Sun passes -5 to +8 deg
		sv.Sites = sv.Sites[:1]
		sv.Sites[0].Latitude, sv.Sites[0].Longitude = p.lat*deg, p.lon*deg
		sv.Telescopes = sv.Telescopes[:1]
		sv.Telescopes[0].Reserved = nil
		f := &fixture{sv: sv}
		j, e, s := f.judge(t), f.exact(), f.site(0)
		for n := range j.nights[0] {
			got, want := &j.nights[0][n], e.Night(s, int32(first)+int32(n))
			if math.Abs(got.from-want.From) > 1e-4 || math.Abs(got.to-want.To) > 1e-4 {
				t.Fatalf("%v night %d: %v, the almanac has %v", p, n, got.span, want)
			}
			same(t, got.below(j, 0, darkLimit), e.SunBelow(s, want, darkLimit))
			same(t, j.open[0][n].open, e.SunBelow(s, want, -15*deg))
			same(t, got.below(j, 0, -2*deg), e.SunBelow(s, want, -2*deg))
		}
	}
}

func same(t *testing.T, got []span, want []visibility.Interval) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%v, the almanac has %v", got, want)
	}
	for i := range got {
		if math.Abs(got[i].from-want[i].From) > 1e-3 || math.Abs(got[i].to-want[i].To) > 1e-3 {
			t.Fatalf("%v, the almanac has %v", got, want)
		}
	}
}

func TestCut(t *testing.T) {
	from := []span{{0, 10}, {20, 30}}
	tests := []struct {
		away, want []span
	}{
		{nil, from},
		{[]span{{5, 5}}, from},
		{[]span{{10, 20}}, from},
		{[]span{{-5, 50}}, nil},
		{[]span{{2, 4}, {3, 6}}, []span{{0, 2}, {6, 10}, {20, 30}}},
		{[]span{{8, 22}}, []span{{0, 8}, {22, 30}}},
		{[]span{{0, 10}}, []span{{20, 30}}},
		{[]span{{40, 50}, {-3, 1}}, []span{{1, 10}, {20, 30}}},
	}
	for _, tt := range tests {
		got := cut(from, tt.away)
		if len(got) != len(tt.want) {
			t.Errorf("less %v: %v, want %v", tt.away, got, tt.want)
			continue
		}
		for i := range got {
			if got[i] != tt.want[i] {
				t.Errorf("less %v: %v, want %v", tt.away, got, tt.want)
			}
		}
	}
}

func TestReservedBlocks(t *testing.T) {
	got := reservedBlocks([]survey.Reserved{
		{At: survey.AtOpening, Takes: 10}, {At: survey.AtEvery, Every: 40, Takes: 3}, {At: survey.AtClosing, Takes: 5},
		{At: survey.AtOpening, Takes: 2}, {At: survey.AtClosing, Takes: 1},
	}, []span{{100, 130}, {150, 200}})
	want := []span{{100, 110}, {140, 143}, {180, 183}, {195, 200}, {110, 112}, {194, 195}}
	if len(got) != len(want) {
		t.Fatalf("%v, want %v", got, want)
	}
	for i := range want {
		if got[i] != want[i] {
			t.Errorf("%v, want %v", got[i], want[i])
		}
	}
	if reservedBlocks([]survey.Reserved{{At: survey.AtOpening, Takes: 10}}, nil) != nil {
		t.Error("a night that isn't open has no blocks")
	}
}

// polar is a survey at 87 deg north in December, where it is dark at the
// transit too: the Sun is never above -20 deg.
func polar(t *testing.T) *fixture {
	t.Helper()
	sv := smallSurvey()
	first, _ := survey.ParseDay("2026-12-18")
	sv.FirstNight, sv.LastNight = first, first+2
	sv.Sites = sv.Sites[:1]
	sv.Sites[0].Latitude, sv.Sites[0].Longitude = 87*deg, 40*deg
	sv.Telescopes = sv.Telescopes[:1]
	sv.Telescopes[0].Reserved, sv.Telescopes[0].KeepFree = nil, 0
	sv.Programs, sv.Fields = sv.Programs[:1], sv.Fields[:2]
	for i := range sv.Fields {
		sv.Fields[i].Dec = 60 * deg
		for d := range sv.Fields[i].Rules {
			sv.Fields[i].Rules[d].HourAngleMax = math.Pi
		}
	}
	return &fixture{sv: sv}
}

// TestDarkTransit: two exposures on both sides of a dark transit are one
// sequence for slews, and none may go across it.
func TestDarkTransit(t *testing.T) {
	f := polar(t)
	noon := f.exact().Night(f.site(0), int32(f.sv.FirstNight)+1).From
	row := func(id int64, field string, start float64, night int) Visit {
		s := int64(math.Round(start * 1e6))
		return Visit{Visit: id, Field: field, Program: "wide", Demand: "g", Filter: "g", Site: "Lamp Hill", Telescope: "L1", Night: int32(f.sv.FirstNight) + int32(night), Start: s, End: s + 60e6, State: "planned"}
	}
	judge := func(rows ...Visit) []Breach {
		r, err := f.judge(t).Check(t.Context(), Plan{Visits: rows, LegalityOnly: true})
		if err != nil {
			t.Fatal(err)
		}
		return r.Breaches
	}
	if b := judge(row(1, "F1", noon-61, 0), row(2, "F2", noon+60, 1)); len(b) != 0 {
		t.Errorf("two minutes apart: %+v", b)
	}
	if b := judge(row(1, "F1", noon-61, 0), row(2, "F2", noon+1, 1)); len(b) != 1 || b[0].Rule != RuleGap {
		t.Errorf("2 s apart over a dark transit: %+v", b)
	}
	if b := judge(row(1, "F1", noon-30, 0)); len(b) != 1 || b[0].Rule != RuleNight {
		t.Errorf("across the transit: %+v", b)
	}
	if b := judge(row(1, "F1", noon-61, 1)); len(b) != 1 || b[0].Rule != RuleNight {
		t.Errorf("the label of the night after: %+v", b)
	}
	// With a stricter Sun it isn't dark at the transit, and no slew is asked
	// for; but then neither exposure is legal.
	for i := range f.sv.Fields {
		for d := range f.sv.Fields[i].Rules {
			f.sv.Fields[i].Rules[d].SunAltitudeMax = -21 * deg
		}
	}
	for _, b := range judge(row(1, "F1", noon-61, 0), row(2, "F2", noon+1, 1)) {
		if b.Rule != RuleSun {
			t.Errorf("by day: %+v", b)
		}
	}
}

// TestDoneRows: what the ledger has counts, binds and is not judged again.
func TestDoneRows(t *testing.T) {
	f := makeFixture(t)
	v := f.at("F1", "g", lamp, 0)
	v.State = "done"
	f.done = []Done{{Telescope: "L1", Start: v.Start, Quality: 0.5}}
	v.Credit *= 0.5 / v.Quality
	v.Quality = 0.5
	f.rules(v).AltitudeMin = 25 * deg
	f.sv.Sites[0].Closures = []survey.Closure{{From: float64(v.Start)/1e6 - 5, To: float64(v.End) / 1e6}}
	r := f.check(t)
	if !r.Legal() {
		t.Errorf("%+v", r.Breaches)
	}
	f.sv.Programs[0].Demands[0].GapMin = 3 * 86400
	bound := 0
	for _, b := range f.check(t).Breaches {
		if b.Rule == RuleGapMin {
			bound++
		}
	}
	if bound != 2 {
		t.Errorf("%d visits are too close to the done one and each other; want 2", bound)
	}
	f.done[0].Quality = 0.0001 // under min_quality: it earns nothing and doesn't bind
	bound = 0
	for _, b := range f.check(t).Breaches {
		if b.Rule == RuleGapMin {
			bound++
		}
	}
	if bound != 1 {
		t.Errorf("%d visits are too close; a poor one doesn't bind, want 1", bound)
	}
}
