package constraints

import (
	"math"
	"testing"

	"nightwright/constraints/survey"

	"github.com/google/go-cmp/cmp"
)

// goodSight breaks no rule of goodSurvey.
func goodSight() Sight {
	alt := 50 * deg
	return Sight{
		Unix: 1000, Altitude: alt, SinAltitude: math.Sin(alt), Azimuth: 120 * deg, HourAngle: -2 * 15 * deg,
		SunAltitude: -20 * deg, MoonAltitude: 30 * deg, MoonSeparation: 70 * deg, MoonIllumination: 0.6, Quality: 0.8,
	}
}

func goodSurvey() *survey.Survey {
	sv := makeSurvey(1, 1, 1, 1)
	f := &sv.Fields[0]
	f.NotBefore, f.NotAfter = 0, 2000
	for d := range f.Rules {
		f.Rules[d].MoonIlluminationMax = 0.9
	}
	sv.Sites[0].Horizon = []survey.HorizonPoint{{Azimuth: 0, Altitude: 10 * deg}, {Azimuth: 180 * deg, Altitude: 20 * deg}}
	sv.Telescopes[0].AzimuthRange = &survey.AzimuthRange{From: -90 * deg, To: 200 * deg}
	return sv
}

func TestEachRuleAlone(t *testing.T) {
	set := func(alt float64) func(*Sight, *survey.Survey) {
		return func(s *Sight, _ *survey.Survey) { s.Altitude, s.SinAltitude = alt*deg, math.Sin(alt*deg) }
	}
	tests := []struct {
		msg  string
		edit func(*Sight, *survey.Survey)
		want Reasons
	}{
		{"nothing is broken", func(*Sight, *survey.Survey) {}, 0},
		{"before not_before", func(s *Sight, _ *survey.Survey) { s.Unix = -1 }, Dates},
		{"at not_after", func(s *Sight, _ *survey.Survey) { s.Unix = 2000 }, 0},
		{"after not_after", func(s *Sight, _ *survey.Survey) { s.Unix = 2001 }, Dates},
		{"Sun at its limit", func(s *Sight, _ *survey.Survey) { s.SunAltitude = -15 * deg }, 0},
		{"Sun above its limit", func(s *Sight, _ *survey.Survey) { s.SunAltitude = -14.999 * deg }, Sun},
		// Airmass 2 is at 29.9 deg (Young 1994), under the altitude limit of 30.
		{"a little low", set(29.95), Altitude},
		{"low", set(25), Altitude | Airmass},
		{"under the mount too", set(19), Altitude | Airmass | MountAltitude},
		{"below the mask", set(15), Altitude | Airmass | MountAltitude | Horizon},
		{"under the ground", set(-15), Altitude | Airmass | MountAltitude | Horizon},
		{"near the zenith", set(88), MountAltitude},
		{"late", func(s *Sight, _ *survey.Survey) { s.HourAngle = 5.01 * 15 * deg }, HourAngle},
		{"early", func(s *Sight, _ *survey.Survey) { s.HourAngle = -5.01 * 15 * deg }, HourAngle},
		{"out of the azimuth range", func(s *Sight, _ *survey.Survey) { s.Azimuth = 210 * deg }, AzimuthRange},
		{"within it, below north", func(s *Sight, _ *survey.Survey) { s.Azimuth = 300 * deg }, 0},
		{"a high mask", func(_ *Sight, sv *survey.Survey) { sv.Sites[0].Horizon[1].Altitude = 85 * deg }, Horizon},
		{"near the Moon", func(s *Sight, _ *survey.Survey) { s.MoonSeparation = 39 * deg }, MoonSeparation},
		{"near a Moon that is down", func(s *Sight, _ *survey.Survey) { s.MoonSeparation, s.MoonAltitude = 39*deg, 0 }, 0},
		{"bright Moon", func(s *Sight, _ *survey.Survey) { s.MoonIllumination = 0.95 }, MoonIllumination},
		{"bright Moon, down", func(s *Sight, _ *survey.Survey) { s.MoonIllumination, s.MoonAltitude = 0.95, -0.01 }, 0},
		{"poor", func(s *Sight, _ *survey.Survey) { s.Quality = 0.09 }, Quality},
	}
	for _, tt := range tests {
		s, sv := goodSight(), goodSurvey()
		tt.edit(&s, sv)
		if got := Evaluate(sv, 0, 0, 0, &s); got != tt.want {
			t.Errorf("%s: broken %q, want %q", tt.msg, got, tt.want)
		}
	}
}

func TestReasonsHaveOneNameEach(t *testing.T) {
	seen := map[string]bool{}
	for i := range ReasonCount {
		names := Reason(i).Names()
		if len(names) != 1 || seen[names[0]] {
			t.Errorf("rule %d is called %v", i, names)
		}
		seen[names[0]] = true
	}
	if got, want := (Altitude | MoonSeparation | Sun).String(), "sun,altitude,moon_separation"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
	if Reserved != Reason(ReasonCount-1) {
		t.Error("a rule without a name")
	}
}

// The altitude at which Young's airmass reaches a value, from the airmass
// column of the published formula turned round: X(30 deg) = 1.993 and X(90
// deg) = 1 (Young 1994, value from memory).
func TestAltitudeOfAirmass(t *testing.T) {
	if got := AltitudeOfAirmass(1.9928) / deg; math.Abs(got-30) > 0.03 {
		t.Errorf("airmass 1.9928 at %.3f deg, want 30", got)
	}
	if got := AltitudeOfAirmass(0.9); got != math.Pi {
		t.Errorf("airmass 0.9 is reached at %g rad; want never", got)
	}
	if got := AltitudeOfAirmass(1000); got != 0 {
		t.Errorf("airmass 1000 is reached at %g rad; want 0", got)
	}
	for _, x := range []float64{1.05, 1.5, 2, 5, 20} {
		h := AltitudeOfAirmass(x)
		s := Sight{SinAltitude: math.Sin(h + 1e-12)}
		if overAirmass(&s, x) {
			t.Errorf("airmass %g is broken at its own altitude %g", x, h)
		}
		s.SinAltitude = math.Sin(h - 1e-9)
		if !overAirmass(&s, x) {
			t.Errorf("airmass %g holds below its own altitude %g", x, h)
		}
	}
}

func TestHorizonIsLinearAndClosedRound(t *testing.T) {
	mask := []survey.HorizonPoint{{Azimuth: 30 * deg, Altitude: 12 * deg}, {Azimuth: 90 * deg, Altitude: 20 * deg}, {Azimuth: 270 * deg, Altitude: 4 * deg}}
	m := newMask(mask)
	for _, tt := range []struct{ az, want float64 }{
		{30, 12}, {60, 16}, {90, 20}, {180, 12}, {270, 4}, {330, 8}, {0, 10}, {15, 11}, {359.999, 10 - 0.001/15},
	} {
		if got := HorizonAltitude(mask, tt.az*deg) / deg; math.Abs(got-tt.want) > 1e-9 {
			t.Errorf("horizon at %g: got %g, want %g", tt.az, got, tt.want)
		}
		if got := m.along(m.piece(tt.az*deg), tt.az*deg) / deg; math.Abs(got-tt.want) > 1e-9 {
			t.Errorf("mask at %g: got %g, want %g", tt.az, got, tt.want)
		}
	}
	if got := HorizonAltitude([]survey.HorizonPoint{{Azimuth: 90 * deg, Altitude: 20 * deg}}, 1) / deg; math.Abs(got-20) > 1e-9 {
		t.Errorf("one vertex is a level horizon: got %g, want 20", got)
	}
	if got := HorizonAltitude(nil, 1); got > -1 {
		t.Errorf("no mask: got %g rad", got)
	}
}

func TestTracks(t *testing.T) {
	r := survey.AzimuthRange{From: -180 * deg, To: 180 * deg}
	for _, tt := range []struct {
		from, to float64
		want     bool
	}{
		{170, 175, false}, {175, 185, true}, {185, 175, true}, {190, 200, false}, {350, 10, false}, {10, 350, false},
	} {
		if got := LeavesAzimuthRange(r, tt.from*deg, tt.to*deg); got != tt.want {
			t.Errorf("from %g to %g leaves a range cut in the south: got %v, want %v", tt.from, tt.to, got, tt.want)
		}
	}
	f := &survey.Flip{PastMeridian: 5 * deg}
	for _, tt := range []struct {
		from, to float64
		want     bool
	}{
		{-10, 4, false}, {-10, 5, false}, {-1, 5.1, true}, {0, 40, false}, {1, 60, false},
	} {
		if got := CrossesMeridian(f, tt.from*deg, tt.to*deg); got != tt.want {
			t.Errorf("from hour angle %g to %g deg: got %v, want %v", tt.from, tt.to, got, tt.want)
		}
	}
	if PassesLowerMeridian(170*deg, 179*deg) || !PassesLowerMeridian(179*deg, -179*deg) {
		t.Error("the lower meridian lies between 179 and -179 deg")
	}
}

func TestCadence(t *testing.T) {
	if TooClose(int64(100), 160, 60) || !TooClose(int64(160), 101, 60) {
		t.Error("starts 60 apart keep a gap of 60 in either order, 59 don't")
	}
	if TooManyPerNight(2, 2) || !TooManyPerNight(3, 2) || TooManyPerNight(99, 0) {
		t.Error("per_night 2 allows two; 0 sets no limit")
	}
	d := &survey.Demand{GapMax: 100}
	if GapWishBroken(0, 100, d) || !GapWishBroken(0, 101, d) {
		t.Error("gap.max 100 is kept at 100")
	}
}

func TestSets(t *testing.T) {
	d := &survey.Demand{Exposures: []survey.Exposure{
		{Duration: 45}, {Duration: 45, After: 1200, Tolerance: 300}, {Duration: 60, After: 1200, Tolerance: 100},
	}}
	if WrongAfter(d, 1, 1000, 2500) || WrongAfter(d, 1, 1000, 1900) || !WrongAfter(d, 1, 1000, 2501) || !WrongAfter(d, 1, 1000, 1899) {
		t.Error("after 1200 s within 300 s is 900 to 1500 s")
	}
	// 900 + 1100 to 1500 + 1300 between starts, and the last exposure's 60 s twice over.
	least, most := SetSpan(d, &survey.Telescope{ExposureScale: 2})
	if diff := cmp.Diff([]float64{2120, 2920}, []float64{least, most}); diff != "" {
		t.Error(diff)
	}
	if SetsOverlap(0, 10, 10, 20) || !SetsOverlap(0, 11, 10, 20) || !SetsOverlap(12, 13, 10, 20) {
		t.Error("[0,10) and [10,20) don't overlap")
	}
}

func TestShares(t *testing.T) {
	p := &survey.Program{ShareMin: 0.2, ShareMax: 0.3}
	for _, tt := range []struct {
		msg             string
		own, all, visit float64
		want            float64
	}{
		{"within", 250, 1000, 10, 0},
		{"one visit short", 195, 1000, 10, 0},
		{"more than a visit short", 150, 1000, 10, -0.05},
		{"one visit over", 305, 1000, 10, 0},
		{"more than a visit over", 400, 1000, 10, 0.1},
		{"nothing planned at all", 0, 0, 10, 0},
		{"a single visit is all there is", 10, 10, 10, 0},
	} {
		if got := ShareBreach(p, tt.own, tt.all, tt.visit); math.Abs(got-tt.want) > 1e-12 {
			t.Errorf("%s: got %g, want %g", tt.msg, got, tt.want)
		}
	}
}
