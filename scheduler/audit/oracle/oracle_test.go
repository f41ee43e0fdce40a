package oracle

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/audit"
	"nightwright/visibility"
)

const deg = math.Pi / 180

// micro is one night of one telescope at an invented site, with fields that
// pass the zenith about midnight.
func micro(demands []survey.Demand, ra ...float64) *survey.Survey {
	first, err := survey.ParseDay("2027-03-06")
	if err != nil {
		panic(err)
	}
	sv := &survey.Survey{
		Name: "Three Lamps", FirstNight: first, LastNight: first, Slot: 600,
		Filters:  []visibility.Filter{{Name: "r", Band: visibility.BandR, Extinction: 0.1, DarkSky: 21.2, Moonlight: 0.8}},
		Programs: []survey.Program{{Name: "wide", Weight: 1, ShareMax: 1, Demands: demands}},
		Sites:    []survey.Site{{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140, Telescopes: []int{0}}},
		Telescopes: []survey.Telescope{{
			Name: "C1", Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 2 * deg}, AltitudeMin: 20 * deg, AltitudeMax: 89 * deg,
			Slew: survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3}, Readout: 8, Filters: []int{0}, ExposureScale: 1,
		}},
	}
	for i, x := range ra {
		f := survey.Field{Name: string(rune('A' + i)), RA: x * deg, Dec: 10 * deg, Weight: 1, NotBefore: math.Inf(-1), NotAfter: math.Inf(1)}
		for range demands {
			f.Rules = append(f.Rules, survey.Rules{
				AltitudeMin: 50 * deg, AirmassMax: 2, SunAltitudeMax: -15 * deg, MoonIlluminationMax: 1, HourAngleMax: math.Pi,
			})
		}
		sv.Fields = append(sv.Fields, f)
	}
	return sv
}

func oracleOf(t *testing.T, sv *survey.Survey) *Oracle {
	t.Helper()
	o, err := New(t.Context(), sv, nil)
	if err != nil {
		t.Fatal(err)
	}
	return o
}

func bestOf(t *testing.T, sv *survey.Survey, step float64) (*Oracle, float64, []audit.Visit) {
	t.Helper()
	o := oracleOf(t, sv)
	c, rows, err := o.Best(t.Context(), step)
	if err != nil {
		t.Fatal(err)
	}
	if !o.Legal(rows) || math.Abs(o.Coverage(rows)-c) > 1e-15 {
		t.Fatalf("coverage %v of %+v", c, rows)
	}
	return o, c, rows
}

func one(visits int, length, gap float64) survey.Demand {
	return survey.Demand{Name: "r", Visits: visits, Exposures: []survey.Exposure{{Duration: length}}, GapMin: gap, GapMax: math.Inf(1)}
}

// TestOneVisitIsAtItsBestStart: alone, a visit goes where its quality is best.
func TestOneVisitIsAtItsBestStart(t *testing.T) {
	sv := micro([]survey.Demand{one(1, 300, 0)}, 160)
	o, c, rows := bestOf(t, sv, 600)
	if len(rows) != 1 {
		t.Fatalf("%+v", rows)
	}
	for _, by := range []int64{-3, -2, -1, 1, 2, 3} {
		r := rows[0]
		r.Start += by * 600e6
		r.End += by * 600e6
		if o.Legal([]audit.Visit{r}) && o.Coverage([]audit.Visit{r}) > c {
			t.Errorf("%d steps on it earns more", by)
		}
	}
}

// TestExhaustive compares with a plain loop over all pairs of starts: two long
// exposures that get into each other's way.
func TestExhaustive(t *testing.T) {
	sv := micro([]survey.Demand{one(1, 5400, 0)}, 160, 165)
	const step = 900
	o, c, rows := bestOf(t, sv, step)
	if len(rows) != 2 {
		t.Fatalf("both fit into the night: %+v", rows)
	}
	night := o.exact.Night(visibility.Site{Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140}, int32(sv.FirstNight))
	most := 0.0
	at := func(id int64, field string, start float64) audit.Visit {
		s := int64(start) * 1e6
		return audit.Visit{Visit: id, Field: field, Program: "wide", Demand: "r", Filter: "r", Site: "Cinder Ridge", Telescope: "C1", Night: int32(sv.FirstNight), Start: s, End: s + 5400e6, State: "planned"}
	}
	for a := math.Ceil(night.From/step) * step; a < night.To; a += step {
		if !o.Legal([]audit.Visit{at(1, "A", a)}) {
			continue
		}
		for b := math.Ceil(night.From/step) * step; b < night.To; b += step {
			pair := []audit.Visit{at(1, "A", a), at(2, "B", b)}
			if o.Legal(pair) {
				most = math.Max(most, o.Coverage(pair))
			}
		}
	}
	if most == 0 || math.Abs(c-most) > 1e-12 {
		t.Errorf("best %v, the plain loop finds %v", c, most)
	}
	// Apart, each would have a better time: they do compete.
	_, alone, _ := bestOf(t, micro([]survey.Demand{one(1, 5400, 0)}, 160), step)
	if !(c < alone) {
		t.Errorf("together %v a field, alone %v", c, alone)
	}
}

func TestRulesOverSeveralVisitsHold(t *testing.T) {
	// Three visits an hour apart, at most two a night.
	d := one(3, 300, 3600)
	d.PerNight = 2
	if _, _, rows := bestOf(t, micro([]survey.Demand{d}, 160), 1800); len(rows) != 2 || rows[0].Start == rows[1].Start {
		t.Errorf("two fit: %+v", rows)
	}
	// A set of two, and the bonus of a field that gets all.
	sv := micro([]survey.Demand{{Name: "pair", Visits: 2, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Duration: 300}, {Duration: 300, After: 1800, Tolerance: 900}}}}, 160)
	sv.FinishBonus = 0.5
	_, c, rows := bestOf(t, sv, 900)
	if len(rows) != 4 || c < 0.8 {
		t.Errorf("coverage %v with %d exposures", c, len(rows))
	}
	// keep_free leaves room for one of two long exposures.
	sv = micro([]survey.Demand{one(1, 3*3600, 0)}, 150, 150)
	sv.Fields[1].Name = "B"
	sv.Fields[0].Rules[0].AltitudeMin, sv.Fields[1].Rules[0].AltitudeMin = 20*deg, 20*deg
	_, both, rows := bestOf(t, sv, 1800)
	sv.Telescopes[0].KeepFree = 0.6
	_, kept, few := bestOf(t, sv, 1800)
	if len(rows) != 2 || len(few) != 1 || kept >= both {
		t.Errorf("%d and %d exposures, coverage %v and %v", len(rows), len(few), both, kept)
	}
}

func TestTooLargeIsRefused(t *testing.T) {
	o := oracleOf(t, micro([]survey.Demand{one(3, 300, 0)}, 150, 155, 160))
	if _, _, err := o.Best(t.Context(), 600); err == nil {
		t.Error("nine visits are tried")
	}
	o = oracleOf(t, micro([]survey.Demand{one(1, 300, 0)}, 150, 155, 160))
	if _, _, err := o.Best(t.Context(), 0.5); err == nil {
		t.Error("steps of half a second are tried")
	}
}
