package outlook

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const degree = math.Pi / 180

// oneRidge is a survey of one invented site at 33.2 deg north over ten nights of
// March 2027, with one telescope and the given demands and fields, all of
// program 0.
func oneRidge(demands []survey.Demand, fields ...survey.Field) *survey.Survey {
	first, err := survey.ParseDay("2027-03-01")
	if err != nil {
		panic(err)
	}
	sv := &survey.Survey{
		Name: "One Ridge", FirstNight: first, LastNight: first + 9, Slot: 600,
		Filters:  []visibility.Filter{{Name: "r", Band: visibility.BandR, Extinction: 0.1, DarkSky: 21.2, Moonlight: 0.8}},
		Programs: []survey.Program{{Name: "wide", Weight: 1, ShareMax: 1, Demands: demands}},
		Sites:    []survey.Site{{Name: "Cinder Ridge", Latitude: 33.2 * degree, Longitude: -106.8 * degree, Elevation: 2140, Telescopes: []int{0}}},
		Telescopes: []survey.Telescope{{
			Name: "C1", Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 2 * degree},
			AltitudeMin: 20 * degree, AltitudeMax: 88 * degree, Slew: survey.Slew{Rate: 3 * degree, Acceleration: 1.5 * degree, Settle: 3},
			Readout: 8, Filters: []int{0}, ExposureScale: 1,
		}},
	}
	for _, f := range fields {
		f.Weight = 1
		if f.NotAfter == 0 {
			f.NotBefore, f.NotAfter = math.Inf(-1), math.Inf(1)
		}
		r := survey.Rules{
			AltitudeMin: 30 * degree, AirmassMax: 2, SunAltitudeMax: -15 * degree,
			MoonSeparationMin: 5 * degree, MoonIlluminationMax: 1, HourAngleMax: math.Pi,
		}
		if len(f.Rules) > 0 {
			r.MinQuality = f.Rules[0].MinQuality
		}
		f.Rules = nil
		for range demands {
			f.Rules = append(f.Rules, r)
		}
		sv.Fields = append(sv.Fields, f)
	}
	return sv
}

func single(visits int, gap float64, perNight int) survey.Demand {
	return survey.Demand{
		Name: "r", Visits: visits, Exposures: []survey.Exposure{{Duration: 60}}, GapMin: gap, GapMax: math.Inf(1), PerNight: perNight,
	}
}

func look(t *testing.T, sv *survey.Survey, workers int) *Report {
	t.Helper()
	exact := visibility.NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{}))
	in := Input{Survey: sv, Exact: exact, Calendar: constraints.NewCalendar(sv, exact, nil), Sky: constraints.Tables(sv, exact, workers), Workers: workers}
	var err error
	if in.Windows, err = constraints.NewWindows(t.Context(), sv, in.Sky, in.Calendar, workers); err != nil {
		t.Fatal(err)
	}
	r, err := Look(t.Context(), in)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// plain stands 13 deg south of the zenith at its transit near local midnight.
var plain = survey.Field{Name: "plain", RA: 165 * degree, Dec: 20 * degree}

func TestShutDemandsNameTheirRule(t *testing.T) {
	winter := survey.Day(18262).Unix() // 2020-01-01, long past
	sv := oneRidge([]survey.Demand{single(2, 0, 0)},
		plain,
		// From 33.2 deg north nothing south of -56.8 deg rises (90 deg less the
		// latitude: common practice); -50 deg culminates at 6.8 deg.
		survey.Field{Name: "never up", RA: 165 * degree, Dec: -80 * degree},
		survey.Field{Name: "too low", RA: 165 * degree, Dec: -50 * degree},
		survey.Field{Name: "too late", RA: 165 * degree, Dec: 20 * degree, NotBefore: winter, NotAfter: winter + 86400},
		survey.Field{Name: "too good", RA: 165 * degree, Dec: -20 * degree, Rules: []survey.Rules{{MinQuality: 0.99}}},
		survey.Field{Name: "too wide", RA: 165 * degree, Dec: 20 * degree, Tile: 3 * degree},
	)
	want := map[string]string{
		"never up": "altitude", "too low": "altitude", "too late": "dates", "too good": "quality", "too wide": "telescope",
	}
	r := look(t, sv, 2)
	got := map[string]string{}
	for _, x := range r.Shut {
		got[sv.Fields[x.Field].Name] = x.Limit
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Errorf("shut demands (-want +got):\n%s", d)
	}
	if r.ShortField != 5 {
		t.Errorf("%d fields can't finish; want 5", r.ShortField)
	}
}

func TestShortDemands(t *testing.T) {
	const day = 86400
	tests := []struct {
		name   string
		demand survey.Demand
		want   Short
	}{
		// Ten nights, three days apart: nights 0, 3, 6 and 9.
		{"spacing", single(6, 3*day-1800, 0), Short{Wanted: 6, Most: 4, Limit: "gap"}},
		{"one a night", single(12, 0, 1), Short{Wanted: 12, Most: 10, Limit: "per_night"}},
	}
	for _, tt := range tests {
		r := look(t, oneRidge([]survey.Demand{tt.demand}, plain), 1)
		if d := cmp.Diff([]Short{tt.want}, r.Short); d != "" {
			t.Errorf("%s (-want +got):\n%s", tt.name, d)
		}
	}
	for _, fits := range []survey.Demand{single(4, 3*day-1800, 0), single(10, 0, 1), single(200, 0, 0)} {
		if r := look(t, oneRidge([]survey.Demand{fits}, plain), 1); len(r.Short)+len(r.Shut) > 0 {
			t.Errorf("%d visits with gap %g are called impossible: %+v %+v", fits.Visits, fits.GapMin, r.Short, r.Shut)
		}
	}
}

// TestBalancesAddUp: each hour asked and each hour open stands once in the
// table by right ascension, and once in that by month.
func TestBalancesAddUp(t *testing.T) {
	sv := oneRidge([]survey.Demand{single(3, 0, 0), {
		Name: "pair", Visits: 2, GapMax: math.Inf(1),
		Exposures: []survey.Exposure{{Duration: 120}, {Duration: 120, After: 1200, Tolerance: 300}},
	}}, plain, survey.Field{Name: "east", RA: 200 * degree, Dec: 10 * degree})
	sv.LastNight += 30 // into April
	r := look(t, sv, 2)
	var ra, month Balance
	for _, b := range r.Ascension {
		ra.Asked += b.Asked
		ra.Open += b.Open
	}
	for _, m := range r.Months {
		month.Asked += m.Asked
		month.Open += m.Open
	}
	// Exposures plus the least gap, which is the readout of 8 s.
	asked := 2 * (3*68 + 2*(128+128)) / 3600.0
	for name, got := range map[string]float64{"in all": r.Asked, "by right ascension": ra.Asked, "by month": month.Asked} {
		if math.Abs(got-asked) > 1e-9 {
			t.Errorf("%s %.6f h are asked; want %.6f", name, got, asked)
		}
	}
	for name, got := range map[string]float64{"by right ascension": ra.Open, "by month": month.Open, "by telescope": r.Telescopes[0].Free} {
		if math.Abs(got-r.Open) > 1e-9*r.Open {
			t.Errorf("%s %.6f h are open; want %.6f", name, got, r.Open)
		}
	}
	if len(r.Months) != 2 || r.Months[0].Nights != 31 || r.Months[1].Nights != 9 {
		t.Errorf("months %+v; want 31 nights of March and 9 of April", r.Months)
	}
	// In March the Sun is near 23 h: 11 h culminates at midnight, 23 h at noon
	// (common practice).
	for i, b := range r.Ascension {
		if (b.Seen > 0) != (b.Asked > 0) {
			t.Errorf("bin %d: %.1f h asked, %.1f h seen", i, b.Asked, b.Seen)
		}
	}
	if r.Ascension[5].Open < r.Ascension[4].Open/2 || r.Ascension[11].Open != 0 {
		t.Errorf("open hours by right ascension %+v", r.Ascension)
	}
}

func TestLookDoesNotDependOnWorkers(t *testing.T) {
	sv := oneRidge([]survey.Demand{single(6, 86400, 0)}, plain, survey.Field{Name: "south", RA: 180 * degree, Dec: -35 * degree})
	if d := cmp.Diff(look(t, sv, 1), look(t, sv, 5)); d != "" {
		t.Errorf("1 and 5 workers (-1 +5):\n%s", d)
	}
}

func TestLossesAreParts(t *testing.T) {
	sv := oneRidge([]survey.Demand{single(6, 86400, 0)}, plain, survey.Field{Name: "south", RA: 180 * degree, Dec: -35 * degree})
	r := look(t, sv, 2)
	seen := map[string]Loss{}
	sum := r.Usable
	for _, l := range r.Losses {
		seen[l.Rule] = l
		sum += l.InOrder
		if l.InOrder < 0 || l.InOrder > l.Takes || l.Takes > 1 {
			t.Errorf("%+v: its part in order can't exceed what it takes, nor that 1", l)
		}
	}
	if math.Abs(sum-1) > 1e-9 {
		t.Errorf("what the rules take in order and what they leave add up to %.12f", sum)
	}
	// The southern field culminates at 21.8 deg: half of what is up is lost to altitude.
	if l := seen["altitude"]; l.Takes < 0.3 {
		t.Errorf("altitude takes %.3f; want 0.3 or more", l.Takes)
	}
}

// TestStartsAgainstDynamicProgram compares the greedy count with the best
// count over whole seconds.
func TestStartsAgainstDynamicProgram(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 1))
	for round := range 400 {
		var chances []chance
		var allowed [300]bool
		for range 1 + r.IntN(6) {
			from := r.IntN(250)
			to := from + r.IntN(49)
			chances = append(chances, chance{from: float64(from), to: float64(to)})
			for s := from; s <= to; s++ {
				allowed[s] = true
			}
		}
		spacing := 1 + r.IntN(60)
		best := make([]int, len(allowed)+1)
		for s, ok := range allowed {
			best[s+1] = best[s]
			if ok {
				best[s+1] = max(best[s], best[max(0, s+1-spacing)]+1)
			}
		}
		want := min(best[len(allowed)], 20)
		if got := starts(chances, float64(spacing), 20); got != want {
			t.Fatalf("round %d: %d starts, want %d: %v spacing %d", round, got, want, chances, spacing)
		}
	}
}
