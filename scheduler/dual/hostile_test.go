package dual_test

import (
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const deg = math.Pi / 180

// hostile is a survey made to measure, with a legal plan that sits on its
// edges.
type hostile struct {
	sv   *survey.Survey
	plan []model.Exposure
}

// midnight is in the middle of the only night of a hostile survey's first
// site: 2027-02-14, the Moon near first quarter.
func newHostile() (h *hostile, midnight float64) {
	day, err := survey.ParseDay("2027-02-14")
	if err != nil {
		panic(err)
	}
	h = &hostile{sv: &survey.Survey{
		Name: "Hostile", FirstNight: day, LastNight: day, Slot: 600,
		Filters:  []visibility.Filter{{Name: "v", Band: visibility.BandV, Extinction: 0.15, DarkSky: 21.8, Moonlight: 1}},
		Programs: []survey.Program{{Name: "all", Weight: 1, ShareMax: 1}},
	}}
	h.site("Salt Mesa", -30.4, -70.9)
	return h, math.Floor(day.Unix() + 86400 + 70.9/360*86400)
}

func (h *hostile) site(name string, lat, lon float64) {
	i := len(h.sv.Sites)
	h.sv.Sites = append(h.sv.Sites, survey.Site{Name: name, Latitude: lat * deg, Longitude: lon * deg, Telescopes: []int{i}})
	h.sv.Telescopes = append(h.sv.Telescopes, survey.Telescope{
		Name: "T" + name, Site: i, Mount: survey.Equatorial, FieldOfView: survey.FieldOfView{Diameter: 1},
		AltitudeMax: 90 * deg, Slew: survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg}, Readout: 8, Filters: []int{0}, ExposureScale: 1,
	})
}

// open leaves a site open from one instant to another alone.
func (h *hostile) open(site int, from, to float64) {
	s := &h.sv.Sites[site]
	s.Closures = append(s.Closures, survey.Closure{From: from - 2*86400, To: from}, survey.Closure{From: to, To: to + 2*86400})
}

// demand adds a demand of exposures, each so long and so long after the one
// before.
func (h *hostile) demand(visits int, gap float64, length float64, after ...float64) {
	d := survey.Demand{Name: "d", Visits: visits, GapMin: gap, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Duration: length}}}
	for _, a := range after {
		d.Exposures = append(d.Exposures, survey.Exposure{Duration: length, After: a, Tolerance: 60})
	}
	h.sv.Programs[0].Demands = append(h.sv.Programs[0].Demands, d)
}

// field adds a field that stands so far off the zenith of a site, along
// declination, at an instant.
func (h *hostile) field(site int, at, off float64) {
	s := &h.sv.Sites[site]
	now := visibility.NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{})).At(at)
	f := survey.Field{
		Name: fmt.Sprint("F", len(h.sv.Fields)), RA: now.SiderealTime(s.Longitude), Dec: s.Latitude + off*deg, Weight: 1,
		NotBefore: math.Inf(-1), NotAfter: math.Inf(1),
	}
	for range h.sv.Programs[0].Demands {
		f.Rules = append(f.Rules, survey.Rules{AltitudeMin: 20 * deg, AirmassMax: 10, SunAltitudeMax: -12 * deg, MoonIlluminationMax: 1, HourAngleMax: math.Pi})
	}
	h.sv.Fields = append(h.sv.Fields, f)
}

// put adds an exposure to the plan, Unix microseconds.
func (h *hostile) put(scope, field, night, step int, set, start int64) {
	t := &h.sv.Telescopes[scope]
	x := &h.sv.Programs[0].Demands[0].Exposures[step]
	h.plan = append(h.plan, model.Exposure{
		Visit: int64(len(h.plan) + 1), Set: set, Field: int32(field), Step: int32(step), Telescope: int32(scope), Night: int32(night),
		State: model.Planned, Start: start, End: start + model.MicroOf(x.Duration*t.ExposureScale),
	})
}

func us(unix float64) int64 { return model.MicroOf(unix) }

// hostiles are the cases by name.
func hostiles(t *testing.T) map[string]*hostile {
	out := map[string]*hostile{}
	for _, edge := range []float64{0, 0.000001, 137.25} {
		// One visit fills a night's open time to the microsecond.
		h, m := newHostile()
		m = math.Floor(m/600)*600 + edge
		h.open(0, m, m+600)
		h.demand(1, 0, 600)
		h.field(0, m, 10)
		h.put(0, 0, 0, 0, 0, us(m))
		out[fmt.Sprint("filled ", edge)] = h
		// Several do, with the least gap between them, on one field.
		h, _ = newHostile()
		h.open(0, m, m+4*300+3*8)
		h.demand(4, 0, 300)
		h.field(0, m, 10)
		for k := range 4 {
			h.put(0, 0, 0, 0, 0, us(m+float64(k)*308))
		}
		out[fmt.Sprint("packed ", edge)] = h
		// A set's last exposure ends at closing time.
		h, _ = newHostile()
		h.open(0, m, m+900)
		h.demand(1, 0, 200, 400, 300)
		h.field(0, m, 10)
		for k, at := range []float64{0, 400, 700} {
			h.put(0, 0, 0, k, 1, us(m+at))
		}
		out[fmt.Sprint("set ", edge)] = h
	}
	// keep_free's budget used up.
	h, m := newHostile()
	h.open(0, m, m+1000)
	h.sv.Telescopes[0].KeepFree = 0.4
	h.demand(2, 0, 296)
	h.field(0, m, 10)
	h.put(0, 0, 0, 0, 0, us(m))
	h.put(0, 0, 0, 0, 0, us(m+304))
	out["keep free"] = h
	// Two sites, a second and a microsecond over the gap.
	for _, over := range []float64{0, 0.000001, 1} {
		h, m = newHostile()
		h.site("Dune", -29, -71)
		h.demand(2, 599.9995, 60)
		h.field(0, m, 10)
		h.put(0, 0, 0, 0, 0, us(m-500))
		h.put(1, 0, 0, 0, 0, us(m-500+599.9995+over))
		out[fmt.Sprint("gap ", over)] = h
	}
	// A gap that isn't a whole millisecond, both visits in one start bin, and
	// no room for another.
	h, m = newHostile()
	m = math.Floor(m/600) * 600
	h.open(0, m, m+599.9995+60)
	h.demand(2, 599.9995, 60)
	h.field(0, m, 10)
	h.put(0, 0, 0, 0, 0, us(m))
	h.put(0, 0, 0, 0, 0, us(m+599.9995))
	out["fine gap"] = h
	out["labels"] = labels()
	out["moonset"] = moonset(t)
	for _, off := range []float64{0, 77, 149} {
		out[fmt.Sprint("peak ", off)] = peak(off)
	}
	for name, limit := range map[string]func(r *survey.Rules){
		"altitude":   func(r *survey.Rules) { r.AltitudeMin = 61.3 * deg },
		"airmass":    func(r *survey.Rules) { r.AirmassMax = 1.13 },
		"hour angle": func(r *survey.Rules) { r.HourAngleMax = 21.7 * deg },
	} {
		out["last second by "+name] = lastSecond(t, limit)
	}
	return out
}

// peak has a field at its highest in the middle of the only exposure that fits,
// inside a cell of the sky's tables: quality sampled at cell edges misses it.
func peak(off float64) *hostile {
	h, m := newHostile()
	m = math.Floor(m/300)*300 + off
	h.open(0, m-900, m+900)
	h.demand(1, 0, 1800)
	h.field(0, m, 35)
	h.put(0, 0, 0, 0, 0, us(m-900))
	return h
}

// lastSecond has an exposure that ends with the last microsecond in which a
// rule allows its field, by the judge, and begins with the first of its open time.
func lastSecond(t *testing.T, limit func(r *survey.Rules)) *hostile {
	t.Helper()
	h, m := newHostile()
	h.demand(1, 0, 400)
	h.field(0, m, 10)
	limit(&h.sv.Fields[0].Rules[0])
	k, err := trial.Build(t.Context(), h.sv, 1)
	if err != nil {
		t.Fatal(err)
	}
	lo, hi := us(m), us(m+6*3600)
	for hi-lo > 1 {
		h.plan = nil
		h.put(0, 0, 0, 0, 0, (lo+hi)/2)
		rep, err := k.Check(t.Context(), h.plan)
		if err != nil {
			t.Fatal(err)
		}
		if rep.Legal() {
			lo = (lo + hi) / 2
		} else {
			hi = (lo + hi) / 2
		}
	}
	h.plan = nil
	h.put(0, 0, 0, 0, 0, lo)
	start := float64(lo) * 1e-6
	h.open(0, start, start+4000)
	return h
}

// labels has two places on either side of the date line whose labels are a
// day apart: two visits within a minute with per_night 1.
func labels() *hostile {
	h, _ := newHostile()
	h.sv.Sites, h.sv.Telescopes = nil, nil
	h.site("East Atoll", -10, 180)
	h.site("West Atoll", -10, -180)
	h.sv.LastNight++
	h.demand(2, 0, 60)
	h.sv.Programs[0].Demands[0].PerNight = 1
	// Local midnight of label 1 in the east: noon UTC of that day is local
	// midnight there, and belongs to label 0 in the west.
	m := h.sv.LastNight.Unix() + 43200
	h.field(0, m, 10)
	h.put(0, 0, 1, 0, 0, us(m))
	h.put(1, 0, 0, 0, 0, us(m+60))
	return h
}

// moonset has a long visit whose middle is just after moonset, in open time
// that holds nothing else.
func moonset(t *testing.T) *hostile {
	h, m := newHostile()
	e := visibility.NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{}))
	place := visibility.Site{Latitude: h.sv.Sites[0].Latitude, Longitude: h.sv.Sites[0].Longitude}
	set := 0.0
	for at := m - 4*3600; at < m+4*3600 && set == 0; at += 60 {
		if e.Moon(place, at).Altitude > 0 && e.Moon(place, at+60).Altitude <= 0 {
			lo, hi := at, at+60
			for hi-lo > 1e-5 {
				if mid := (lo + hi) / 2; e.Moon(place, mid).Altitude > 0 {
					lo = mid
				} else {
					hi = mid
				}
			}
			set = hi
		}
	}
	if set == 0 {
		t.Fatal("no moonset in the night")
	}
	start := math.Ceil(set*1e3)/1e3 - 900
	h.open(0, start, start+1800)
	h.demand(1, 0, 1800)
	h.field(0, set, 10)
	h.put(0, 0, 0, 0, 0, us(start))
	return h
}

// TestHostilePlansStayUnderTheCeiling holds plans that use everything up
// against the ceiling at prices of all kinds.
func TestHostilePlansStayUnderTheCeiling(t *testing.T) {
	all := hostiles(t)
	for _, name := range slices.Sorted(maps.Keys(all)) {
		h := all[name]
		t.Run(name, func(t *testing.T) {
			k, err := trial.Build(t.Context(), h.sv, 2)
			if err != nil {
				t.Fatal(err)
			}
			rep, err := k.Check(t.Context(), h.plan)
			if err != nil {
				t.Fatal(err)
			}
			for _, b := range rep.Breaches {
				t.Errorf("the plan isn't legal: %s: %s", b.Rule, b.What)
			}
			c := rep.Score.Coverage
			if c <= 0 {
				t.Fatal("the plan earns nothing")
			}
			least := underCeilings(t, k, c, rand.New(rand.NewPCG(3, 3)), 60)
			t.Logf("coverage %.9f, least ceiling %.9f", c, least)
		})
	}
}

// underCeilings holds a coverage against ceilings at random prices, and at
// those of a search; it returns the least.
func underCeilings(t *testing.T, k *trial.Kit, coverage float64, r *rand.Rand, n int) float64 {
	t.Helper()
	least := math.Inf(1)
	scale := typicalRate(k.Problem)
	for i := range n {
		a := dual.NewAscent(k.Problem)
		how := "random prices"
		if i%3 == 0 {
			how = "searched prices"
			lv := dual.Level{Memory: 0.6, Steps: 5 + r.IntN(60), Eta: 0.5, EtaLast: 0.02}
			a.Run(t.Context(), lv, nil)
		} else {
			randomRates(a, r, scale)
			a.SetMu(func(i int) float64 { return k.Problem.Wants[i].Value * r.Float64() * float64(r.IntN(2)) })
		}
		width := []float64{60, 150, 300, 600, 731}[r.IntN(5)]
		b := a.Ceiling(width)
		least = math.Min(least, b)
		if coverage > b {
			t.Errorf("%s, bins of %g s: coverage %.12g is over the ceiling %.12g by %.3g", how, width, coverage, b, coverage-b)
		}
	}
	return least
}
