package scheduler_test

import (
	"fmt"
	"math"
	"math/bits"
	"math/rand/v2"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/search"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// spare is what an opening is longer than an exposure, s: a search may keep a
// little room about its visits.
const spare = 4

// openings is a survey in which each night of each telescope is open for one
// exposure, every field wants one visit, and no cadence binds.
func openings(seed uint64) *survey.Survey {
	const deg = math.Pi / 180
	const length = 600
	r := rand.New(rand.NewPCG(seed, 1978))
	day, err := survey.ParseDay("2027-04-28")
	if err != nil {
		panic(err)
	}
	nights := 2 + r.IntN(4)
	sv := &survey.Survey{
		Name: "Openings", FirstNight: day, LastNight: day + survey.Day(nights-1), Slot: 600,
		Filters:  []visibility.Filter{{Name: "v", Band: visibility.BandV, Extinction: 0.3, DarkSky: 21.8, Moonlight: 1}},
		Programs: []survey.Program{{Name: "all", Weight: 1, ShareMax: 1, Demands: []survey.Demand{{Name: "d", Visits: 1, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Duration: length}}}}}},
	}
	lon := []float64{-70.9, 20.5}
	for i := range 1 + r.IntN(2) {
		s := survey.Site{Name: fmt.Sprint("Mesa ", i), Latitude: -30 * deg, Longitude: lon[i] * deg, Telescopes: []int{i}}
		for n := -1; n <= nights; n++ {
			midnight := (day + survey.Day(n)).Unix() + 86400 - lon[i]/360*86400
			open := math.Round(midnight + (6*r.Float64()-3)*3600)
			s.Closures = append(s.Closures, survey.Closure{From: midnight - 43200, To: open}, survey.Closure{From: open + length + spare, To: midnight + 43200})
		}
		sv.Sites = append(sv.Sites, s)
		sv.Telescopes = append(sv.Telescopes, survey.Telescope{
			Name: fmt.Sprint("T", i), Site: i, Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1}, AltitudeMax: 90 * deg,
			Slew: survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg}, Readout: 8, Filters: []int{0}, ExposureScale: 1,
		})
	}
	sidereal := visibility.NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{})).At(day.Unix() + 86400 + 70.9/360*86400).SiderealTime(-70.9 * deg)
	for i := range nights*len(sv.Sites) + r.IntN(8) {
		sv.Fields = append(sv.Fields, survey.Field{
			Name: fmt.Sprint("F", i), RA: math.Mod(sidereal+(100*r.Float64()-50)*deg+2*math.Pi, 2*math.Pi), Dec: (-70 + 80*r.Float64()) * deg,
			Weight: 0.2 + 2*r.Float64()*r.Float64(), NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
			Rules: []survey.Rules{{AltitudeMin: 20 * deg, AirmassMax: 2.9, SunAltitudeMax: -12 * deg, MoonIlluminationMax: 1, HourAngleMax: math.Pi}},
		})
	}
	return sv
}

// TestConstructionKeepsTheGreedyGuarantee: with an opening for one exposure a
// night, choosing an opening for each field is a monotone submodular problem
// over a partition matroid: the coverage of a set of (field, opening) is the sum
// over openings of the best field in it, each field has one opening. Taking the
// fields one after another, each where it adds the most, is the locally greedy
// heuristic, which reaches half the optimum at least, whatever the order
// (Fisher, Nemhauser and Wolsey, An analysis of approximations for maximizing
// submodular set functions II, Mathematical Programming Study 8, 1978, 73-87,
// section 4). The optimum is an assignment, found by trying all sets of
// openings.
func TestConstructionKeepsTheGreedyGuarantee(t *testing.T) {
	n := rounds(20, 300)
	least, sum := math.Inf(1), 0.0
	for seed := range uint64(n) {
		k := build(t, openings(seed), 2)
		p := k.Problem
		// The value of each field in each opening, to what a few seconds change.
		var value [][]float64
		for wi := range p.Wants {
			w := &p.Wants[wi]
			var row []float64
			for scope := range p.Scopes {
				for night := range p.Nights {
					open := p.Open(scope, night)
					if room := open[0].To - open[0].From - p.Length(&w.Steps[0], int32(scope)); len(open) != 1 || room < 0 || room > (spare+1)*1e6 {
						t.Fatalf("seed %d: telescope %d is open for %v in night %d; want one exposure", seed, scope, open, night)
					}
					v := 0.0
					for _, win := range p.Windows.Of(int(w.Unit), int(p.Scopes[scope].Class), night) {
						if from, to := p.Inward(win); from <= open[0].From && to >= open[0].To {
							v = w.Value * p.Quality(w, 0, int32(scope), (open[0].From+open[0].To)/2)
						}
					}
					row = append(row, v)
				}
			}
			value = append(value, row)
		}
		optimum := assignment(value)
		s := search.New(p, dual.NewPrices(p), make([]float64, len(p.Wants)), seed)
		s.Construct(t.Context(), 0, nil)
		got := legal(t, k, fmt.Sprint("seed ", seed), s.Plan().Exposures)
		if got > optimum*(1+1e-3) {
			t.Errorf("seed %d: the construction earns %.9f, over the optimum %.9f", seed, got, optimum)
		}
		if got < optimum/2*(1-1e-3) {
			t.Errorf("seed %d: the construction earns %.6f, under half the optimum %.6f", seed, got, optimum)
		}
		if optimum > 0 {
			least, sum = math.Min(least, got/optimum), sum+got/optimum
		}
	}
	t.Logf("construction / optimum: mean %.4f, least %.4f, over %d surveys", sum/float64(n), least, n)
}

// assignment is the most that rows, each in a column of its own, can earn.
func assignment(value [][]float64) float64 {
	columns := len(value[0])
	best := make([]float64, 1<<columns)
	for _, row := range value {
		for set := len(best) - 1; set >= 0; set-- {
			for left := uint(set); left != 0; left &= left - 1 {
				c := bits.TrailingZeros(left)
				best[set] = math.Max(best[set], best[set&^(1<<c)]+row[c])
			}
		}
	}
	return best[len(best)-1]
}
