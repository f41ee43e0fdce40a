package oracle_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"strings"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler"
	"nightwright/scheduler/audit/oracle"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
	"nightwright/visibility"
)

const deg = math.Pi / 180

// draw makes a micro-survey at random: one or two sites with a telescope each,
// one to three nights, few long visits that crowd each other, and any of
// sets, cadence, a flip, closures, reserved blocks, keep_free, a finish bonus.
func draw(r *rand.Rand) *survey.Survey {
	first, err := survey.ParseDay("2027-03-01")
	if err != nil {
		panic(err)
	}
	first += survey.Day(r.IntN(28))
	some := func(odds float64) bool { return r.Float64() < odds }
	sv := &survey.Survey{
		Name: "Micro", FirstNight: first, LastNight: first + survey.Day(r.IntN(3)), Slot: 600,
		Filters: []visibility.Filter{
			{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
			{Name: "r", Band: visibility.BandR, Extinction: 0.1, DarkSky: 21.2, Moonlight: 0.8},
		},
		Programs: []survey.Program{{Name: "wide", Weight: 1, ShareMax: 1}},
		Sites: []survey.Site{
			{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140, Telescopes: []int{0}},
			{Name: "Salt Mesa", Latitude: -26.3 * deg, Longitude: -67.9 * deg, Elevation: 3020, Telescopes: []int{1}},
		}[:1+r.IntN(2)],
	}
	if some(0.4) {
		sv.FinishBonus = r.Float64()
	}
	for i := range sv.Sites {
		t := survey.Telescope{
			Name: fmt.Sprintf("T%d", i+1), Site: i, Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 2 * deg}, AltitudeMin: 20 * deg, AltitudeMax: 88 * deg,
			Slew:    survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3},
			Readout: []float64{8, 60, 600}[r.IntN(3)], Filters: []int{0, 1}, FilterChange: 45, DuringSlew: some(0.5), ExposureScale: 1 + 0.5*float64(r.IntN(2)),
		}
		if some(0.4) {
			t.Mount, t.Flip = survey.Equatorial, &survey.Flip{Time: 120, PastMeridian: 3 * deg}
		}
		if some(0.3) {
			t.KeepFree = 0.5 * r.Float64()
		}
		if some(0.4) {
			t.Reserved = append(t.Reserved, survey.Reserved{At: survey.AtEvery, Every: 7200, Takes: 900})
		}
		if some(0.3) {
			from := (first + 1).Unix() + float64(r.IntN(10))*3600
			t.Closures = append(t.Closures, survey.Closure{From: from, To: from + 1800 + 3600*r.Float64()})
		}
		sv.Telescopes = append(sv.Telescopes, t)
	}
	exposure := func() float64 { return []float64{600, 1800, 3600}[r.IntN(3)] }
	left := 3 + r.IntN(3) // visits in all
	if some(0.4) {
		sv.Programs[0].Demands = append(sv.Programs[0].Demands, survey.Demand{
			Name: "pair", Visits: 1, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Filter: 0, Duration: 900}, {Filter: 1, Duration: 900, After: 3600, Tolerance: 1800}},
		})
	}
	if len(sv.Programs[0].Demands) == 0 || some(0.6) {
		sv.Programs[0].Demands = append(sv.Programs[0].Demands, survey.Demand{
			Name: "r", Visits: 1 + r.IntN(2), Exposures: []survey.Exposure{{Filter: 1, Duration: exposure()}}, GapMax: math.Inf(1),
			GapMin: []float64{0, 7200, 86400}[r.IntN(3)], PerNight: r.IntN(3),
		})
	}
	each := 0
	for _, d := range sv.Programs[0].Demands {
		each += d.Visits
	}
	for i := 0; i < max(1, left/each); i++ {
		f := survey.Field{
			Name: fmt.Sprintf("F%d", i+1), RA: (150 + 40*r.Float64()) * deg, Dec: (-10 + 30*r.Float64()) * deg, Weight: 0.5 + r.Float64(),
			NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
		}
		for range sv.Programs[0].Demands {
			f.Rules = append(f.Rules, survey.Rules{
				AltitudeMin: 35 * deg, AirmassMax: 2.5, SunAltitudeMax: -15 * deg, MoonSeparationMin: 20 * deg, MoonIlluminationMax: 1,
				HourAngleMax: []float64{math.Pi, 20 * deg}[r.IntN(2)], MinQuality: 0.05,
			})
		}
		sv.Fields = append(sv.Fields, f)
	}
	return sv
}

// TestCeilingIsOverTheBestPlan: what the oracle finds is legal, so no ceiling
// may lie below it, at any effort; nor may the search's own plan lie above.
func TestCeilingIsOverTheBestPlan(t *testing.T) {
	rounds := 8
	if os.Getenv("NIGHTWRIGHT_LONG") != "" {
		rounds = 300
	}
	if testing.Short() {
		rounds = 3
	}
	won, most := 0, 0.0
	for seed := range uint64(rounds) {
		sv := draw(rand.New(rand.NewPCG(seed, 11)))
		o, err := oracle.New(t.Context(), sv, nil)
		if err != nil {
			t.Fatal(err)
		}
		best, rows, err := o.Best(t.Context(), 900)
		if err != nil {
			if strings.Contains(err.Error(), "too many") {
				t.Logf("seed %d: %v", seed, err)
				continue
			}
			t.Fatal(err)
		}
		k, err := trial.Build(t.Context(), sv, 2)
		if err != nil {
			t.Fatal(err)
		}
		out, err := scheduler.Solve(t.Context(), scheduler.Input{Survey: sv, Sky: k.Sky, Calendar: k.Calendar, Windows: k.Windows, Workers: 2}, scheduler.Params{Effort: []string{"quick", "normal", "thorough"}[seed%3], Seed: seed})
		if err != nil {
			t.Fatal(err)
		}
		if best > out.Ceiling+1e-12 {
			t.Errorf("seed %d: a legal plan earns %.9f, the ceiling is %.9f: %+v", seed, best, out.Ceiling, rows)
		}
		r, err := k.Check(t.Context(), out.Plan.Exposures)
		if err != nil {
			t.Fatal(err)
		}
		for _, b := range r.Breaches {
			t.Errorf("seed %d: %+v", seed, b)
		}
		if r.Score.Coverage > out.Ceiling+1e-12 {
			t.Errorf("seed %d: the plan earns %.9f, the ceiling is %.9f", seed, r.Score.Coverage, out.Ceiling)
		}
		if best > r.Score.Coverage {
			won++
		}
		if best > 0 {
			most = math.Max(most, model.Gap(best, out.Ceiling))
		}
		t.Logf("seed %d: oracle %.5f, plan %.5f, ceiling %.5f", seed, best, r.Score.Coverage, out.Ceiling)
	}
	t.Logf("the oracle's coarse plan was better in %d of %d; widest gap %.3f", won, rounds, most)
}
