// Package trial makes small random surveys, everything that is worked out
// from them, and legal plans for them: material for the tests of the
// scheduler's rooms. Nothing but tests imports it. Sites, fields and programs
// are invented.
package trial

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const deg = math.Pi / 180

// Kit is a survey with everything made from it.
type Kit struct {
	Survey   *survey.Survey
	Exact    *visibility.Exact
	Sky      *visibility.Sky
	Calendar *constraints.Calendar
	Windows  *constraints.Windows
	Problem  *model.Problem
}

// Build works everything out.
func Build(ctx context.Context, sv *survey.Survey, workers int) (*Kit, error) {
	k := &Kit{Survey: sv, Exact: visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))}
	k.Sky = constraints.Tables(sv, k.Exact, workers)
	k.Calendar = constraints.NewCalendar(sv, k.Exact, nil)
	var err error
	if k.Windows, err = constraints.NewWindows(ctx, sv, k.Sky, k.Calendar, workers); err != nil {
		return nil, err
	}
	k.Problem, err = model.NewProblem(sv, k.Sky, k.Calendar, k.Windows, workers)
	return k, err
}

// Check judges the legality of exposures on the exact path and recounts
// their coverage.
func (k *Kit) Check(ctx context.Context, list []model.Exposure) (*audit.Report, error) {
	return audit.Check(ctx, audit.Input{
		Survey: k.Survey, Exact: k.Exact, Workers: 2,
		Plan: audit.Plan{Visits: Rows(k.Survey, list), LegalityOnly: true},
	})
}

// Rows turns exposures into the rows that a judge takes.
func Rows(sv *survey.Survey, list []model.Exposure) []audit.Visit {
	out := make([]audit.Visit, len(list))
	for i := range list {
		e := &list[i]
		f := &sv.Fields[e.Field]
		p := &sv.Programs[f.Program]
		d := &p.Demands[e.Demand]
		t := &sv.Telescopes[e.Telescope]
		out[i] = audit.Visit{
			Visit: e.Visit, Set: e.Set, Field: f.Name, Program: p.Name, Demand: d.Name,
			Filter: sv.Filters[d.Exposures[e.Step].Filter].Name, Site: sv.Sites[t.Site].Name, Telescope: t.Name,
			Night: int32(sv.FirstNight) + e.Night, Start: e.Start, End: e.End, State: e.State.String(),
		}
	}
	return out
}

// spots are places worth a test: both hemispheres, the equator, the poles and
// the date line.
var spots = []survey.Site{
	{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140},
	{Name: "Salt Mesa", Latitude: -30.4 * deg, Longitude: -70.9 * deg, Elevation: 2600},
	{Name: "Thorn Gate", Latitude: -32.1 * deg, Longitude: 20.5 * deg, Elevation: 1750},
	{Name: "Line Atoll", Latitude: 0, Longitude: 180 * deg, Elevation: 5},
	{Name: "Edge Isle", Latitude: -17.5 * deg, Longitude: -180 * deg, Elevation: 30},
	{Name: "Heron Fell", Latitude: 41.7 * deg, Longitude: 74.3 * deg, Elevation: 2700},
	{Name: "Ice Dome", Latitude: -80.4 * deg, Longitude: 77.3 * deg, Elevation: 4093},
	{Name: "North Floe", Latitude: 88.5 * deg, Longitude: -30 * deg, Elevation: 0},
}

// maker draws one survey.
type maker struct {
	r  *rand.Rand
	sv *survey.Survey
}

// pick returns one of the choices.
func pick[T any](r *rand.Rand, choices ...T) T { return choices[r.IntN(len(choices))] }

// between returns a number in [lo, hi).
func (m *maker) between(lo, hi float64) float64 { return lo + (hi-lo)*m.r.Float64() }

// chance is true once in n draws on average.
func (m *maker) chance(n int) bool { return m.r.IntN(n) == 0 }

// Survey draws a small survey from a seed: one to three sites, some nights at
// any phase of the Moon, a few fields, and any of the features that a survey
// file can ask for.
func Survey(seed uint64) *survey.Survey {
	m := &maker{r: rand.New(rand.NewPCG(seed, 0x7121a1)), sv: &survey.Survey{Name: "Trial", Seed: seed}}
	first, err := survey.ParseDay("2027-01-01")
	if err != nil {
		panic(err)
	}
	first += survey.Day(m.r.IntN(365))
	m.sv.FirstNight, m.sv.LastNight = first, first+survey.Day(m.r.IntN(4))
	m.sv.Slot = pick(m.r, 300.0, 600, 600, 900, 1800)
	m.sv.FinishBonus = pick(m.r, 0, 0, 0.3, 2)
	m.filters()
	m.sites()
	m.programs()
	m.fields()
	if m.chance(3) {
		m.narrow()
	}
	return m.sv
}

func (m *maker) filters() {
	for _, name := range []string{"blue", "red"} {
		m.sv.Filters = append(m.sv.Filters, visibility.Filter{
			Name: name, Band: pick(m.r, visibility.BandU, visibility.BandB, visibility.BandV, visibility.BandR, visibility.BandI),
			Extinction: m.between(0.02, 0.6), DarkSky: m.between(19.5, 22.8), Moonlight: m.between(0, 2),
		})
	}
}

func (m *maker) sites() {
	for _, i := range m.r.Perm(len(spots))[:1+m.r.IntN(3)] {
		s := spots[i]
		if m.chance(4) {
			s.Horizon = []survey.HorizonPoint{{Azimuth: 0, Altitude: 12 * deg}, {Azimuth: 2, Altitude: 30 * deg}, {Azimuth: 4, Altitude: 15 * deg}}
		}
		for range 1 + m.r.IntN(2) {
			s.Telescopes = append(s.Telescopes, len(m.sv.Telescopes))
			m.telescope(len(m.sv.Sites))
		}
		m.sv.Sites = append(m.sv.Sites, s)
	}
	// One that carries everything, so that most demands can be served.
	m.sv.Telescopes[0].Filters = []int{0, 1}
}

func (m *maker) telescope(site int) {
	t := survey.Telescope{
		Name: fmt.Sprintf("T%d", len(m.sv.Telescopes)), Site: site, Mount: survey.Altazimuth,
		FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg}, AltitudeMin: m.between(0, 20) * deg, AltitudeMax: pick(m.r, 87, 90, 89.5) * deg,
		Slew:    survey.Slew{Rate: m.between(0.5, 5) * deg, Acceleration: m.between(0.3, 3) * deg, Settle: m.between(0, 6)},
		Readout: pick(m.r, 0, 8, m.between(1, 60)), Filters: pick(m.r, []int{0, 1}, []int{0, 1}, []int{0}, []int{1}),
		FilterChange: m.between(0, 90), DuringSlew: m.chance(2), ExposureScale: pick(m.r, 1, 1, m.between(0.5, 2)),
	}
	switch m.r.IntN(4) {
	case 0:
		t.AzimuthRange = &survey.AzimuthRange{From: -200 * deg, To: 150 * deg}
	case 1:
		t.Mount = survey.Equatorial
	case 2:
		t.Mount, t.Flip = survey.Equatorial, &survey.Flip{Time: m.between(0, 120), PastMeridian: m.between(0, 10) * deg}
	}
	if m.chance(3) {
		t.Reserved = []survey.Reserved{{At: survey.AtOpening, Takes: 900}, {At: survey.AtEvery, Every: 3600, Takes: 180}}
	}
	if m.chance(4) {
		t.Reserved = append(t.Reserved, survey.Reserved{At: survey.AtClosing, Takes: 600})
	}
	if m.chance(3) {
		t.KeepFree = m.between(0.02, 0.9)
	}
	if m.chance(4) {
		from := m.sv.FirstNight.Unix() + float64(m.r.IntN(300))*600
		t.Closures = []survey.Closure{{From: from, To: from + float64(m.r.IntN(60))*600}}
	}
	m.sv.Telescopes = append(m.sv.Telescopes, t)
}

func (m *maker) programs() {
	for p := range 1 + m.r.IntN(3) {
		pr := survey.Program{Name: fmt.Sprintf("P%d", p), Weight: m.between(0.1, 3), ShareMax: 1}
		for d := range 1 + m.r.IntN(2) {
			pr.Demands = append(pr.Demands, m.demand(d))
		}
		m.sv.Programs = append(m.sv.Programs, pr)
	}
}

func (m *maker) demand(i int) survey.Demand {
	d := survey.Demand{
		Name: fmt.Sprintf("D%d", i), Visits: 1 + m.r.IntN(5), GapMax: math.Inf(1),
		GapMin: pick(m.r, 0, 60, 450, 1800, 7200, 15*3600, 40*3600, math.Round(m.between(1, 90000))), PerNight: pick(m.r, 0, 0, 0, 1, 2),
	}
	length := pick(m.r, m.between(20, 100), m.between(100, 1000), m.between(1000, 4000))
	steps := pick(m.r, 1, 1, 2, 3)
	for k := range steps {
		e := survey.Exposure{Filter: m.r.IntN(2), Duration: math.Round(length*1000) / 1000}
		if k > 0 {
			e.After = math.Round(3*length + m.between(200, 1200))
			e.Tolerance = math.Round(m.between(0.1, 0.4) * e.After)
		}
		d.Exposures = append(d.Exposures, e)
	}
	return d
}

func (m *maker) fields() {
	rules := survey.Rules{
		AltitudeMin: m.between(5, 35) * deg, AirmassMax: m.between(1.8, 5), SunAltitudeMax: pick(m.r, -6.0, -12, -15, -18) * deg,
		MoonSeparationMin: pick(m.r, 0.0, 5, 25) * deg, MoonIlluminationMax: pick(m.r, 1, 1, 0.6),
		HourAngleMax: pick(m.r, 12.0, 5) * 15 * deg, MinQuality: pick(m.r, 0, 0.001, 0.1),
	}
	for i := range 2 + m.r.IntN(8) {
		lat := m.sv.Sites[m.r.IntN(len(m.sv.Sites))].Latitude
		f := survey.Field{
			Name: fmt.Sprintf("F%d", i), RA: m.between(0, 2*math.Pi), Dec: math.Max(-89*deg, math.Min(89*deg, lat+m.between(-50, 50)*deg)),
			Program: m.r.IntN(len(m.sv.Programs)), Weight: m.between(0.2, 2), NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
		}
		if m.chance(8) {
			f.NotBefore = m.sv.FirstNight.Unix() + m.between(0.3, 2)*86400
		}
		for range m.sv.Programs[f.Program].Demands {
			f.Rules = append(f.Rules, rules)
		}
		m.sv.Fields = append(m.sv.Fields, f)
	}
}

// narrow leaves each site open for a few visits a night alone, so that
// capacity binds: the stretch holds a whole number of the first demand's
// exposures exactly.
func (m *maker) narrow() {
	for i := range m.sv.Sites {
		s := &m.sv.Sites[i]
		t := &m.sv.Telescopes[s.Telescopes[0]]
		length := m.sv.Programs[0].Demands[0].Exposures[0].Duration*t.ExposureScale + t.Readout
		for n := -1; n <= m.sv.Nights(); n++ {
			noon := (m.sv.FirstNight + survey.Day(n)).Unix() + 43200 - s.Longitude/(2*math.Pi)*86400
			open := math.Floor((noon+43200+m.between(-4, 4)*3600)/m.sv.Slot) * m.sv.Slot
			wide := float64(1+m.r.IntN(4))*length - t.Readout
			s.Closures = append(s.Closures, survey.Closure{From: noon, To: open}, survey.Closure{From: open + wide, To: noon + 86400})
		}
	}
}
