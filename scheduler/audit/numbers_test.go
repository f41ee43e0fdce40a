package audit

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightwright/scheduler/tables"
)

// The rows of the tables are the audit's rows, field for field.
var (
	_ = Visit(tables.VisitRow{})
	_ = DemandTotal(tables.DemandRow{})
	_ = Score(tables.Score{})
	_ = Hours(tables.Hours{})
)

// columns are the numbers of a row with what is forgiven: 0.1" is 2.7e-5 deg.
var columns = []struct {
	name        string
	of          func(v *Visit) *float64
	bad, little float64
}{
	{"altitude_deg", func(v *Visit) *float64 { return &v.Altitude }, 3e-5, 2e-5},
	{"azimuth_deg", func(v *Visit) *float64 { return &v.Azimuth }, 2e-4, 2e-5},
	{"airmass", func(v *Visit) *float64 { return &v.Airmass }, 1e-5, 5e-7},
	{"sun_altitude_deg", func(v *Visit) *float64 { return &v.SunAltitude }, 3e-5, 2e-5},
	{"moon_altitude_deg", func(v *Visit) *float64 { return &v.MoonAltitude }, 3e-5, 2e-5},
	{"moon_separation_deg", func(v *Visit) *float64 { return &v.MoonSeparation }, 3e-5, 2e-5},
	{"sky_mag_arcsec2", func(v *Visit) *float64 { return &v.SkyMagnitude }, 2e-5, 5e-6},
	{"quality", func(v *Visit) *float64 { return &v.Quality }, 2e-6, 1e-7},
	{"credit", func(v *Visit) *float64 { return &v.Credit }, 1e-6, 1e-9},
	{"gap_before_s", func(v *Visit) *float64 { return &v.GapBefore }, 2e-3, 5e-4},
	{"exposure_s", func(v *Visit) *float64 { return &v.Exposure }, 1e-5, 1e-6},
	{"ra_deg", func(v *Visit) *float64 { return &v.RA }, 1e-8, 1e-10},
	{"dec_deg", func(v *Visit) *float64 { return &v.Dec }, 1e-8, 1e-10},
}

func TestEachNumberIsChecked(t *testing.T) {
	f := makeFixture(t)
	j := f.judge(t)
	for _, c := range columns {
		for _, off := range []float64{c.bad, -c.bad, math.NaN(), math.Inf(1)} {
			v := *f.at("F2", "r", lamp, 0)
			rows := slices.Clone(f.visits)
			i := slices.IndexFunc(rows, func(r Visit) bool { return r.Visit == v.Visit })
			*c.of(&rows[i]) += off
			r, err := j.Check(t.Context(), Plan{Visits: rows})
			if err != nil {
				t.Fatal(err)
			}
			if len(r.Breaches) != 1 || r.Breaches[0].Rule != RuleNumber || !strings.HasPrefix(r.Breaches[0].What, c.name+" ") || r.Breaches[0].Visit != v.Visit {
				t.Errorf("%s off by %v: %+v", c.name, off, r.Breaches)
			}
			if r, _ = j.Check(t.Context(), Plan{Visits: rows, LegalityOnly: true}); len(r.Breaches) != 0 {
				t.Errorf("%s off by %v: told where legality alone is asked: %+v", c.name, off, r.Breaches)
			}
			*c.of(&rows[i]) = *c.of(&v) + c.little
			if r, _ = j.Check(t.Context(), Plan{Visits: rows}); len(r.Breaches) != 0 {
				t.Errorf("%s off by %v only: %+v", c.name, c.little, r.Breaches)
			}
		}
	}
}

// TestReportDoesNotDependOnOrder breaks much at once, and shuffles.
func TestReportDoesNotDependOnOrder(t *testing.T) {
	f := makeFixture(t)
	f.sv.Programs[0].Demands[0].PerNight = 1
	f.sv.Programs[1].Demands[0].Exposures[2].Tolerance = 10
	f.rules(f.at("F2", "r", lamp, 0)).AltitudeMin = 60 * deg
	f.at("F3", "g", lamp, 0).Visit = 100
	f.at("F4", "r", mesaTwo, 0).Night++
	f.at("S2", "triple", mesaTwo, 0).Set = 2
	f.at("F2", "g", mesa, 0).Field = "nowhere"
	twin := *f.at("F1", "g", lamp, 0)
	f.visits = append(f.visits, twin)
	totals := f.claims(t)
	totals.Coverage += 0.01
	var first *Report
	for seed := range uint64(6) {
		r := rand.New(rand.NewPCG(seed, 1))
		r.Shuffle(len(f.visits), func(a, b int) { f.visits[a], f.visits[b] = f.visits[b], f.visits[a] })
		got, err := Check(t.Context(), Input{Survey: f.sv, Workers: int(seed) + 1, Plan: Plan{Visits: f.visits, Totals: totals}})
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = got
			if len(got.Breaches) < 15 {
				t.Fatalf("only %d breaches", len(got.Breaches))
			}
		}
		if d := cmp.Diff(first, got, cmp.AllowUnexported(Breach{})); d != "" {
			t.Fatalf("seed %d: %s", seed, d)
		}
	}
}

func TestStoppedCheckErrs(t *testing.T) {
	f := makeFixture(t)
	j := f.judge(t)
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := j.Check(ctx, Plan{Visits: f.visits}); err == nil {
		t.Error("a stopped check has no error")
	}
	if _, err := NewJudge(ctx, f.sv, nil, nil, 2); err == nil {
		t.Error("a stopped judge has no error")
	}
}

func TestEmptyPlanIsLegal(t *testing.T) {
	f := &fixture{sv: smallSurvey()}
	r := f.check(t)
	if !r.Legal() || r.Score.Coverage != 0 || r.Score.VisitsWanted != 4*5+2*2 || r.Score.FieldsWanted != 6 {
		t.Errorf("%+v", r)
	}
}
