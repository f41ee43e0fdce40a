package constraints

import (
	"math"
	"math/rand/v2"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const deg = math.Pi / 180

// Invented places, both hemispheres and both poles among them.
var places = []survey.Site{
	{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140},
	{Name: "Salt Mesa", Latitude: -30.4 * deg, Longitude: -70.9 * deg, Elevation: 2600},
	{Name: "Thorn Gate", Latitude: -32.1 * deg, Longitude: 20.5 * deg, Elevation: 1750},
	{Name: "Fern Hollow", Latitude: 28.9 * deg, Longitude: -17.6 * deg, Elevation: 2300},
	{Name: "Slate Point", Latitude: -31.5 * deg, Longitude: 149.2 * deg, Elevation: 1150},
	{Name: "Heron Fell", Latitude: 41.7 * deg, Longitude: 74.3 * deg, Elevation: 2700},
}

func testFilters() []visibility.Filter {
	return []visibility.Filter{
		{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
		{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 0.8},
	}
}

func usualRules() survey.Rules {
	return survey.Rules{
		AltitudeMin: 30 * deg, AirmassMax: 2, SunAltitudeMax: -15 * deg,
		MoonSeparationMin: 25 * deg, MoonIlluminationMax: 1, HourAngleMax: 5 * 15 * deg, MinQuality: 0.1,
	}
}

func usualTelescope(name string, site int) survey.Telescope {
	return survey.Telescope{
		Name: name, Site: site, Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg},
		AltitudeMin: 20 * deg, AltitudeMax: 87 * deg,
		Slew:    survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3},
		Readout: 8, Filters: []int{0, 1}, FilterChange: 45, ExposureScale: 1,
	}
}

// makeSurvey is a survey of n random fields between dec -75 and +60 in three
// programs, from the first sites of places, a telescope at each.
func makeSurvey(sites, nights, n int, seed uint64) *survey.Survey {
	first, _ := survey.ParseDay("2027-02-01")
	sv := &survey.Survey{
		Name: "Ember Arc", FirstNight: first, LastNight: first + survey.Day(nights-1), Slot: 600, Seed: seed,
		Filters: testFilters(),
	}
	one := func(name string, filter int) survey.Demand {
		return survey.Demand{Name: name, Visits: 4, Exposures: []survey.Exposure{{Filter: filter, Duration: 60}}, GapMin: 86400, GapMax: math.Inf(1)}
	}
	for _, name := range []string{"wide", "deep", "movers"} {
		sv.Programs = append(sv.Programs, survey.Program{
			Name: name, Weight: 1, ShareMax: 1, Demands: []survey.Demand{one("g", 0), one("r", 1)},
		})
	}
	for i := range sites {
		s := places[i]
		s.Telescopes = []int{i}
		sv.Sites = append(sv.Sites, s)
		sv.Telescopes = append(sv.Telescopes, usualTelescope("T"+s.Name, i))
	}
	rng := rand.New(rand.NewPCG(seed, 1))
	lo, hi := math.Sin(-75*deg), math.Sin(60*deg)
	for i := range n {
		f := survey.Field{
			RA: rng.Float64() * 2 * math.Pi, Dec: math.Asin(lo + (hi-lo)*rng.Float64()),
			Program: i % 3, Weight: 1, NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
			Rules: []survey.Rules{usualRules(), usualRules()},
		}
		f.Rules[0].MoonSeparationMin = 40 * deg
		sv.Fields = append(sv.Fields, f)
	}
	return sv
}

func newExact() *visibility.Exact {
	return visibility.NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{}))
}

// built is a survey with everything made from it.
type built struct {
	sv  *survey.Survey
	e   *visibility.Exact
	sky *visibility.Sky
	cal *Calendar
	win *Windows
}

func build(t testing.TB, sv *survey.Survey, workers int) *built {
	t.Helper()
	b := &built{sv: sv, e: newExact()}
	b.sky = Tables(sv, b.e, workers)
	b.cal = NewCalendar(sv, b.e, nil)
	win, err := NewWindows(t.Context(), sv, b.sky, b.cal, workers)
	if err != nil {
		t.Fatal(err)
	}
	b.win = win
	return b
}
