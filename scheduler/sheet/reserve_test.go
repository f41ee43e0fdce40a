package sheet

import (
	"math"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
	"nightwright/scheduler/trial"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// TestReserveIsLegal: each entry of the list, taken at its first, best or last
// start, is legal by the judge beside the other visits of its field.
func TestReserveIsLegal(t *testing.T) {
	sv, _, issues := surveyfile.Load(filepath.Join("..", "..", "cmd", "nightwright", "testdata", "small"))
	if sv == nil {
		t.Fatal(issues)
	}
	exact := visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation))
	k, err := trial.Build(t.Context(), sv, 2)
	if err != nil {
		t.Fatal(err)
	}
	out, err := scheduler.Solve(t.Context(), scheduler.Input{Survey: sv, Sky: k.Sky, Calendar: k.Calendar, Windows: k.Windows, Workers: 2}, scheduler.Params{Effort: "quick"})
	if err != nil {
		t.Fatal(err)
	}
	pt, err := tables.Build(t.Context(), sv, exact, k.Calendar, k.Windows, out, 2)
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for n := range sv.Nights() {
		for tel := range sv.Telescopes {
			ask := Ask{Telescope: sv.Telescopes[tel].Name, Night: sv.FirstNight + survey.Day(n)}
			list, err := Reserve(t.Context(), sv, exact, nil, pt, ask, 20, 2)
			if err != nil {
				t.Fatal(err)
			}
			last := math.Inf(1)
			for _, x := range list {
				if seen++; x.PerHour > last || x.Best < x.From || x.Best > x.To {
					t.Errorf("%+v after one worth %g", x, last)
				}
				last = x.PerHour
				for _, at := range []float64{x.From, x.Best, x.To} {
					list := withSpare(t, out.Plan.Exposures, k, x, int32(tel), int32(n), at)
					r, err := audit.Check(t.Context(), audit.Input{Survey: sv, Exact: exact, Plan: audit.Plan{Visits: trial.Rows(sv, list), LegalityOnly: true}})
					if err != nil {
						t.Fatal(err)
					}
					for _, b := range r.Breaches {
						if b.Rule != audit.RuleCount { // it takes the place of a later one
							t.Errorf("%s at %f: %s: %s", x.Field, at, b.Rule, b.What)
						}
					}
				}
			}
		}
	}
	if seen < 5 {
		t.Errorf("%d entries in all; want some to test", seen)
	}
}

// withSpare is the plan of one field with a spare visit at a start.
func withSpare(t *testing.T, plan []model.Exposure, k *trial.Kit, x Spare, tel, night int32, at float64) []model.Exposure {
	t.Helper()
	var out []model.Exposure
	var f int
	for i := range k.Survey.Fields {
		if k.Survey.Fields[i].Name == x.Field {
			f = i
		}
	}
	for _, e := range plan {
		if int(e.Field) == f {
			out = append(out, e)
		}
	}
	demands := k.Survey.Programs[k.Survey.Fields[f].Program].Demands
	for d := range demands {
		if demands[d].Name != x.Demand {
			continue
		}
		set := int64(0)
		if demands[d].IsSet() {
			set = 1 << 40
		}
		for s, e := range demands[d].Exposures {
			at += e.After
			start := model.MicroCeil(at)
			if s == 0 && at == x.To {
				start = int64(at*1e6) - 1000
			}
			out = append(out, model.Exposure{
				Visit: int64(1<<40 + s), Set: set, Field: int32(f), Demand: int32(d), Step: int32(s), Telescope: tel, Night: night, State: model.Planned,
				Start: start, End: start + model.MicroOf(e.Duration*k.Survey.Telescopes[tel].ExposureScale),
			})
		}
	}
	return out
}

// TestReserveStandsOnTheSheet: in text, page and CSV.
func TestReserveStandsOnTheSheet(t *testing.T) {
	s := busy(t).sheet(t, "C1", 0)
	s.HourPrice = 50e-6
	s.Reserve = []Spare{
		{Field: "E777", Program: "wide", Demand: "r", Filter: "r", RA: 150, Dec: -5, Exposure: 60, Exposures: 1, From: s.Open[0].From, To: s.Open[0].To, Best: s.Open[0].From, Quality: 0.8, PerHour: 120e-6},
		{Field: "E778", Program: "wide", Demand: "colour", Filter: "g", RA: 151, Dec: -6, Exposure: 60, Exposures: 2, From: s.Open[0].From, To: s.Open[0].To, Best: s.Open[0].To, Quality: 0.7, PerHour: 90e-6},
	}
	var text, html, csv strings.Builder
	for _, err := range []error{s.WriteText(&text), s.WriteHTML(&html), s.WriteCSV(&csv)} {
		if err != nil {
			t.Fatal(err)
		}
	}
	for _, want := range []string{"In reserve", "R1  E777  r, r 60 s", "120 an hour  10:00:00.0 -05:00:00", "R2  E778  colour, set of 2 from g 60 s", "worth 50 in the plan"} {
		if !strings.Contains(text.String(), want) {
			t.Errorf("the text has no %q:\n%s", want, text.String())
		}
	}
	for _, line := range strings.Split(text.String(), "\n") {
		if len([]rune(line)) > width {
			t.Errorf("%d columns: %q", len([]rune(line)), line)
		}
	}
	if !strings.Contains(html.String(), "E777") || !strings.Contains(csv.String(), "\nreserve,C1,Cinder Ridge,E777,r,r,,,,,\"start from ") {
		t.Errorf("page or CSV lack the reserve:\n%s", csv.String())
	}
}
