package visibility

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"
)

// dayOf reads a date as days since 1970-01-01.
func dayOf(t testing.TB, s string) int32 {
	t.Helper()
	d, err := time.Parse(time.DateOnly, s)
	if err != nil {
		t.Fatal(err)
	}
	return int32(d.Unix() / 86400)
}

var stateNames = map[Crossing]string{
	Crosses: "cross", AlwaysAbove: "always_above", AlwaysBelow: "always_below",
	SetsOnly: "set_only", RisesOnly: "rise_only",
}

// sunRate is how fast the Sun's altitude changes at an instant, deg/s.
func sunRate(e *Exact, s Site, t float64) float64 {
	return math.Abs(e.Sun(s, t+5).Altitude-e.Sun(s, t-5).Altitude) / 10 / degree
}

// TestAlmanacSun compares transits, sunset, twilights and sunrise with times
// found over ERFA's epv00: 1 s below latitude 65, else what 0.05" of altitude
// (the Sun's error here) and 1 ms make.
func TestAlmanacSun(t *testing.T) {
	var low, high, noon, depth worst
	for _, r := range table(t, "twilight_public.csv") {
		e, s := exactWith(r.num(t, "dut1_s")), r.site(t)
		a := e.Almanac(s, dayOf(t, r["local_date"]))
		noon.see(a.Night.From-instant(t, r["solar_noon_utc"]), r["id"])
		depth.see((e.Sun(s, a.Night.From).Altitude-r.rad(t, "sun_alt_noon_deg"))/degree*3600, r["id"])
		for _, x := range []struct {
			name     string
			p        Passage
			down, up string
			state    string
		}{
			{"horizon", a.Horizon, "sunset_utc", "sunrise_utc", "state_m0833"},
			{"-6", a.Civil, "eve_m6_utc", "morn_m6_utc", "state_m6"},
			{"-12", a.Nautical, "eve_m12_utc", "morn_m12_utc", "state_m12"},
			{"-18", a.Dark, "eve_m18_utc", "morn_m18_utc", "state_m18"},
		} {
			at := fmt.Sprintf("row %s %s, %s", r["id"], r["site"], x.name)
			if got := stateNames[x.p.State]; got != r[x.state] {
				t.Errorf("%s: %s, want %s", at, got, r[x.state])
			}
			for _, y := range []struct {
				got  float64
				want string
			}{{x.p.Down, r[x.down]}, {x.p.Up, r[x.up]}} {
				if (y.want == "") != math.IsNaN(y.got) {
					t.Errorf("%s: got %v, want %q", at, y.got, y.want)
				}
				if y.want == "" || math.IsNaN(y.got) {
					continue
				}
				off := y.got - instant(t, y.want)
				if math.Abs(r.num(t, "lat_deg")) < 65 {
					low.see(off, at)
				}
				high.see(math.Max(0, math.Abs(off)-1e-3)*sunRate(e, s, y.got)*3600, at)
			}
		}
	}
	noon.check(t, "transit, s", 0.02)
	depth.check(t, "Sun at transit, arcsec", 0.1)
	low.check(t, "Sun below latitude 65, s", 0.1)
	high.check(t, "Sun anywhere, arcsec of altitude", 0.1)
}

// TestAlmanacMoon compares moonrise and moonset in both definitions of the
// reference, over moon98 and DE405.
func TestAlmanacMoon(t *testing.T) {
	fixed := func(float64) float64 { return sunRiseAltitude }
	for _, source := range []struct {
		suffix string
		limit  float64 // s below latitude 65
	}{{"", 0.05}, {"_de405", 10}} {
		var low worst
		for _, r := range table(t, "twilight_public.csv") {
			e, s := exactWith(r.num(t, "dut1_s")), r.site(t)
			night := e.Night(s, dayOf(t, r["local_date"]))
			riseA, setA := e.moonPasses(s, night, fixed)
			row := e.Almanac(s, dayOf(t, r["local_date"]))
			for _, x := range []struct {
				got []float64
				col string
			}{
				{riseA, "moonrise_a"}, {setA, "moonset_a"},
				{row.Moonrise, "moonrise_b"}, {row.Moonset, "moonset_b"},
			} {
				at := fmt.Sprintf("row %s %s, %s%s", r["id"], r["site"], x.col, source.suffix)
				var want []string
				if v := r[x.col+source.suffix+"_utc"]; v != "" {
					want = strings.Split(v, ";")
				}
				if len(want) != len(x.got) {
					t.Errorf("%s: got %d, want %v", at, len(x.got), want)
					continue
				}
				if math.Abs(r.num(t, "lat_deg")) < 65 {
					for i := range want {
						low.see(x.got[i]-instant(t, strings.TrimSpace(want[i])), at)
					}
				}
			}
		}
		low.check(t, "Moon below latitude 65, s"+source.suffix, source.limit)
	}
}

// TestNightEverywhere: nights exist and follow each other at the poles and on
// the date line, last about a day, and -180 and +180 give labels a day apart.
func TestNightEverywhere(t *testing.T) {
	e := exactWith(0)
	day := dayOf(t, "2027-03-20")
	for _, lat := range []float64{-90, -89.9, -45, 0, 66.6, 89.9, 90} {
		for _, lon := range []float64{-180, -90, 0, 77, 180} {
			s := Site{Latitude: lat * degree, Longitude: lon * degree}
			for d := day - 3; d < day+3; d++ {
				n := e.Night(s, d)
				if next := e.Night(s, d+1); n.To != next.From {
					t.Errorf("%g %g: night %d ends %g, the next begins %g", lat, lon, d, n.To, next.From)
				}
				if l := n.To - n.From; math.Abs(l-86400) > 35 {
					t.Errorf("%g %g: night of %g s", lat, lon, l)
				}
				noon := float64(d)*86400 + 43200 - lon*240
				// The equation of time stays within 16.5 min (common practice).
				if math.Abs(n.From-noon) > 990 {
					t.Errorf("%g %g: transit %g s from mean noon", lat, lon, n.From-noon)
				}
				if h := e.Sun(s, n.From).HourAngle; math.Abs(h) > 2e-8 {
					t.Errorf("%g %g: hour angle %g at the transit", lat, lon, h)
				}
			}
		}
	}
	west, east := Site{Longitude: -math.Pi}, Site{Longitude: math.Pi}
	if a, b := e.Night(west, day), e.Night(east, day+1); math.Abs(a.From-b.From) > 1e-3 {
		t.Errorf("-180 and +180: %g and %g, want the same night a label apart", a.From, b.From)
	}
}

// TestPolarNights: at the poles the Sun crosses a limit once in half a year,
// and the almanac says what stays so.
func TestPolarNights(t *testing.T) {
	e := exactWith(0)
	north, south := Site{Latitude: math.Pi / 2}, Site{Latitude: -math.Pi / 2, Elevation: 2835}
	june, december := dayOf(t, "2027-06-21"), dayOf(t, "2027-12-21")
	if a := e.Almanac(north, june); a.Horizon.State != AlwaysAbove || a.DarkHours != 0 {
		t.Errorf("north pole in June: %v, %g dark hours", a.Horizon.State, a.DarkHours)
	}
	a := e.Almanac(north, december)
	if a.Horizon.State != AlwaysBelow || a.Dark.State != AlwaysBelow || math.Abs(a.DarkHours-24) > 0.02 {
		t.Errorf("north pole in December: %v, %v, %g dark hours", a.Horizon.State, a.Dark.State, a.DarkHours)
	}
	// Sunset of the south pole falls after the March equinox by what -50' of
	// altitude take at 0.4 deg a day: on one night, once.
	sets := 0
	for d := dayOf(t, "2027-03-15"); d < dayOf(t, "2027-03-31"); d++ {
		a := e.Almanac(south, d)
		switch a.Horizon.State {
		case SetsOnly:
			sets++
			if alt := e.Sun(south, a.Horizon.Down).Altitude; math.Abs(alt-sunRiseAltitude) > 1e-9 {
				t.Errorf("altitude %g at sunset", alt/degree)
			}
		case AlwaysAbove, AlwaysBelow:
		default:
			t.Errorf("day %d: %v", d, a.Horizon.State)
		}
	}
	if sets != 1 {
		t.Errorf("the Sun set %d times at the south pole, want once", sets)
	}
}

// TestSunBelow: intervals are in order, inside the night, and their edges on
// the limit; outside them the Sun is above it.
func TestSunBelow(t *testing.T) {
	e := exactWith(0)
	for _, lat := range []float64{-89.95, -67, -33, 0, 48.6, 66.56, 89.8} {
		s := Site{Latitude: lat * degree, Longitude: 1.3, Elevation: 1500}
		for d := dayOf(t, "2027-01-01"); d < dayOf(t, "2028-01-01"); d += 23 {
			night := e.Night(s, d)
			for _, limit := range []float64{-0.8, -12, -15, -18} {
				in := e.SunBelow(s, night, limit*degree)
				last := night.From
				for _, iv := range in {
					if iv.From < last || iv.To <= iv.From || iv.To > night.To {
						t.Errorf("lat %g day %d: %v in %v", lat, d, in, night)
					}
					last = iv.To
					for _, x := range []float64{iv.From, iv.To} {
						if off := e.Sun(s, x).Altitude/degree - limit; x != night.From && x != night.To && math.Abs(off)*3600 > 0.015 {
							t.Errorf("lat %g day %d: edge off by %g deg", lat, d, off)
						}
					}
				}
				for k := range 200 {
					x := night.From + (night.To-night.From)*float64(k)/200
					want := false
					for _, iv := range in {
						want = want || x >= iv.From && x <= iv.To
					}
					if alt := e.Sun(s, x).Altitude/degree - limit; (alt <= 0) != want && math.Abs(alt) > 1e-6 {
						t.Errorf("lat %g day %d limit %g: Sun %g deg over it at %g, listed %v", lat, d, limit, alt, x, want)
					}
				}
			}
		}
	}
}

// TestMoonAbove: the Moon is above 0 inside the intervals and not outside.
func TestMoonAbove(t *testing.T) {
	e := exactWith(0)
	for _, lat := range []float64{-77, -30, 5, 61.5, 70} {
		s := Site{Latitude: lat * degree, Longitude: -2}
		for d := dayOf(t, "2027-02-01"); d < dayOf(t, "2027-03-03"); d += 2 {
			night := e.Night(s, d)
			in := e.MoonAbove(s, night)
			for k := range 100 {
				x := night.From + (night.To-night.From)*float64(k)/100
				want := false
				for _, iv := range in {
					want = want || x >= iv.From && x <= iv.To
				}
				if alt := e.Moon(s, x).Altitude; (alt > 0) != want && math.Abs(alt) > 1e-7 {
					t.Errorf("lat %g day %d: Moon at %g deg at %g, listed %v", lat, d, alt/degree, x, want)
				}
			}
		}
	}
}

// TestRoot finds known roots, steep, flat and at an end.
func TestRoot(t *testing.T) {
	for _, c := range []struct {
		f       func(float64) float64
		a, b, x float64
	}{
		{func(x float64) float64 { return math.Cos(x) }, 0, 3, math.Pi / 2},
		{func(x float64) float64 { return x*x*x - 2 }, 0, 100, math.Cbrt(2)},
		{func(x float64) float64 { return 1e-9 * (x - 7) }, 0, 1e5, 7},
		{func(x float64) float64 { return math.Tanh(1e4 * (x - 0.3)) }, -50, 900, 0.3},
		{func(x float64) float64 { return x }, 0, 5, 0},
		{func(x float64) float64 { return math.Pow(x-1, 9) }, -4, 90, 1},
	} {
		n := 0
		f := func(x float64) float64 { n++; return c.f(x) }
		got := root(f, c.a, c.b, c.f(c.a), c.f(c.b))
		if math.Abs(got-c.x) > rootWithin && c.f(got) != 0 {
			t.Errorf("root %g, want %g", got, c.x)
		}
		if n > 120 {
			t.Errorf("root %g took %d steps", c.x, n)
		}
	}
}

// TestSampleTurns: turning points are found wherever they fall, also by the
// ends, so that a dip under a limit between two samples is not missed.
func TestSampleTurns(t *testing.T) {
	for k := range 400 {
		dip := 5000 + float64(k)*13.7
		f := func(x float64) float64 { return 1 - math.Cos((x-dip)/86400*2*math.Pi) }
		c := sample(f, 4000, 11000, 1800)
		limit := 1 - math.Cos(30./86400*2*math.Pi) // 30 s either side
		in := c.below(limit)
		if len(in) != 1 || math.Abs(in[0].From-math.Max(4000, dip-30)) > 1e-3 || math.Abs(in[0].To-math.Min(11000, dip+30)) > 1e-3 {
			t.Fatalf("dip at %g: %v", dip, in)
		}
	}
}

// TestPassage reads the ways down and up from intervals that begin or end
// with the night.
func TestPassage(t *testing.T) {
	night := Interval{0, 100}
	nan := math.NaN()
	for _, c := range []struct {
		in   []Interval
		want Passage
	}{
		{nil, Passage{nan, nan, AlwaysAbove}},
		{[]Interval{{0, 100}}, Passage{nan, nan, AlwaysBelow}},
		{[]Interval{{20, 70}}, Passage{20, 70, Crosses}},
		{[]Interval{{20, 100}}, Passage{20, nan, SetsOnly}},
		{[]Interval{{0, 70}}, Passage{nan, 70, RisesOnly}},
		{[]Interval{{0, 30}, {60, 100}}, Passage{60, 30, Crosses}},
		{[]Interval{{10, 30}, {60, 80}}, Passage{10, 80, Crosses}},
	} {
		got := passage(c.in, night)
		if fmt.Sprint(got) != fmt.Sprint(c.want) {
			t.Errorf("%v: %v, want %v", c.in, got, c.want)
		}
	}
}
