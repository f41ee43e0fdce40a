package starter

import (
	"fmt"
	"math"
	"math/rand/v2"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// family is a kind of survey that differs from seed to seed.
type family struct {
	name     string
	sites    int
	nights   int
	fields   int
	shortest float64 // exposure, s
	longest  float64
	demand   float64 // time wanted as a multiple of the open time
	programs int
	gapMin   float64 // s, the least gap of the demand that is asked for most often
	set      bool    // the last program asks for a set of two filters
	polar    bool    // the sites lie on the ice about the south pole, in June
	twist    func(sv *survey.Survey)
}

var families = []family{
	{name: "medium", sites: 4, nights: 60, fields: 1000, shortest: 150, longest: 500, demand: 1.05, programs: 4, gapMin: 20 * 3600, set: true},
	{name: "small", sites: 2, nights: 14, fields: 150, shortest: 900, longest: 2400, demand: 1.05, programs: 3, gapMin: 20 * 3600},
	{name: "tiny", sites: 2, nights: 3, fields: 25, shortest: 4000, longest: 8000, demand: 1.3, programs: 5, gapMin: 4 * 3600},
	{name: "tiny80", sites: 2, nights: 3, fields: 80, shortest: 4000, longest: 8000, demand: 3.8, programs: 5, gapMin: 4 * 3600},
	{name: "short", sites: 2, nights: 8, fields: 500, shortest: 30, longest: 60, demand: 1.05, programs: 3, gapMin: 20 * 3600},
	{name: "long", sites: 2, nights: 20, fields: 80, shortest: 3000, longest: 6000, demand: 1.1, programs: 4, gapMin: 20 * 3600},
	{name: "cadence", sites: 3, nights: 30, fields: 400, shortest: 200, longest: 500, demand: 1.05, programs: 3, gapMin: 5 * 86400, twist: strict},
	{name: "sets", sites: 2, nights: 14, fields: 250, shortest: 120, longest: 300, demand: 1.05, programs: 3, gapMin: 20 * 3600, twist: allSets},
	{name: "filters", sites: 2, nights: 14, fields: 250, shortest: 200, longest: 400, demand: 1.05, programs: 4, gapMin: 20 * 3600, twist: slowChanges},
	{name: "shares", sites: 2, nights: 14, fields: 250, shortest: 200, longest: 500, demand: 1.2, programs: 4, gapMin: 20 * 3600, twist: tightShares},
	{name: "polar", sites: 1, nights: 8, fields: 250, shortest: 200, longest: 500, demand: 1.05, programs: 3, gapMin: 12 * 3600, polar: true},
	{name: "one-site", sites: 1, nights: 30, fields: 250, shortest: 200, longest: 500, demand: 1.05, programs: 3, gapMin: 20 * 3600},
	{name: "eight-sites", sites: 8, nights: 8, fields: 600, shortest: 200, longest: 500, demand: 1.05, programs: 4, gapMin: 20 * 3600},
}

// strict asks for one visit a night at most, and for none to be late.
func strict(sv *survey.Survey) {
	for p := range sv.Programs {
		for d := range sv.Programs[p].Demands {
			x := &sv.Programs[p].Demands[d]
			x.PerNight, x.GapMax = 1, 2*x.GapMin
		}
	}
}

// allSets makes every demand ask for a pair half an hour apart, half as often.
func allSets(sv *survey.Survey) {
	for p := range sv.Programs {
		for d := range sv.Programs[p].Demands {
			x := &sv.Programs[p].Demands[d]
			again := x.Exposures[0]
			again.After, again.Tolerance = 1800, 300
			x.Exposures = append(x.Exposures, again)
			x.Visits = (x.Visits + 1) / 2
		}
	}
}

// slowChanges makes a change of filter as long as an exposure.
func slowChanges(sv *survey.Survey) {
	for t := range sv.Telescopes {
		sv.Telescopes[t].FilterChange = 300
	}
}

// tightShares holds one program up and another down, against their weights.
func tightShares(sv *survey.Survey) {
	light, heavy := 0, 0
	for p := range sv.Programs {
		if sv.Programs[p].Weight < sv.Programs[light].Weight {
			light = p
		}
		if sv.Programs[p].Weight >= sv.Programs[heavy].Weight {
			heavy = p
		}
	}
	sv.Programs[light].ShareMin, sv.Programs[heavy].ShareMax = 0.3, 0.2
}

// FamilyNames lists the families of surveys.
func FamilyNames() []string {
	var names []string
	for _, f := range families {
		names = append(names, f.name)
	}
	return names
}

// Family makes one survey of a family, always the same for a seed. medium is
// 4 sites x 60 nights x 1,000 fields with exposures of 150-500 s; small 2 x
// 14 x 150 with 900-2,400 s; tiny 2 x 3 x 25 with 4,000-8,000 s, small enough
// for an exact solver; the others are each hard in one way, as their names say.
// The time wanted is a little over the open time. It is
// nil when the name is not known.
func Family(name string, seed uint64) *survey.Survey {
	for i := range families {
		if families[i].name == name {
			return families[i].make(seed)
		}
	}
	return nil
}

// familyFirstNight is the first night of the families, 2027-03-01;
// polarFirstNight, 2027-07-01 before a new Moon, that of those in the polar night.
const (
	familyFirstNight survey.Day = 20878
	polarFirstNight  survey.Day = 21000
)

func (f *family) make(seed uint64) *survey.Survey {
	r := rand.New(rand.NewPCG(seed, 20270301))
	first := familyFirstNight
	if f.polar {
		first = polarFirstNight
	}
	sv := &survey.Survey{
		Name:       fmt.Sprintf("%s %d", f.name, seed),
		FirstNight: first,
		LastNight:  first + survey.Day(f.nights) - 1,
		Slot:       600,
		Seed:       seed,
		Filters: []visibility.Filter{
			{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
			{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 0.8},
		},
	}
	open := f.addSites(sv, r)
	f.addPrograms(sv, r)
	f.addFields(sv, r)
	f.addVisits(sv, r, open*f.demand)
	if f.twist != nil {
		f.twist(sv)
	}
	return sv
}

// addSites spreads the sites over longitude, in both hemispheres by turns,
// and returns their open time, s.
func (f *family) addSites(sv *survey.Survey, r *rand.Rand) float64 {
	var places []plainSite
	start := 360 * r.Float64()
	for i := range f.sites {
		p := plainSite{latitude: 22 + 13*r.Float64(), longitude: start + 360/float64(f.sites)*(float64(i)+0.6*r.Float64()-0.3)}
		if i%2 == 1 {
			p.latitude = -p.latitude
		}
		if f.polar {
			p.latitude = -84 - 4*r.Float64()
		}
		p.longitude = math.Mod(p.longitude+540, 360) - 180
		places = append(places, p)
		sv.Sites = append(sv.Sites, survey.Site{
			Name:       fmt.Sprintf("Site %c", 'A'+i),
			Latitude:   p.latitude * degree,
			Longitude:  p.longitude * degree,
			Elevation:  math.Round(500 + 3000*r.Float64()),
			TimeZone:   "UTC",
			Cost:       1,
			Telescopes: []int{i},
		})
		sv.Telescopes = append(sv.Telescopes, survey.Telescope{
			Name:          fmt.Sprintf("%c1", 'A'+i),
			Site:          i,
			Mount:         survey.Altazimuth,
			FieldOfView:   survey.FieldOfView{Diameter: 1.6 * degree},
			AltitudeMin:   20 * degree,
			AltitudeMax:   87 * degree,
			Slew:          survey.Slew{Rate: 3 * degree, Acceleration: 1.5 * degree, Settle: 3},
			Readout:       8,
			Filters:       []int{0, 1},
			FilterChange:  45,
			ExposureScale: 1,
			Reserved:      []survey.Reserved{{At: survey.AtOpening, Takes: 900, Why: "standards"}, {At: survey.AtEvery, Every: 7200, Takes: 180, Why: "focus"}},
		})
	}
	return supply(places, int(sv.FirstNight)-epochDay, f.nights, -15)
}

// addPrograms draws what is asked for; the numbers of visits come last.
func (f *family) addPrograms(sv *survey.Survey, r *rand.Rand) {
	length := func() float64 {
		return math.Round((f.shortest+(f.longest-f.shortest)*r.Float64())/10) * 10
	}
	for i := range f.programs {
		p := survey.Program{Name: fmt.Sprintf("program %d", i+1), Weight: float64(int(1) << r.IntN(3)), ShareMax: 1}
		if f.set && i == f.programs-1 {
			p.Demands = []survey.Demand{{
				Name:   "g+r",
				GapMin: f.gapMin,
				GapMax: math.Inf(1),
				Exposures: []survey.Exposure{
					{Filter: 0, Duration: f.shortest},
					{Filter: 1, Duration: f.shortest, After: f.shortest + 900, Tolerance: 300},
				},
			}}
		} else {
			first := r.IntN(2)
			for k := range 1 + i%2 {
				filter := (first + k) % 2
				p.Demands = append(p.Demands, survey.Demand{
					Name:      sv.Filters[filter].Name,
					GapMin:    f.gapMin * float64(1+k),
					GapMax:    math.Inf(1),
					Exposures: []survey.Exposure{{Filter: filter, Duration: length()}},
				})
			}
		}
		sv.Programs = append(sv.Programs, p)
	}
}

// addFields scatters the fields over what the night side of the sky shows in
// the middle of the period.
func (f *family) addFields(sv *survey.Survey, r *rand.Rand) {
	rules := survey.Rules{
		AltitudeMin:         30 * degree,
		AirmassMax:          2,
		SunAltitudeMax:      -15 * degree,
		MoonSeparationMin:   25 * degree,
		MoonIlluminationMax: 1,
		HourAngleMax:        75 * degree,
		MinQuality:          0.1,
	}
	if f.polar {
		rules.HourAngleMax = math.Pi
	}
	byProgram := make([][]survey.Rules, len(sv.Programs))
	for p := range byProgram {
		for range sv.Programs[p].Demands {
			byProgram[p] = append(byProgram[p], rules)
		}
	}
	// The Sun moves through 24 h of right ascension in a year, from 0 h at
	// the March equinox; the night faces the other side.
	middle := 180 + 360*(float64(f.nights)/2-20)/365.25
	for i := range f.fields {
		at := scattered(r, patch{-60, 55, middle - 105, middle + 105})
		if f.polar { // what is up there is up all day
			at = scattered(r, patch{-80, -35, 0, 360})
		}
		p := i % len(sv.Programs)
		sv.Fields = append(sv.Fields, survey.Field{
			Name:      fmt.Sprintf("F%04d", i+1),
			RA:        math.Mod(at.ra+360, 360) * degree,
			Dec:       at.dec * degree,
			Program:   p,
			Weight:    float64(tier(r)),
			NotBefore: math.Inf(-1),
			NotAfter:  math.Inf(1),
			Rules:     byProgram[p],
		})
	}
}

// addVisits gives each demand a visit, and then one more to demands drawn by
// lot, until the time wanted (s) is reached as closely as whole visits allow.
func (f *family) addVisits(sv *survey.Survey, r *rand.Rand, wanted float64) {
	const overhead = 12 // s an exposure, readout and a short slew
	fields := make([]int, len(sv.Programs))
	for i := range sv.Fields {
		fields[sv.Fields[i].Program]++
	}
	type choice struct {
		demand *survey.Demand
		cost   float64 // s of one more visit of each field
	}
	var choices []choice
	var sum float64
	for p := range sv.Programs {
		for d := range sv.Programs[p].Demands {
			c := choice{demand: &sv.Programs[p].Demands[d]}
			for _, e := range c.demand.Exposures {
				c.cost += float64(fields[p]) * (e.Duration + overhead)
			}
			c.demand.Visits = 1
			sum += c.cost
			choices = append(choices, c)
		}
	}
	for len(choices) > 0 {
		i := r.IntN(len(choices))
		c := choices[i]
		if sum+c.cost/2 > wanted {
			choices = append(choices[:i], choices[i+1:]...)
			continue
		}
		c.demand.Visits++
		sum += c.cost
	}
}
