package audit

import (
	"math"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

func altitude(star visibility.Horizontal, _ visibility.Body, _ visibility.MoonBody) float64 {
	return star.Altitude
}

func hourAngle(star visibility.Horizontal, _ visibility.Body, _ visibility.MoonBody) float64 {
	return math.Abs(star.HourAngle)
}

func sunAltitude(_ visibility.Horizontal, sun visibility.Body, _ visibility.MoonBody) float64 {
	return sun.Altitude
}

func separation(star visibility.Horizontal, _ visibility.Body, moon visibility.MoonBody) float64 {
	return visibility.Separation(star, moon.Horizontal)
}

func lit(_ visibility.Horizontal, _ visibility.Body, moon visibility.MoonBody) float64 {
	if moon.Altitude < 0 {
		panic("the fixture wants the Moon up here")
	}
	return moon.Illumination
}

const hair = 1e-7 // rad: 0.02", what the judge must see

// mutation breaks one thing of a legal plan. By a sign of +1 it is just
// outside a limit and the judge must say so; with -1 just inside, and legal.
type mutation struct {
	name, rule string
	both       bool // has an inside
	do         func(f *fixture, sign float64)
	visit      func(f *fixture) int64 // whom it must name; nil: not asked
}

func one(field, demand string, scope, n int) func(f *fixture) int64 {
	return func(f *fixture) int64 { return f.at(field, demand, scope, n).Visit }
}

var mutations = []mutation{
	{"altitude", RuleAltitude, true, func(f *fixture, sign float64) {
		v := f.at("F2", "r", lamp, 0)
		least, _ := f.over(v, altitude)
		f.rules(v).AltitudeMin = least + sign*hair
	}, one("F2", "r", lamp, 0)},
	{"airmass", RuleAirmass, true, func(f *fixture, sign float64) {
		v := f.at("F2", "r", lamp, 0)
		least, _ := f.over(v, altitude)
		f.rules(v).AirmassMax = visibility.Airmass(math.Sin(least + sign*hair))
	}, one("F2", "r", lamp, 0)},
	{"hour angle", RuleHourAngle, true, func(f *fixture, sign float64) {
		v := f.at("F3", "r", mesaTwo, 0)
		_, most := f.over(v, hourAngle)
		f.rules(v).HourAngleMax = most - sign*hair
	}, one("F3", "r", mesaTwo, 0)},
	{"sun", RuleSun, true, func(f *fixture, sign float64) {
		v := f.at("F2", "r", lamp, 0)
		_, most := f.over(v, sunAltitude)
		f.rules(v).SunAltitudeMax = most - sign*hair
	}, one("F2", "r", lamp, 0)},
	{"moon separation", RuleMoonSeparation, true, func(f *fixture, sign float64) {
		v := f.at("F4", "r", mesaTwo, 0)
		least, _ := f.over(v, separation)
		f.rules(v).MoonSeparationMin = least + sign*hair
	}, one("F4", "r", mesaTwo, 0)},
	{"moon illumination", RuleMoonIllumination, true, func(f *fixture, sign float64) {
		v := f.at("F4", "r", mesaTwo, 0)
		_, most := f.over(v, lit)
		f.rules(v).MoonIlluminationMax = most - sign*hair
	}, one("F4", "r", mesaTwo, 0)},
	{"moon rules while it is down", "", false, func(f *fixture, _ float64) {
		v := f.at("S2", "triple", mesaTwo, 0)
		f.rules(v).MoonIlluminationMax, f.rules(v).MoonSeparationMin = 0, math.Pi
		for i := range f.visits {
			if r := &f.visits[i]; r.Field == "S2" && r.MoonAltitude > 0 {
				panic("the fixture wants the Moon down here")
			}
		}
	}, nil},
	{"quality", RuleQuality, true, func(f *fixture, sign float64) {
		v := f.at("F4", "r", mesaTwo, 0)
		f.rules(v).MinQuality = v.Quality * (1 + sign*1e-6)
		if sign > 0 {
			v.Credit = math.NaN() // it earns nothing
		}
	}, one("F4", "r", mesaTwo, 0)},
	{"horizon", RuleHorizon, true, func(f *fixture, sign float64) {
		v := f.at("F2", "r", lamp, 0)
		e, s, p := f.exact(), f.site(0), f.place(1)
		star := e.Star(s, p, float64(v.Start)/1e6)
		az, alt := star.Azimuth, star.Altitude+sign*hair
		f.sv.Sites[0].Horizon = []survey.HorizonPoint{{Azimuth: az - 0.05, Altitude: 0}, {Azimuth: az, Altitude: alt}, {Azimuth: az + 1e-4, Altitude: 0}}
	}, one("F2", "r", lamp, 0)},
	{"mount's highest altitude", RuleMountAltitude, true, func(f *fixture, sign float64) {
		_, most := f.over(f.at("S1", "triple", lamp, 1), altitude)
		f.sv.Telescopes[lamp].AltitudeMax = math.Max(most, 0) - sign*hair
		for i := range f.visits { // the highest of the telescope's rows
			if v := &f.visits[i]; v.Telescope == "L1" {
				_, m := f.over(v, altitude)
				f.sv.Telescopes[lamp].AltitudeMax = math.Max(f.sv.Telescopes[lamp].AltitudeMax, m-sign*hair)
			}
		}
	}, nil},
	{"cut of the azimuth range", RuleAzimuthRange, false, func(f *fixture, _ float64) {
		v := f.at("F3", "r", mesaTwo, 0)
		f.sv.Telescopes[mesaTwo].AzimuthRange = &survey.AzimuthRange{From: v.Azimuth*deg - 2*math.Pi, To: v.Azimuth * deg}
	}, one("F3", "r", mesaTwo, 0)},
	{"end of the azimuth range", RuleAzimuthRange, true, func(f *fixture, sign float64) {
		v := f.at("F4", "r", mesaTwo, 0)
		e, s, p := f.exact(), f.site(1), f.place(3)
		a, b := e.Star(s, p, float64(v.Start)/1e6).Azimuth, e.Star(s, p, float64(v.End)/1e6).Azimuth
		// A gap of 0.02 rad beside the track's end, or just over it.
		lo := math.Min(a, b)
		if sign > 0 {
			lo += hair
		} else {
			lo -= hair
		}
		f.sv.Telescopes[mesaTwo].AzimuthRange = &survey.AzimuthRange{From: lo, To: lo - 0.02 + 2*math.Pi}
	}, one("F4", "r", mesaTwo, 0)},
	{"past the meridian", RuleFlip, true, func(f *fixture, sign float64) {
		v := f.at("F4", "g", mesa, 0)
		f.meridian(v, 40)
		_, most := f.over(v, hourAngle)
		f.sv.Telescopes[mesa].Flip.PastMeridian = most - sign*hair
	}, nil},
	{"lower meridian", RuleLowerMeridian, false, func(f *fixture, _ float64) {
		// The field of this row is put where it culminates below the pole.
		v := f.at("F4", "g", mesa, 0)
		f.sv.Fields[3].Dec = -75 * deg
		for range 8 { // precession turns with the right ascension
			star := f.exact().Star(f.site(1), f.place(3), float64(v.Start)/1e6+30)
			f.sv.Fields[3].RA += math.Remainder(star.HourAngle-math.Pi, 2*math.Pi)
		}
		f.visits = slices.DeleteFunc(f.visits, func(r Visit) bool { return r.Field == "F4" && r.Telescope == "M2" })
		for i := range f.sv.Fields[3].Rules {
			r := &f.sv.Fields[3].Rules[i]
			r.AltitudeMin, r.AirmassMax, r.HourAngleMax, r.MinQuality = 5*deg, 20, math.Pi, 0
		}
		f.sv.Telescopes[mesa].AltitudeMin, f.sv.Telescopes[mesa].Flip = 5*deg, nil
	}, nil},
	{"gap", RuleGap, true, func(f *fixture, sign float64) {
		a, b := f.at("S1", "triple", mesa, 0), f.at("S1", "triple", mesa, 1)
		is := float64(b.Start-a.End) / 1e6
		// The filter change comes on top of the readout.
		f.sv.Telescopes[mesa].Readout = is - f.sv.Telescopes[mesa].FilterChange + sign*1e-4
	}, one("S1", "triple", mesa, 1)},
	{"filter change during the slew", RuleGap, true, func(f *fixture, sign float64) {
		a, b := f.at("S1", "triple", mesa, 0), f.at("S1", "triple", mesa, 1)
		f.sv.Telescopes[mesa].DuringSlew = true
		f.sv.Telescopes[mesa].FilterChange = float64(b.Start-a.End)/1e6 + sign*1e-4
	}, one("S1", "triple", mesa, 1)},
	{"keep free", RuleKeepFree, true, func(f *fixture, sign float64) {
		used, open := f.used(lamp, 1)
		f.sv.Telescopes[lamp].KeepFree = 1 - (used-sign*0.01)/open
	}, nil},
	{"reserved", RuleReserved, true, func(f *fixture, sign float64) {
		v := f.at("F3", "g", lamp, 0)
		from := f.firstOpen(lamp, 0)
		f.sv.Telescopes[lamp].Reserved = append(f.sv.Telescopes[lamp].Reserved, survey.Reserved{At: survey.AtEvery, Every: float64(v.Start)/1e6 - from - 100, Takes: 100 + sign*0.01})
	}, one("F3", "g", lamp, 0)},
	{"opening block", RuleReserved, true, func(f *fixture, sign float64) {
		v := f.at("F1", "g", lamp, 0)
		f.sv.Telescopes[lamp].Reserved[0].Takes = float64(v.Start)/1e6 - f.firstOpen(lamp, 0) + sign*0.01
	}, one("F1", "g", lamp, 0)},
	{"site closed by instants", RuleClosed, true, func(f *fixture, sign float64) {
		v := f.at("F3", "g", lamp, 0)
		f.sv.Sites[0].Closures = []survey.Closure{{From: float64(v.End)/1e6 - sign*1e-3, To: float64(v.End)/1e6 + 30}}
	}, one("F3", "g", lamp, 0)},
	{"telescope closed by night", RuleClosed, false, func(f *fixture, _ float64) {
		d := f.sv.LastNight
		f.sv.Telescopes[mesaTwo].Closures = []survey.Closure{{ByNight: true, FirstNight: d, LastNight: d + 4}}
	}, one("F3", "r", mesaTwo, 0)},
	{"lost time", RuleLost, true, func(f *fixture, sign float64) {
		v := f.at("F2", "g", mesa, 0)
		from := float64(v.Start)/1e6 - 100
		f.losses = make([][]visibility.Interval, 3)
		f.losses[mesa] = []visibility.Interval{{From: from, To: from + 100 + sign*1e-3}}
	}, one("F2", "g", mesa, 0)},
	{"not before", RuleDates, true, func(f *fixture, sign float64) {
		f.sv.Fields[4].NotBefore = float64(f.at("S1", "triple", mesa, 0).Start)/1e6 + sign*1e-4
	}, one("S1", "triple", mesa, 0)},
	{"not after", RuleDates, true, func(f *fixture, sign float64) {
		f.sv.Fields[4].NotAfter = float64(f.at("S1", "triple", lamp, 2).End)/1e6 - sign*1e-4
	}, one("S1", "triple", lamp, 2)},
	{"filter", RuleFilter, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Filter = "r" }, one("F3", "g", lamp, 0)},
	{"length", RuleLength, false, func(f *fixture, _ float64) { f.at("F3", "r", mesaTwo, 0).End += 2 }, one("F3", "r", mesaTwo, 0)},
	{"exposure scale", RuleLength, false, func(f *fixture, _ float64) { f.at("F3", "r", mesaTwo, 0).End -= 20e6 }, one("F3", "r", mesaTwo, 0)},
	{"a microsecond of length", "", false, func(f *fixture, _ float64) { f.at("F3", "r", mesaTwo, 0).End++ }, nil},
	{"ends before it starts", RuleLength, false, func(f *fixture, _ float64) {
		v := f.at("F3", "r", mesaTwo, 0)
		v.End = v.Start - 1
	}, one("F3", "r", mesaTwo, 0)},
	{"field's telescopes", RuleTelescope, false, func(f *fixture, _ float64) { f.sv.Fields[2].Telescopes = []int{mesaTwo} }, one("F3", "g", lamp, 0)},
	{"program's telescopes", RuleTelescope, false, func(f *fixture, _ float64) {
		f.sv.Programs[0].Telescopes = []int{lamp, mesa}
		f.visits = slices.DeleteFunc(f.visits, func(r Visit) bool { return r.Telescope == "M2" && r.Field != "F3" && r.Field != "S2" })
	}, one("F3", "r", mesaTwo, 0)},
	{"tile", RuleTelescope, true, func(f *fixture, sign float64) {
		f.sv.Fields[2].Tile = 1.3 * deg
		f.sv.Telescopes[lamp].FieldOfView = survey.FieldOfView{Width: 3 * deg, Height: (1.3 - sign*1e-6) * deg}
	}, one("F3", "g", lamp, 0)},
	{"label", RuleNight, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Night++ }, one("F3", "g", lamp, 0)},
	{"period", RulePeriod, false, func(f *fixture, _ float64) { f.sv.LastNight-- }, one("F3", "r", mesaTwo, 0)},
	{"gap.min", RuleGapMin, true, func(f *fixture, sign float64) {
		a, b := f.at("F1", "g", lamp, 0), f.at("F1", "g", mesa, 0)
		f.sv.Programs[0].Demands[0].GapMin = math.Abs(float64(b.Start-a.Start))/1e6 + sign*1e-4
	}, nil},
	{"per night", RulePerNight, false, func(f *fixture, _ float64) { f.sv.Programs[0].Demands[0].PerNight = 1 }, nil},
	{"count", RuleCount, false, func(f *fixture, _ float64) { f.sv.Programs[0].Demands[0].Visits = 2 }, one("F1", "g", mesaTwo, 0)},
	{"set without one", RuleSet, false, func(f *fixture, _ float64) {
		v := f.at("S1", "triple", mesa, 1)
		f.visits = slices.DeleteFunc(f.visits, func(r Visit) bool { return r.Visit == v.Visit })
		f.uncounted("S1", v.Set)
	}, nil},
	{"set that isn't one", RuleSet, false, func(f *fixture, _ float64) {
		f.at("F3", "g", lamp, 0).Set = 77
		f.uncounted("F3", 77)
	}, one("F3", "g", lamp, 0)},
	{"set of two telescopes", RuleSet, false, func(f *fixture, _ float64) {
		v := f.at("S1", "triple", mesa, 2)
		v.Telescope = "M2"
		v.End = v.Start + 54e6
	}, nil},
	{"order of a set", RuleFilter, false, func(f *fixture, _ float64) { f.at("S1", "triple", mesa, 1).Filter = "g" }, one("S1", "triple", mesa, 1)},
	{"time in a set", RuleAfter, true, func(f *fixture, sign float64) {
		f.sv.Programs[1].Demands[0].Exposures[2].Tolerance = 60 - sign*1e-4
		f.visits = slices.DeleteFunc(f.visits, func(r Visit) bool { return r.Program == "pairs" && r.Telescope != "M1" })
	}, one("S1", "triple", mesa, 2)},
	{"overlapping sets", RuleOverlap, false, func(f *fixture, _ float64) {
		f.sv.Programs[1].Demands[0].GapMin = 0
		by := f.at("S1", "triple", mesa, 0).Start - f.at("S1", "triple", lamp, 0).Start + 600e6
		for range 3 {
			v := f.at("S1", "triple", lamp, 0) // the moved ones come last
			v.Start, v.End = v.Start+by, v.End+by+9e6
			v.Telescope, v.Site, v.Night = "M2", "Salt Mesa", int32(f.sv.FirstNight)
		}
	}, nil},
	{"id twice", RuleVisitID, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Visit = f.at("F1", "g", lamp, 0).Visit }, nil},
	{"state", RuleState, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).State = "dreamt" }, nil},
	{"done by nobody", RuleState, false, func(f *fixture, _ float64) {
		v := f.at("F3", "g", lamp, 0)
		v.State, v.Quality, v.Credit = "done", 0, 0
	}, nil},
	{"unknown field", RuleName, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Field = "F33" }, nil},
	{"unknown demand", RuleName, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Demand = "z" }, nil},
	{"unknown filter", RuleName, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Filter = "z" }, nil},
	{"another program", RuleName, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Program = "pairs" }, nil},
	{"another site", RuleName, false, func(f *fixture, _ float64) { f.at("F3", "g", lamp, 0).Site = "Salt Mesa" }, nil},
}

// meridian moves a row so that it passes the meridian some seconds before its end.
func (f *fixture) meridian(v *Visit, before float64) {
	i := slices.IndexFunc(f.sv.Fields, func(x survey.Field) bool { return x.Name == v.Field })
	star := f.exact().Star(f.site(1), f.place(i), float64(v.End)/1e6-before)
	by := int64(star.HourAngle / (2 * math.Pi) * 86164.1e6)
	v.Start, v.End = v.Start-by, v.End-by
}

// uncounted takes the credit of what a broken set was to earn.
func (f *fixture) uncounted(field string, set int64) {
	for i := range f.visits {
		if v := &f.visits[i]; v.Field == field && v.Set == set {
			v.Credit = math.NaN() // the test below takes NaN for: nothing
		}
	}
}

// firstOpen is the first instant of a telescope's night with the Sun at -15 deg,
// by the almanac's own root.
func (f *fixture) firstOpen(scope, night int) float64 {
	e, s := f.exact(), f.site(f.sv.Telescopes[scope].Site)
	return e.SunBelow(s, e.Night(s, int32(f.sv.FirstNight)+int32(night)), -15*deg)[0].From
}

// used is what the rows of a telescope's night take with their gaps, and the
// night's open time: the Sun below -15 deg less the two reserved blocks.
func (f *fixture) used(scope, night int) (used, open float64) {
	e, s := f.exact(), f.site(f.sv.Telescopes[scope].Site)
	for _, x := range e.SunBelow(s, e.Night(s, int32(f.sv.FirstNight)+int32(night)), -15*deg) {
		open += x.To - x.From
	}
	for _, r := range f.sv.Telescopes[scope].Reserved {
		open -= r.Takes
	}
	for _, v := range f.visits {
		if v.Telescope == f.sv.Telescopes[scope].Name && v.Night == int32(f.sv.FirstNight)+int32(night) {
			used += v.Exposure + v.GapBefore
		}
	}
	return used, open
}

func TestLegalPlanPasses(t *testing.T) {
	f := makeFixture(t)
	r := f.check(t)
	for _, b := range r.Breaches {
		t.Errorf("%+v", b)
	}
	if r.Exposures != len(f.visits) || r.Visits != len(wishes) || r.Instants < int64(3*r.Exposures) {
		t.Errorf("judged %d exposures, %d visits, at %d instants", r.Exposures, r.Visits, r.Instants)
	}
}

// TestEachBreachIsSeen breaks one thing at a time, by a hair, and wants that
// one breach and no other; on the other side of the hair it wants none.
func TestEachBreachIsSeen(t *testing.T) {
	for _, m := range mutations {
		signs := []float64{1}
		if m.both {
			signs = append(signs, -1)
		}
		for _, sign := range signs {
			f := makeFixture(t)
			m.do(f, sign)
			marked := map[int64]bool{}
			for i := range f.visits {
				marked[f.visits[i].Visit] = math.IsNaN(f.visits[i].Credit)
			}
			if f.resolves() {
				f.fill(t)
			}
			for i := range f.visits {
				if v := &f.visits[i]; marked[v.Visit] || v.State == "done" {
					v.Credit = 0
					if v.State == "done" {
						v.Quality = 0
					}
				}
			}
			var want []string
			if sign > 0 && m.rule != "" {
				want = []string{m.rule}
			}
			r := f.check(t)
			var got []string
			for _, b := range r.Breaches {
				got = append(got, b.Rule)
			}
			if !slices.Equal(got, want) {
				t.Errorf("%s (%+.0f): got %v, want %v", m.name, sign, got, want)
				for _, b := range r.Breaches {
					t.Logf("  %+v", b)
				}
				continue
			}
			if sign > 0 && m.visit != nil && r.Breaches[0].Visit != m.visit(f) {
				t.Errorf("%s: it names visit %d, want %d", m.name, r.Breaches[0].Visit, m.visit(f))
			}
		}
	}
}

// resolves tells whether every row's names are the survey's and its length is one.
func (f *fixture) resolves() bool {
	for i := range f.visits {
		v := &f.visits[i]
		p := slices.IndexFunc(f.sv.Programs, func(p survey.Program) bool { return p.Name == v.Program })
		ok := p >= 0 && slices.ContainsFunc(f.sv.Fields, func(x survey.Field) bool { return x.Name == v.Field && x.Program == p }) &&
			slices.ContainsFunc(f.sv.Filters, func(x visibility.Filter) bool { return x.Name == v.Filter }) &&
			slices.ContainsFunc(f.sv.Programs[p].Demands, func(d survey.Demand) bool { return d.Name == v.Demand })
		if !ok || v.End <= v.Start {
			return false
		}
	}
	return true
}
