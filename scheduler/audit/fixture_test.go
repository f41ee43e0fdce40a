package audit

import (
	"math"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const deg = math.Pi / 180

// The telescopes of the fixture.
const (
	lamp    = iota // altazimuth, at Lamp Hill
	mesa           // equatorial with a flip, at Salt Mesa
	mesaTwo        // altazimuth with an azimuth range and slower exposures, at Salt Mesa
)

// fixture is a small survey with a legal plan for it.
type fixture struct {
	sv     *survey.Survey
	visits []Visit
	losses [][]visibility.Interval
	done   []Done
}

// smallSurvey has two invented sites, three telescopes, three nights from
// 14 February 2027 (the Moon waxing, up in the evening), four wide fields and
// two fields with sets.
func smallSurvey() *survey.Survey {
	first, err := survey.ParseDay("2027-02-14")
	if err != nil {
		panic(err)
	}
	rules := survey.Rules{
		AltitudeMin: 25 * deg, AirmassMax: 2.3, SunAltitudeMax: -15 * deg, MoonSeparationMin: 10 * deg,
		MoonIlluminationMax: 1, HourAngleMax: 5.5 * 15 * deg, MinQuality: 0.001,
	}
	slew := survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3}
	telescope := func(name string, site int) survey.Telescope {
		return survey.Telescope{
			Name: name, Site: site, Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg},
			AltitudeMin: 20 * deg, AltitudeMax: 89.5 * deg, Slew: slew, Readout: 8, Filters: []int{0, 1}, FilterChange: 45, ExposureScale: 1,
		}
	}
	sv := &survey.Survey{
		Name: "Small Lanterns", FirstNight: first, LastNight: first + 2, Slot: 600, FinishBonus: 0.2,
		Filters: []visibility.Filter{
			{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
			{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 0.8},
		},
		Programs: []survey.Program{
			{Name: "wide", Weight: 1, ShareMax: 1, Demands: []survey.Demand{
				{Name: "g", Visits: 3, Exposures: []survey.Exposure{{Filter: 0, Duration: 60}}, GapMin: 2 * 3600, GapMax: 86400, PerNight: 2},
				{Name: "r", Visits: 2, Exposures: []survey.Exposure{{Filter: 1, Duration: 100}}, GapMax: math.Inf(1)},
			}},
			{Name: "pairs", Weight: 2, ShareMax: 1, Demands: []survey.Demand{
				{Name: "triple", Visits: 2, GapMin: 12 * 3600, GapMax: math.Inf(1), Exposures: []survey.Exposure{
					{Filter: 0, Duration: 45}, {Filter: 1, Duration: 45, After: 600, Tolerance: 120}, {Filter: 0, Duration: 45, After: 600, Tolerance: 120},
				}},
			}},
		},
		Sites: []survey.Site{
			{Name: "Lamp Hill", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140, Telescopes: []int{lamp}},
			{Name: "Salt Mesa", Latitude: -30.4 * deg, Longitude: -70.9 * deg, Elevation: 2600, Telescopes: []int{mesa, mesaTwo}},
		},
		Telescopes: []survey.Telescope{telescope("L1", 0), telescope("M1", 1), telescope("M2", 1)},
	}
	sv.Telescopes[lamp].Reserved = []survey.Reserved{{At: survey.AtOpening, Takes: 600}, {At: survey.AtClosing, Takes: 300}}
	sv.Telescopes[lamp].KeepFree = 0.05
	sv.Telescopes[mesa].Mount, sv.Telescopes[mesa].Flip = survey.Equatorial, &survey.Flip{Time: 60, PastMeridian: 1 * deg}
	sv.Telescopes[mesaTwo].AzimuthRange = &survey.AzimuthRange{From: -180 * deg, To: 180 * deg}
	sv.Telescopes[mesaTwo].ExposureScale = 1.2
	field := func(name string, ra, dec float64, program int) {
		f := survey.Field{Name: name, RA: ra * deg, Dec: dec * deg, Program: program, Weight: 1, NotBefore: math.Inf(-1), NotAfter: math.Inf(1), Tile: 1.2 * deg}
		for range sv.Programs[program].Demands {
			f.Rules = append(f.Rules, rules)
		}
		sv.Fields = append(sv.Fields, f)
	}
	field("F1", 100, 10, 0)
	field("F2", 130, -5, 0)
	field("F3", 150, 20, 0)
	field("F4", 120, -20, 0)
	field("S1", 160, 0, 1)
	field("S2", 140, -15, 1)
	return sv
}

// wish is a visit that the fixture's plan shall have: the first legal start
// from so many hours after local mean midnight.
type wish struct {
	field, demand, scope, night int
	hours                       float64
}

var wishes = []wish{
	{0, 0, lamp, 0, -3.5},
	{1, 1, lamp, 0, -2},
	{2, 0, lamp, 0, 0},
	{0, 1, lamp, 1, -3},
	{4, 0, lamp, 1, 0.5},
	{0, 0, mesa, 0, -3.5},
	{3, 0, mesa, 0, -2.1},
	{4, 0, mesa, 0, 2.5},
	{1, 0, mesa, 1, 0},
	{3, 1, mesaTwo, 0, -2},
	{0, 0, mesaTwo, 1, -1},
	{5, 0, mesaTwo, 1, 2.5},
	{2, 1, mesaTwo, 2, 0},
}

// makeFixture finds a legal plan by stepping time on the exact sky, with wide
// margins, and without the judge.
func makeFixture(t testing.TB) *fixture {
	t.Helper()
	f := &fixture{sv: smallSurvey()}
	e := f.exact()
	next := map[int]float64{}
	id, set := int64(100), int64(0)
	for _, w := range wishes {
		d := &f.sv.Programs[f.sv.Fields[w.field].Program].Demands[w.demand]
		site := f.sv.Telescopes[w.scope].Site
		midnight := (f.sv.FirstNight + survey.Day(w.night) + 1).Unix() - f.sv.Sites[site].Longitude/(2*math.Pi)*86400
		at := math.Max(math.Round(midnight+w.hours*3600), next[w.scope])
		for ; !f.clear(e, w, at, at+1500); at += 60 {
			if at > midnight+6*3600 {
				t.Fatalf("no legal start for %+v", w)
			}
		}
		if d.IsSet() {
			set++
		}
		for k, x := range d.Exposures {
			row := Visit{Visit: id, Field: f.sv.Fields[w.field].Name, Demand: d.Name, State: "planned", Night: int32(f.sv.FirstNight) + int32(w.night)}
			row.Program = f.sv.Programs[f.sv.Fields[w.field].Program].Name
			row.Filter, row.Telescope, row.Site = f.sv.Filters[x.Filter].Name, f.sv.Telescopes[w.scope].Name, f.sv.Sites[site].Name
			if d.IsSet() {
				row.Set = set
			}
			at += x.After
			if k == 2 {
				at += 60 // within the tolerance
			}
			row.Start = int64(at * 1e6)
			row.End = row.Start + int64(x.Duration*f.sv.Telescopes[w.scope].ExposureScale*1e6)
			f.visits = append(f.visits, row)
			next[w.scope] = float64(row.End)/1e6 + 300
			id++
		}
	}
	f.fill(t)
	return f
}

func (f *fixture) exact() *visibility.Exact {
	return visibility.NewExact(ephemeris.NewClock(f.sv.LeapSeconds, f.sv.Orientation))
}

func (f *fixture) site(i int) visibility.Site {
	s := &f.sv.Sites[i]
	return visibility.Site{Latitude: s.Latitude, Longitude: s.Longitude, Elevation: s.Elevation}
}

func (f *fixture) place(i int) visibility.Position {
	return visibility.Position{RA: f.sv.Fields[i].RA, Dec: f.sv.Fields[i].Dec}
}

// clear tells whether a field stands well from from to to.
func (f *fixture) clear(e *visibility.Exact, w wish, from, to float64) bool {
	s := f.site(f.sv.Telescopes[w.scope].Site)
	for at := from; at <= to; at += 100 {
		star, sun, moon := e.Star(s, f.place(w.field), at), e.Sun(s, at), e.Moon(s, at)
		switch {
		case star.Altitude < 30*deg || star.Altitude > 85*deg, math.Abs(star.HourAngle) > 4*15*deg,
			sun.Altitude > -19*deg, visibility.Separation(star, moon.Horizontal) < 15*deg:
			return false
		case w.scope == mesaTwo && math.Abs(star.Azimuth-math.Pi) < 2*deg:
			return false
		}
	}
	return true
}

// fill works out the numbers of all rows, with the plain formulas of the
// visibility room; slews by the judge's own code, which has a test of its own.
func (f *fixture) fill(t testing.TB) {
	t.Helper()
	e := f.exact()
	j := f.judge(t)
	total := 0.0
	for i := range f.sv.Fields {
		total += f.sv.WeightOf(&f.sv.Fields[i])
	}
	for i := range f.visits {
		v := &f.visits[i]
		field, scope, filter := j.fieldIDs[v.Field], j.telescopeIDs[v.Telescope], j.filterIDs[v.Filter]
		s := f.site(f.sv.Telescopes[scope].Site)
		mid := float64(v.Start)/1e6 + float64(v.End-v.Start)/2e6
		star, sun, moon := e.Star(s, f.place(field), mid), e.Sun(s, mid), e.Moon(s, mid)
		sep := visibility.Separation(star, moon.Horizontal)
		g := visibility.Geometry{SinAltitude: math.Sin(star.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude, MoonSeparation: sep, MoonPhaseAngle: moon.PhaseAngle}
		v.Exposure = float64(v.End-v.Start) / 1e6
		v.RA, v.Dec = f.sv.Fields[field].RA/deg, f.sv.Fields[field].Dec/deg
		v.Altitude, v.Azimuth, v.Airmass = star.Altitude/deg, star.Azimuth/deg, visibility.Airmass(g.SinAltitude)
		v.SunAltitude, v.MoonAltitude, v.MoonSeparation = sun.Altitude/deg, moon.Altitude/deg, sep/deg
		v.SkyMagnitude = visibility.SkyMagnitude(f.sv.Filters[filter], g)
		v.Quality = visibility.Quality(f.sv.Filters[filter], g)
		v.Credit = f.sv.WeightOf(&f.sv.Fields[field]) / total / (1 + f.sv.FinishBonus) / float64(f.sv.Wanted(&f.sv.Fields[field])) * v.Quality
		if f.sv.Fields[field].Program == 1 {
			v.Credit /= 3 // of a set
		}
	}
	f.uncount()
	f.gaps(j)
}

// uncount takes the credit from visits beyond what a demand wants.
func (f *fixture) uncount() {
	slices.SortFunc(f.visits, func(a, b Visit) int { return int(a.Start - b.Start) })
	seen := map[string]int{}
	for i := range f.visits {
		v := &f.visits[i]
		if key := v.Field + v.Demand; v.Program == "wide" {
			seen[key]++
			if d := f.sv.Programs[0].Demands[slices.IndexFunc(f.sv.Programs[0].Demands, func(d survey.Demand) bool { return d.Name == v.Demand })]; seen[key] > d.Visits {
				v.Credit = 0
			}
		}
	}
}

// gaps fills gap_before_s of rows sorted by start.
func (f *fixture) gaps(j *Judge) {
	last := map[string]*shot{}
	for i := range f.visits {
		v := &f.visits[i]
		s := &shot{Visit: v, from: float64(v.Start) / 1e6, to: float64(v.End) / 1e6}
		s.field, s.scope, s.filter = j.fieldIDs[v.Field], j.telescopeIDs[v.Telescope], j.filterIDs[v.Filter]
		s.site = f.sv.Telescopes[s.scope].Site
		j.test(s)
		v.GapBefore = 0
		if p := last[v.Telescope]; p != nil && s.from-p.to < 12*3600 {
			v.GapBefore = j.between(p, s)
		}
		last[v.Telescope] = s
	}
}

func (f *fixture) judge(t testing.TB) *Judge {
	t.Helper()
	j, err := NewJudge(t.Context(), f.sv, nil, f.losses, 2)
	if err != nil {
		t.Fatal(err)
	}
	return j
}

// check judges the fixture.
func (f *fixture) check(t testing.TB) *Report {
	t.Helper()
	r, err := f.judge(t).Check(t.Context(), Plan{Visits: f.visits, Done: f.done})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// at returns the row of a field, demand and telescope; the n-th by start.
func (f *fixture) at(field, demand string, scope, n int) *Visit {
	slices.SortFunc(f.visits, func(a, b Visit) int { return int(a.Start - b.Start) })
	for i := range f.visits {
		v := &f.visits[i]
		if v.Field == field && v.Demand == demand && v.Telescope == f.sv.Telescopes[scope].Name {
			if n == 0 {
				return v
			}
			n--
		}
	}
	panic("no such row")
}

// rules returns the rules of a row.
func (f *fixture) rules(v *Visit) *survey.Rules {
	i := slices.IndexFunc(f.sv.Fields, func(x survey.Field) bool { return x.Name == v.Field })
	d := slices.IndexFunc(f.sv.Programs[f.sv.Fields[i].Program].Demands, func(x survey.Demand) bool { return x.Name == v.Demand })
	return &f.sv.Fields[i].Rules[d]
}

// over returns the least and greatest of a quantity at the instants of a row
// that the judge promises to test at: every 30 s at most, with the ends.
func (f *fixture) over(v *Visit, of func(star visibility.Horizontal, sun visibility.Body, moon visibility.MoonBody) float64) (least, most float64) {
	e := f.exact()
	i := slices.IndexFunc(f.sv.Fields, func(x survey.Field) bool { return x.Name == v.Field })
	t := slices.IndexFunc(f.sv.Telescopes, func(x survey.Telescope) bool { return x.Name == v.Telescope })
	s := f.site(f.sv.Telescopes[t].Site)
	least, most = math.Inf(1), math.Inf(-1)
	for _, at := range []float64{float64(v.Start) / 1e6, float64(v.End) / 1e6} {
		x := of(e.Star(s, f.place(i), at), e.Sun(s, at), e.Moon(s, at))
		least, most = math.Min(least, x), math.Max(most, x)
	}
	return least, most
}
