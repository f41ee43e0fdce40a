package trial

import (
	"fmt"
	"math"
	"math/rand/v2"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Micro draws a survey small enough for an exact solver: a few long visits
// that crowd one to three nights of one or two places, with quick slews and
// slow filter changes. The features go round with the seed, so that any 60
// seeds in a row meet all of them, alone and together: sets, gaps over places,
// visits a night, shares, filters that only some telescopes carry, a finish
// bonus, keep_free, reserved blocks, exposure scales.
func Micro(seed uint64) *survey.Survey {
	m := &maker{r: rand.New(rand.NewPCG(seed, 0x3c1)), sv: &survey.Survey{Name: "Micro", Seed: seed, Slot: 600}}
	m.sv.FirstNight = 20878 + survey.Day(m.r.IntN(300))
	m.sv.LastNight = m.sv.FirstNight + survey.Day(m.r.IntN(3))
	if seed%5 == 2 { // bounds on sums of all columns are hard for exact solvers
		m.sv.LastNight = m.sv.FirstNight
	}
	if seed%3 == 1 {
		m.sv.FinishBonus = m.between(0.1, 1)
	}
	m.sv.Filters = []visibility.Filter{
		{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
		{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 0.8},
	}
	places := []survey.Site{
		{Name: "Salt Mesa", Latitude: -30.4 * deg, Longitude: -70.9 * deg, Elevation: 2600},
		{Name: "Dune Edge", Latitude: -29 * deg, Longitude: 25 * deg, Elevation: 1100},
	}
	for i := range places[:1+m.r.IntN(2)] {
		s := places[i]
		for range 1 + m.r.IntN(2)/(1+i) {
			s.Telescopes = append(s.Telescopes, len(m.sv.Telescopes))
			m.quick(i, seed)
		}
		m.sv.Sites = append(m.sv.Sites, s)
	}
	m.sv.Telescopes[0].Filters = []int{0, 1}
	programs := 1 + m.r.IntN(2)
	if seed%5 == 2 {
		programs = 2
	}
	for p := range programs {
		pr := survey.Program{Name: fmt.Sprintf("P%d", p), Weight: m.between(0.5, 2), ShareMax: 1}
		for d := range 1 + m.r.IntN(2) {
			pr.Demands = append(pr.Demands, m.longDemand(d, seed))
		}
		m.sv.Programs = append(m.sv.Programs, pr)
	}
	if seed%5 == 2 {
		m.sv.Programs[0].ShareMin = m.between(0.3, 0.6)
		m.sv.Programs[1].ShareMax = m.between(0.3, 0.7)
	}
	m.crowd()
	return m.sv
}

// quick adds a telescope whose slews are short against the exposures.
func (m *maker) quick(site int, seed uint64) {
	t := survey.Telescope{
		Name: fmt.Sprintf("T%d", len(m.sv.Telescopes)), Site: site, Mount: survey.Altazimuth,
		FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg}, AltitudeMin: 20 * deg, AltitudeMax: 88 * deg,
		Slew: survey.Slew{Rate: 10 * deg, Acceleration: 10 * deg, Settle: 2}, Readout: pick(m.r, 8.0, 60), Filters: pick(m.r, []int{0, 1}, []int{1}),
		FilterChange: pick(m.r, 0.0, 20), ExposureScale: pick(m.r, 1, 1, 0.8),
	}
	if m.chance(3) {
		t.Mount, t.Flip = survey.Equatorial, &survey.Flip{Time: 30, PastMeridian: 5 * deg}
	}
	if seed%4 == 3 {
		t.KeepFree = m.between(0.05, 0.5)
	}
	if m.chance(4) {
		t.Reserved = []survey.Reserved{{At: survey.AtEvery, Every: 7200, Takes: 600}}
	}
	m.sv.Telescopes = append(m.sv.Telescopes, t)
}

func (m *maker) longDemand(i int, seed uint64) survey.Demand {
	d := survey.Demand{
		Name: fmt.Sprintf("D%d", i), Visits: 1 + m.r.IntN(2), GapMax: math.Inf(1),
		GapMin: pick(m.r, 0.0, 3600, 5*3600, 20*3600), PerNight: pick(m.r, 0, 0, 1),
	}
	length := 600 * float64(3+m.r.IntN(7)) // 30 to 90 min
	d.Exposures = []survey.Exposure{{Filter: (i + m.r.IntN(2)) % 2, Duration: length}}
	if seed%4 == 1 && i == 0 {
		d.Exposures = []survey.Exposure{{Filter: 0, Duration: 1500}, {Filter: 1, Duration: 900, After: 5400, Tolerance: 1200}}
	}
	return d
}

// crowd adds fields that the night side of the sky shows to the places.
func (m *maker) crowd() {
	rules := survey.Rules{
		AltitudeMin: 35 * deg, AirmassMax: 1.8, SunAltitudeMax: -15 * deg, MoonSeparationMin: 15 * deg, MoonIlluminationMax: 1,
		HourAngleMax: 4 * 15 * deg, MinQuality: 0.1,
	}
	// The night faces the other side of the Sun, which is at 0 h on day 79.
	yearDay := float64(m.sv.FirstNight-20878) + 60
	facing := 180 + 360*(yearDay-80)/365.25
	fields := 4 + m.r.IntN(4)
	if m.sv.Programs[0].ShareMin > 0 {
		fields = 4
	}
	for i := range fields {
		f := survey.Field{
			Name: fmt.Sprintf("F%d", i), RA: math.Mod(facing+m.between(-60, 60)+720, 360) * deg, Dec: m.between(-60, 0) * deg,
			Program: i % len(m.sv.Programs), Weight: m.between(0.5, 2), NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
		}
		for range m.sv.Programs[f.Program].Demands {
			f.Rules = append(f.Rules, rules)
		}
		m.sv.Fields = append(m.sv.Fields, f)
	}
}
