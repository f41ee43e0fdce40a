package constraints

import (
	"context"
	"errors"
	"math"
	"slices"
	"testing"

	"nightwright/constraints/survey"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func TestWindowsDontDependOnWorkers(t *testing.T) {
	sv := randomSurvey(5, 40)
	sv.LastNight += 5
	one := build(t, sv, 1)
	for _, workers := range []int{2, 8} {
		w := build(t, sv, workers).win
		if diff := cmp.Diff(one.win.nights, w.nights, cmp.AllowUnexported(nightWindows{})); diff != "" {
			t.Fatalf("%d workers: %s", workers, diff)
		}
	}
}

func TestNewWindowsStops(t *testing.T) {
	sv := makeSurvey(1, 2, 5, 1)
	e := newExact()
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := NewWindows(ctx, sv, Tables(sv, e, 1), NewCalendar(sv, e, nil), 1); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v, want %v", err, context.Canceled)
	}
}

// all returns the windows of every field, demand, telescope and night in order.
func all(b *built, field int) (out []Window) {
	for d := range b.sv.Fields[field].Rules {
		for t := range b.sv.Telescopes {
			for n := range b.sv.Nights() {
				out = append(out, b.win.Of(b.win.Unit(field, d), b.win.Class(t), n)...)
			}
		}
	}
	return out
}

func TestPermutingFieldsChangesNothing(t *testing.T) {
	sv := randomSurvey(9, 20)
	a := build(t, sv, 1)
	turned := *sv
	turned.Fields = slices.Clone(sv.Fields)
	slices.Reverse(turned.Fields)
	b := build(t, &turned, 1)
	for f := range sv.Fields {
		if diff := cmp.Diff(all(a, f), all(b, len(sv.Fields)-1-f)); diff != "" {
			t.Errorf("field %d: %s", f, diff)
		}
	}
}

// A stricter rule never adds time: every window lies within one of the looser
// rules' windows.
func TestWindowsNestWhenRulesTighten(t *testing.T) {
	tighten := []struct {
		name string
		edit func(*survey.Rules, float64)
	}{
		{"altitude_min", func(r *survey.Rules, x float64) { r.AltitudeMin += x * 40 * deg }},
		{"airmass_max", func(r *survey.Rules, x float64) { r.AirmassMax = 1 + (r.AirmassMax-1)*(1-x) }},
		{"sun_altitude_max", func(r *survey.Rules, x float64) { r.SunAltitudeMax -= x * 10 * deg }},
		{"moon_separation_min", func(r *survey.Rules, x float64) { r.MoonSeparationMin += x * 60 * deg }},
		{"moon_illumination_max", func(r *survey.Rules, x float64) { r.MoonIlluminationMax *= 1 - x }},
		{"hour_angle_max", func(r *survey.Rules, x float64) { r.HourAngleMax *= 1 - x }},
	}
	rapid.Check(t, func(rt *rapid.T) {
		seed := rapid.Uint64Range(0, 1<<20).Draw(rt, "seed")
		rule := rapid.IntRange(0, len(tighten)-1).Draw(rt, "rule")
		x := rapid.Float64Range(0, 1).Draw(rt, "by")
		sv := randomSurvey(seed, 6)
		loose := build(t, sv, 1)
		strict := *sv
		strict.Fields = slices.Clone(sv.Fields)
		for i := range strict.Fields {
			strict.Fields[i].Rules = slices.Clone(sv.Fields[i].Rules)
			for d := range strict.Fields[i].Rules {
				tighten[rule].edit(&strict.Fields[i].Rules[d], x)
			}
		}
		tight := build(t, &strict, 1)
		for f := range sv.Fields {
			for d := range sv.Fields[f].Rules {
				for tel := range sv.Telescopes {
					for n := range sv.Nights() {
						a := loose.win.Of(loose.win.Unit(f, d), loose.win.Class(tel), n)
						b := tight.win.Of(tight.win.Unit(f, d), tight.win.Class(tel), n)
						nested(rt, tighten[rule].name, a, b)
					}
				}
			}
		}
	})
}

// nested fails when a strict window sticks out of all loose ones. The night's
// middle, at which directions are frozen, may differ between the two surveys
// when a Sun limit does: a second of rounding is allowed.
func nested(t *rapid.T, rule string, loose, strict []Window) {
	for _, w := range strict {
		if !slices.ContainsFunc(loose, func(x Window) bool { return x.From-1 <= w.From && w.To <= x.To+1 }) {
			t.Fatalf("%s: the strict window %v is not in %v", rule, w, loose)
		}
	}
}

func TestOuterHoldsInner(t *testing.T) {
	for seed := range uint64(6) {
		b := build(t, randomSurvey(300+seed, 20), 1)
		for n := range b.win.nights {
			for u := range b.win.Units() {
				for c := range b.win.Classes() {
					outer := b.win.AppendOuter(nil, u, c, n)
					for _, w := range b.win.Of(u, c, n) {
						if !slices.ContainsFunc(outer, func(x Window) bool { return x.From <= w.From && w.To <= x.To }) {
							t.Fatalf("seed %d unit %d class %d night %d: %v not in %v", seed, u, c, n, w, outer)
						}
					}
				}
			}
		}
	}
}

// A star is up above an altitude for as long as the textbook's semi-diurnal
// arc says: cos H = (sin h - sin lat sin dec) / (cos lat cos dec) (Meeus 1998,
// ch. 15), turned by the sidereal rate. At the equator a star of declination 0
// is above 30 deg for 120 deg of hour angle: 8 h of sidereal time, 28,721.4 s.
func TestSemiDiurnalArc(t *testing.T) {
	sv := makeSurvey(1, 1, 1, 1)
	s := &sv.Sites[0]
	s.Latitude, s.Longitude = 0, 0
	f := &sv.Fields[0]
	// On 1 February the Sun is near right ascension 20 h 58 m: a field 12 h on
	// transits near local midnight. Declination of date 0 is near that of J2000.
	f.RA, f.Dec = (20.97*15-180)*deg, 0.14*deg
	for d := range f.Rules {
		f.Rules[d].AirmassMax, f.Rules[d].HourAngleMax, f.Rules[d].MoonSeparationMin = 40, math.Pi, 0
	}
	b := build(t, sv, 1)
	w := b.win.Of(b.win.Unit(0, 1), b.win.Class(0), 0)
	// The mount's 87 deg is passed at the zenith, so there are two parts; from
	// the first's start to the last's end is the arc.
	if len(w) != 2 {
		t.Fatalf("windows %v; want two, before and after the zenith", w)
	}
	if got := float64(w[1].To - w[0].From); math.Abs(got-28721.4) > 2.5 {
		t.Errorf("above 30 deg for %g s, want 28721.4", got)
	}
	// 3 deg about the zenith either way: 6 deg of turning, 1436.1 s.
	if got := float64(w[1].From - w[0].To); math.Abs(got-1436.1) > 3 {
		t.Errorf("above 87 deg for %g s, want 1436.1", got)
	}
}

func TestFieldsThatNeverRiseAndNeverSet(t *testing.T) {
	sv := makeSurvey(1, 1, 2, 1)
	for i := range sv.Fields {
		for d := range sv.Fields[i].Rules {
			r := &sv.Fields[i].Rules[d]
			r.AltitudeMin, r.AirmassMax, r.HourAngleMax, r.MoonSeparationMin = 25*deg, 40, math.Pi, 0
		}
	}
	sv.Fields[0].Dec, sv.Fields[1].Dec = 90*deg, -70*deg
	b := build(t, sv, 1)
	open := b.cal.Open(0, 0)[0]
	w := b.win.Of(b.win.Unit(0, 0), b.win.Class(0), 0)
	if len(w) != 1 || math.Abs(float64(w[0].To-w[0].From)-(open.To-open.From)) > 3 {
		t.Errorf("the pole from latitude 33: %v, want all of %g s", w, open.To-open.From)
	}
	if w := b.win.Of(b.win.Unit(1, 0), b.win.Class(0), 0); len(w) != 0 {
		t.Errorf("declination -70 from latitude 33: %v, want none", w)
	}
	if got, want := b.win.UsableHours(0, 0), b.cal.OpenHours(0, 0); math.Abs(got-want) > 0.001 {
		t.Errorf("usable %g h, want %g", got, want)
	}
}

func TestUnitsAndClasses(t *testing.T) {
	sv := makeSurvey(2, 1, 3, 1)
	second := usualTelescope("twin", 0)
	second.Readout = 20 // no matter for windows
	third := usualTelescope("limited", 0)
	third.AltitudeMin = 40 * deg
	sv.Telescopes = append(sv.Telescopes, second, third)
	sv.Sites[0].Telescopes = append(sv.Sites[0].Telescopes, 2, 3)
	sv.Fields[1].Rules[0] = sv.Fields[1].Rules[1]
	sv.Fields[1].Rules[0].MinQuality = 0.5 // no matter for windows
	b := build(t, sv, 1)
	if b.win.Class(0) != b.win.Class(2) || b.win.Class(0) == b.win.Class(1) || b.win.Class(0) == b.win.Class(3) || b.win.Classes() != 3 {
		t.Errorf("classes %v", b.win.classOf)
	}
	if b.win.Unit(1, 0) != b.win.Unit(1, 1) || b.win.Unit(0, 0) == b.win.Unit(0, 1) || b.win.Units() != 5 {
		t.Errorf("units %v", b.win.unitOf)
	}
	sv.Programs[0].Telescopes = []int{1} // field 0's program
	only := build(t, sv, 1)
	for n := range sv.Nights() {
		if got := only.win.Of(only.win.Unit(0, 0), only.win.Class(0), n); len(got) != 0 {
			t.Errorf("windows %v at a telescope that may not serve the field", got)
		}
	}
}
