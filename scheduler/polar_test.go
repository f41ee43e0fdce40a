package scheduler_test

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// TestPolarNightsAreOneSequence: where it is dark at the Sun's transit, the
// last exposure of a night and the first of the next need their gap too.
func TestPolarNightsAreOneSequence(t *testing.T) {
	day, err := survey.ParseDay("2027-12-20")
	if err != nil {
		t.Fatal(err)
	}
	const deg = math.Pi / 180
	sv := &survey.Survey{
		Name: "Polar", FirstNight: day, LastNight: day + 1, Slot: 600,
		Filters:  []visibility.Filter{{Name: "v", Band: visibility.BandV, Extinction: 0.15, DarkSky: 21.8, Moonlight: 1}},
		Programs: []survey.Program{{Name: "all", Weight: 1, ShareMax: 1, Demands: []survey.Demand{{Name: "d", Visits: 2, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Duration: 100}}}}}},
		Sites:    []survey.Site{{Name: "North Floe", Latitude: 88.5 * deg, Longitude: -30 * deg, Telescopes: []int{0}}},
		Telescopes: []survey.Telescope{{
			Name: "N", Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1}, AltitudeMax: 90 * deg,
			Slew: survey.Slew{Rate: 1 * deg, Acceleration: 1 * deg, Settle: 5}, Readout: 30, Filters: []int{0}, ExposureScale: 1,
		}},
	}
	for i := range 12 {
		sv.Fields = append(sv.Fields, survey.Field{
			Name: string(rune('A' + i)), RA: float64(i) * 0.5, Dec: (40 + 3*float64(i)) * deg, Weight: 1, NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
			Rules: []survey.Rules{{AltitudeMin: 20 * deg, AirmassMax: 5, SunAltitudeMax: -12 * deg, MoonIlluminationMax: 1, HourAngleMax: math.Pi}},
		})
	}
	transit := build(t, sv, 1).Calendar.Night(0, 0).To
	for _, half := range []float64{105, 400, 1000} {
		sv.Sites[0].Closures = []survey.Closure{{From: transit - 3*86400, To: transit - half}, {From: transit + half, To: transit + 3*86400}}
		k := build(t, sv, 1)
		o := solve(t, k, 1, "normal", 1)
		if c := legal(t, k, "polar", o.Plan.Exposures); c <= 0 || c > o.Ceiling {
			t.Errorf("half %g: coverage %g, ceiling %g", half, c, o.Ceiling)
		}
	}
}
