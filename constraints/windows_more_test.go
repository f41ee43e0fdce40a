package constraints

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// A star comes back after 23 h 56 m 04 s (common practice), so an edge that the
// altitude makes moves by that from night to night.
func TestEdgesComeBackAfterASiderealDay(t *testing.T) {
	sv := makeSurvey(1, 20, 1, 1)
	f := &sv.Fields[0]
	f.RA, f.Dec = 120*deg, 10*deg // well up on February evenings
	for d := range f.Rules {
		f.Rules[d].MoonSeparationMin = 0
	}
	b := build(t, sv, 1)
	prev, seen := int32(0), 0
	for n := range sv.Nights() {
		w := b.win.Of(b.win.Unit(0, 0), b.win.Class(0), n)
		if len(w) != 1 {
			t.Fatalf("night %d: %v; want one window", n, w)
		}
		if n > 0 {
			if got := w[0].To - prev; got < 86162 || got > 86166 {
				t.Errorf("night %d ends %d s after the one before, want 86164", n, got)
			}
			seen++
		}
		prev = w[0].To
	}
	if seen == 0 {
		t.Error("nothing compared")
	}
}

// A survey with a Sun limit for each field has more of them than a calendar
// stores; the windows' own twilight agrees with the exact path's.
func TestManySunLimits(t *testing.T) {
	sv := makeSurvey(2, 3, 24, 1)
	sv.Sites[1].Latitude = 64 * deg
	for i := range sv.Fields {
		f := &sv.Fields[i]
		f.Dec = 90 * deg
		for d := range f.Rules {
			f.Rules[d] = survey.Rules{AltitudeMin: 0, AirmassMax: 100, SunAltitudeMax: -(6 + 0.5*float64(i)) * deg, MoonIlluminationMax: 1, HourAngleMax: math.Pi}
		}
	}
	b := build(t, sv, 1)
	if _, ok := b.cal.SunBelow(0, 0, -7*deg); ok {
		t.Fatal("the calendar stores every limit; this test wants it not to")
	}
	for i := range sv.Fields {
		for s := range sv.Sites {
			for n := range sv.Nights() {
				want := b.e.SunBelow(Place(&sv.Sites[s]), b.cal.Night(s, n), sv.Fields[i].Rules[0].SunAltitudeMax)
				got := b.win.Of(b.win.Unit(i, 0), b.win.Class(s), n)
				if len(got) != len(want) {
					t.Fatalf("field %d site %d night %d: %d windows, want %d", i, s, n, len(got), len(want))
				}
				for k := range got {
					in := b.win.Interval(got[k])
					if in.From < want[k].From || in.To > want[k].To || in.From-want[k].From > 1.2 || want[k].To-in.To > 1.2 {
						t.Errorf("field %d site %d night %d: %+v, want %+v rounded inward", i, s, n, in, want[k])
					}
				}
			}
		}
	}
}

// UT1 - UTC around the leap second at the end of 2016, IERS finals2000A
// (values from memory, to 0.01 s). In Unix time the Earth's angle jumps by a
// second in the middle of the night; windows must allow for it.
func TestALeapSecondInTheNight(t *testing.T) {
	table := []ephemeris.DUT1Row{{MJD: 57750, DUT1: -0.40}, {MJD: 57753, DUT1: -0.41}, {MJD: 57754, DUT1: 0.59}, {MJD: 57758, DUT1: 0.58}}
	checked := 0
	for seed := range uint64(12) {
		sv := randomSurvey(500+seed, 24)
		sv.FirstNight, _ = survey.ParseDay("2016-12-30")
		sv.LastNight = sv.FirstNight + 2
		sv.Sites[0].Latitude, sv.Sites[0].Longitude = 30*deg, 10*deg
		for i := range sv.Fields {
			sv.Fields[i].NotBefore, sv.Fields[i].NotAfter = math.Inf(-1), math.Inf(1)
		}
		b := &built{sv: sv, e: visibility.NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{Table: table}))}
		b.sky, b.cal = Tables(sv, b.e, 1), NewCalendar(sv, b.e, nil)
		var err error
		if b.win, err = NewWindows(t.Context(), sv, b.sky, b.cal, 1); err != nil {
			t.Fatal(err)
		}
		positions := Positions(sv)
		edges, flips := 0, 0
		for f := range sv.Fields {
			j := &judge{b, f, 0, 0, Place(&sv.Sites[0]), positions[f], &sv.Telescopes[0]}
			for n := range sv.Nights() {
				for _, w := range b.win.Of(b.win.Unit(f, 0), b.win.Class(0), n) {
					if msg := j.check(w, &checked, &edges, &flips); msg != "" {
						t.Errorf("seed %d field %d night %d window %v: %s", seed, f, n, w, msg)
					}
				}
			}
		}
	}
	if checked < 1000 {
		t.Errorf("only %d instants checked", checked)
	}
}

func TestSightsAgree(t *testing.T) {
	sv := makeSurvey(6, 30, 20, 3)
	b := build(t, sv, 1)
	positions := Positions(sv)
	compared := 0
	for s := range sv.Sites {
		for k := range 60 {
			at := sv.FirstNight.Unix() + 86400 + float64(k)*37*977
			fr := b.sky.Frame(s, at)
			for f := range sv.Fields {
				fast := SkySight(b.sky, &fr, f, k%2)
				slow := ExactSight(b.e, Place(&sv.Sites[s]), positions[f], sv.Filters[k%2], at)
				if slow.SunAltitude > -5*deg || slow.Altitude < 0 {
					continue
				}
				compared++
				for _, x := range []struct {
					name      string
					got, want float64
					within    float64
				}{
					{"altitude", fast.Altitude, slow.Altitude, 0.1 * arcsec},
					{"azimuth", fast.Azimuth, slow.Azimuth, 0.1 * arcsec / math.Cos(slow.Altitude)},
					{"hour angle", fast.HourAngle, slow.HourAngle, 0.5 * arcsec / math.Cos(slow.Declination)},
					{"Sun", fast.SunAltitude, slow.SunAltitude, 2 * arcsec},
					{"Moon", fast.MoonAltitude, slow.MoonAltitude, 2 * arcsec},
					{"separation", fast.MoonSeparation, slow.MoonSeparation, 2 * arcsec},
					{"illumination", fast.MoonIllumination, slow.MoonIllumination, 1e-5},
					{"quality", fast.Quality, slow.Quality, 1e-3 * slow.Quality},
				} {
					if math.Abs(x.got-x.want) > x.within {
						t.Errorf("site %d field %d at %.0f: %s %.9f, exact %.9f", s, f, at, x.name, x.got, x.want)
					}
				}
			}
		}
	}
	if compared < 300 {
		t.Errorf("only %d sights compared", compared)
	}
}

// An azimuth range a full turn wide, cut in the south, splits the windows of
// what passes south of the zenith and leaves the others whole.
func TestACutInTheSouth(t *testing.T) {
	sv := makeSurvey(1, 1, 2, 1)
	sv.Telescopes[0].AzimuthRange = &survey.AzimuthRange{From: -180 * deg, To: 180 * deg}
	for i := range sv.Fields {
		f := &sv.Fields[i]
		f.RA = (20.97*15 - 180) * deg // transits near midnight on 1 February
		for d := range f.Rules {
			f.Rules[d].MoonSeparationMin = 0
		}
	}
	sv.Fields[0].Dec, sv.Fields[1].Dec = 10*deg, 60*deg
	b := build(t, sv, 1)
	south, north := b.win.Of(b.win.Unit(0, 0), 0, 0), b.win.Of(b.win.Unit(1, 0), 0, 0)
	if len(south) != 2 || south[1].From-south[0].To > 3 || south[1].From < south[0].To {
		t.Errorf("south of the zenith: %v; want two that meet at the transit", south)
	}
	if len(north) != 1 {
		t.Errorf("north of the zenith: %v; want one", north)
	}
	outer := b.win.AppendOuter(nil, b.win.Unit(0, 0), 0, 0)
	if len(outer) != 2 || outer[1].From > outer[0].To {
		t.Errorf("outer windows %v; want two that overlap at the transit", outer)
	}
}

func TestFlipWindowsOverlap(t *testing.T) {
	sv := makeSurvey(1, 1, 1, 1)
	tel := &sv.Telescopes[0]
	tel.Mount, tel.Flip = survey.Equatorial, &survey.Flip{Time: 60, PastMeridian: 5 * deg}
	f := &sv.Fields[0]
	f.RA, f.Dec = (20.97*15-180)*deg, 10*deg
	f.Rules[0].MoonSeparationMin = 0
	b := build(t, sv, 1)
	w := b.win.Of(b.win.Unit(0, 0), 0, 0)
	if len(w) != 2 {
		t.Fatalf("windows %v; want one on each side", w)
	}
	// 5 deg of hour angle: 5/360 of 86164.1 s.
	if got := w[0].To - w[1].From; math.Abs(float64(got)-1196.7) > 2.5 {
		t.Errorf("sides overlap by %d s, want 1197", got)
	}
}

func TestEstimateBytes(t *testing.T) {
	sv := makeSurvey(6, 10, 300, 2)
	b := build(t, sv, 1)
	if got, want := float64(EstimateBytes(sv)), float64(b.win.Bytes()); got < want/1.5 || got > want*1.5 {
		t.Errorf("estimated %g bytes, taken %g", got, want)
	}
}
