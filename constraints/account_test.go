package constraints

import (
	"math"
	"math/bits"
	"testing"

	"nightwright/constraints/survey"
)

func TestAccountsAddUp(t *testing.T) {
	sv := randomSurvey(21, 30)
	b := build(t, sv, 1)
	a, err := NewAccounts(t.Context(), sv, b.sky, b.cal, nil, 600, 2)
	if err != nil {
		t.Fatal(err)
	}
	before := 0.0
	for f := range sv.Fields {
		for d := range sv.Fields[f].Rules {
			r := a.Of(f, d)
			before += r.Before
			sum := r.Usable
			for k := range ReasonCount {
				sum += r.InOrder[k]
				if r.InOrder[k] > r.Alone[k]+1e-9 {
					t.Errorf("field %d demand %d: %s takes %g h in order, %g alone", f, d, Reason(k), r.InOrder[k], r.Alone[k])
				}
			}
			if math.Abs(sum-r.Before) > 1e-9 {
				t.Errorf("field %d demand %d: parts add up to %g h of %g", f, d, sum, r.Before)
			}
		}
	}
	if before == 0 {
		t.Error("no hours at all")
	}
}

// The account's usable hours are the windows' within the sampling, when
// min_quality asks for nothing.
func TestAccountsAgreeWithWindows(t *testing.T) {
	sv := makeSurvey(2, 10, 12, 4)
	for f := range sv.Fields {
		for d := range sv.Fields[f].Rules {
			sv.Fields[f].Rules[d].MinQuality = 0
		}
	}
	sv.Telescopes[0].Reserved = []survey.Reserved{{At: survey.AtOpening, Takes: 3600}}
	b := build(t, sv, 1)
	a, err := NewAccounts(t.Context(), sv, b.sky, b.cal, nil, 60, 1)
	if err != nil {
		t.Fatal(err)
	}
	for f := range sv.Fields {
		for d := range sv.Fields[f].Rules {
			got, want := a.Of(f, d).Usable, b.win.UsableHours(f, d)
			// 20 site-nights of one stretch or two: a sample each at most.
			if math.Abs(got-want) > 0.35 {
				t.Errorf("field %d demand %d: sampled %g h, windows %g h", f, d, got, want)
			}
		}
	}
}

func TestAccountNamesTheRule(t *testing.T) {
	sv := makeSurvey(1, 2, 1, 1)
	f := &sv.Fields[0]
	f.Dec = 5 * deg
	f.Rules[0].AltitudeMin = 80 * deg // never that high from latitude 33
	b := build(t, sv, 1)
	a, err := NewAccounts(t.Context(), sv, b.sky, b.cal, []int{0}, 600, 1)
	if err != nil {
		t.Fatal(err)
	}
	r := a.Of(0, 0)
	if why, ok := r.Greatest(); !ok || why != Altitude || r.Usable != 0 {
		t.Errorf("greatest is %q, %g h usable of %g", why, r.Usable, r.Before)
	}
	if bits.OnesCount16(uint16(Altitude)) != 1 {
		t.Error("a rule is one bit")
	}
}

func TestBlocked(t *testing.T) {
	sv := goodSurvey()
	e := newExact()
	cal := NewCalendar(sv, e, nil)
	at := cal.Open(0, 0)[0].From + 3600
	sv.Fields[0].NotAfter = math.Inf(1)
	sight := goodSight()
	sight.Unix = at
	of := func(int) Sight { return sight }
	if why, ok := Blocked(sv, cal, 0, 0, at, of); !ok || why != 0 {
		t.Errorf("a good sight is blocked by %q", why)
	}
	sight.MoonSeparation = 30 * deg // too near for the first demand, not for the second
	if why, ok := Blocked(sv, cal, 0, 0, at, of); !ok || why != 0 {
		t.Errorf("one demand is free, yet blocked by %q", why)
	}
	sight.MoonSeparation = 20 * deg
	if why, ok := Blocked(sv, cal, 0, 0, at, of); ok || why != MoonSeparation {
		t.Errorf("blocked by %q, want moon_separation", why)
	}
	sight.HourAngle = 6 * 15 * deg
	if why, ok := Blocked(sv, cal, 0, 0, at, of); ok || why != MoonSeparation|HourAngle {
		t.Errorf("blocked by %q", why)
	}
	if why, _ := Blocked(sv, cal, 0, 0, cal.Night(0, 0).From-1, of); why&Closed == 0 {
		t.Errorf("outside the period blocked by %q, want closed among them", why)
	}
	sv.Telescopes[0].Filters = nil
	if why, ok := Blocked(sv, cal, 0, 0, at, of); ok || why != 0 {
		t.Errorf("no telescope for it: %q, %v", why, ok)
	}
}
