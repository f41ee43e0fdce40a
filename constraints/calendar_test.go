package constraints

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func iv(from, to float64) visibility.Interval { return visibility.Interval{From: from, To: to} }

func TestNightsAndOpenTime(t *testing.T) {
	sv := makeSurvey(6, 5, 30, 1)
	e := newExact()
	c := NewCalendar(sv, e, nil)
	for s := range sv.Sites {
		for n := range sv.Nights() {
			night := c.Night(s, n)
			for _, at := range []float64{night.From, night.To} {
				if ha := e.Sun(Place(&sv.Sites[s]), at).HourAngle; math.Abs(ha) > 1e-6 {
					t.Errorf("site %d night %d: the Sun's hour angle at its end is %g rad", s, n, ha)
				}
			}
			if n > 0 && night.From != c.Night(s, n-1).To {
				t.Errorf("site %d: night %d doesn't begin where the one before ends", s, n)
			}
			if got, ok := c.NightAt(s, night.From+40000); !ok || got != n {
				t.Errorf("site %d: the instant in night %d is in %d, %v", s, n, got, ok)
			}
			// The telescope's loosest limit is -15 deg: open is longer than dark, by
			// about 3 deg of the Sun's path twice.
			open, dark := c.OpenHours(s, n), c.DarkHours(s, n)
			if extra := (open - dark) * 60; extra < 24 || extra > 50 {
				t.Errorf("site %d night %d: open %.2f h, dark %.2f h", s, n, open, dark)
			}
			for _, o := range c.Open(s, n) {
				for _, at := range []float64{o.From, o.To} {
					if alt := e.Sun(Place(&sv.Sites[s]), at).Altitude; math.Abs(alt+15*deg) > 1e-6 {
						t.Errorf("site %d night %d: the Sun is %.6f deg high at the edge", s, n, alt/deg)
					}
				}
			}
		}
	}
	if _, ok := c.NightAt(0, sv.FirstNight.Unix()-86400*3); ok {
		t.Error("an instant before the period lies in a night")
	}
}

func TestClosuresLossesAndReserves(t *testing.T) {
	sv := makeSurvey(1, 4, 3, 1)
	base := NewCalendar(sv, newExact(), nil)
	night := make([]visibility.Interval, 4)
	for n := range night {
		night[n] = base.Open(0, n)[0]
	}
	sv.Sites[0].Closures = []survey.Closure{{ByNight: true, FirstNight: sv.FirstNight + 1, LastNight: sv.FirstNight + 1}}
	sv.Telescopes[0].Closures = []survey.Closure{{From: night[2].From - 500, To: night[2].From + 3000}}
	sv.Telescopes[0].Reserved = []survey.Reserved{
		{At: survey.AtOpening, Takes: 600}, {At: survey.AtOpening, Takes: 300},
		{At: survey.AtClosing, Takes: 120}, {At: survey.AtEvery, Every: 14400, Takes: 180},
	}
	sv.Telescopes[0].KeepFree = 0.1
	losses := [][]visibility.Interval{{iv(night[3].From+5000, night[3].From+6000)}}
	c := NewCalendar(sv, newExact(), losses)

	o := night[0]
	want := []visibility.Interval{iv(o.From+900, o.From+14400), iv(o.From+14580, o.From+28800), iv(o.From+28980, o.To-120)}
	if diff := cmp.Diff(want, c.Open(0, 0)); diff != "" {
		t.Errorf("night 0, 900 s off its start, 120 s off its end, 180 s every 4 h: %s", diff)
	}
	if len(c.Open(0, 1)) != 0 || c.OpenHours(0, 1) != 0 || c.Budget(0, 1) != 0 {
		t.Errorf("night 1 is closed, but open %v", c.Open(0, 1))
	}
	if got, want := c.Open(0, 2)[0].From, night[2].From+3900; got != want {
		t.Errorf("night 2 opens %g s late, want 3000 + 900", got-night[2].From)
	}
	o = night[3]
	if diff := cmp.Diff(iv(o.From+900, o.From+5000), c.Open(0, 3)[0]); diff != "" {
		t.Errorf("night 3: %s", diff)
	}
	if got, want := c.Budget(0, 3), 0.9*3600*c.OpenHours(0, 3); math.Abs(got-want) > 1e-6 {
		t.Errorf("budget %g s, want %g", got, want)
	}
	for _, tt := range []struct {
		at   float64
		want Reasons
	}{
		{night[0].From + 100, Reserved}, {night[0].From + 1000, 0}, {night[1].From + 1000, Closed},
		{night[3].From + 5500, Lost}, {night[2].From + 100, Closed}, {sv.FirstNight.Unix() - 1e6, Closed},
	} {
		if got := c.Reasons(0, tt.at); got != tt.want {
			t.Errorf("at %g: %q, want %q", tt.at, got, tt.want)
		}
	}
}

func TestPolarNightsAndDays(t *testing.T) {
	sv := makeSurvey(1, 3, 3, 1)
	sv.Sites[0].Latitude = 90 * deg
	for _, tt := range []struct {
		first string
		hours float64
	}{{"2027-12-20", 24}, {"2027-06-20", 0}} {
		sv.FirstNight, _ = survey.ParseDay(tt.first)
		sv.LastNight = sv.FirstNight + 2
		c := NewCalendar(sv, newExact(), nil)
		if got := c.DarkHours(0, 1); math.Abs(got-tt.hours) > 0.02 {
			t.Errorf("%s at the pole: %g dark hours, want %g", tt.first, got, tt.hours)
		}
	}
}

func TestATelescopeWithoutDemandsIsNeverOpen(t *testing.T) {
	sv := makeSurvey(2, 2, 3, 1)
	sv.Telescopes[1].Filters = nil
	c := NewCalendar(sv, newExact(), nil)
	if len(c.Open(1, 0)) != 0 || c.OpenHours(0, 0) == 0 {
		t.Errorf("open %v", c.Open(1, 0))
	}
}

// Set operations against membership at points.
func TestSpanAlgebra(t *testing.T) {
	spans := rapid.Custom(func(t *rapid.T) []visibility.Interval {
		var out []visibility.Interval
		at := 0
		for range rapid.IntRange(0, 5).Draw(t, "n") {
			at += rapid.IntRange(1, 5).Draw(t, "skip")
			to := at + rapid.IntRange(1, 5).Draw(t, "length")
			out = append(out, iv(float64(at), float64(to)))
			at = to
		}
		return out
	})
	rapid.Check(t, func(t *rapid.T) {
		a, b := spans.Draw(t, "a"), spans.Draw(t, "b")
		both, left := intersect(nil, a, b), subtract(nil, a, b)
		any := union(append(append([]visibility.Interval(nil), a...), b...))
		for x := 0.5; x < 60; x++ {
			inA, inB := holds(a, x), holds(b, x)
			if holds(both, x) != (inA && inB) || holds(left, x) != (inA && !inB) || holds(any, x) != (inA || inB) {
				t.Fatalf("a %v b %v at %g: both %v, left %v, any %v", a, b, x, both, left, any)
			}
		}
		if got := seconds(both) + seconds(left); math.Abs(got-seconds(a)) > 1e-12 {
			t.Fatalf("parts of %v add up to %g", a, got)
		}
	})
}
