package mount

import (
	"math"
	"testing"

	"nightwright/constraints/survey"

	"pgregory.net/rapid"
)

const deg = math.Pi / 180

// altaz is the mount of the worked values below: 3 deg/s, 1.5 deg/s^2, 3 s
// settle, 8 s readout, 45 s filter change. It reaches its rate after 2 s and
// 3 deg, so moves up to 6 deg are triangles.
func altaz() *survey.Telescope {
	return &survey.Telescope{
		Mount:        survey.Altazimuth,
		Slew:         survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3},
		Readout:      8,
		FilterChange: 45,
	}
}

func equatorial(flip *survey.Flip) *survey.Telescope {
	t := altaz()
	t.Mount, t.Flip = survey.Equatorial, flip
	return t
}

func near(t *testing.T, what string, got, want float64) {
	t.Helper()
	if math.Abs(got-want) > 1e-9 {
		t.Errorf("%s: got %.12f s, want %.12f s", what, got, want)
	}
}

// Values worked on paper from s = v^2/a, 2 sqrt(s/a) and s/v + v/a.
func TestAxisTimeByHand(t *testing.T) {
	tests := []struct {
		msg                      string
		delta, rate, accel, want float64
	}{
		{"no move", 0, 3, 1.5, 0},
		{"triangle: 1.5 deg takes 2 sqrt(1.5/1.5)", 1.5, 3, 1.5, 2},
		{"triangle, backwards", -1.5, 3, 1.5, 2},
		{"the longest triangle: 6 deg, 2 s up and 2 s down", 6, 3, 1.5, 4},
		{"trapezoid: 90/3 + 3/1.5", 90, 3, 1.5, 32},
		{"trapezoid: 180/1 + 1/0.25", 180, 1, 0.25, 184},
		{"a tenth of a degree: 2 sqrt(0.1/0.4)", 0.1, 2, 0.4, 1},
	}
	for _, tt := range tests {
		near(t, tt.msg, AxisTime(tt.delta*deg, tt.rate*deg, tt.accel*deg), tt.want)
	}
}

func TestAltazimuthGap(t *testing.T) {
	at := func(alt, az float64) Pointing { return Pointing{Altitude: alt * deg, Azimuth: az * deg} }
	tests := []struct {
		msg      string
		edit     func(*survey.Telescope)
		from, to Pointing
		filters  [2]int
		want     float64
	}{
		{"same place: readout alone, no settle", nil, at(50, 10), at(50, 10), [2]int{0, 0}, 8},
		{"a short slew hides behind the readout: 2 + 3 < 8", nil, at(50, 10), at(51.5, 10), [2]int{0, 0}, 8},
		{"slower axis counts: 30 deg of azimuth 12 s, 6 deg of altitude 4 s, settle 3 s", nil, at(50, 10), at(56, 40), [2]int{0, 0}, 15},
		{"shorter way round: 350 to 20 is 30 deg", nil, at(50, 350), at(50, 20), [2]int{0, 0}, 15},
		{"shorter way round, backwards", nil, at(50, 20), at(50, 350), [2]int{0, 0}, 15},
		{"half a turn: 60 + 2 + 3", nil, at(50, 0), at(50, 180), [2]int{0, 0}, 65},
		{"filter change comes after: 15 + 45", nil, at(50, 10), at(50, 40), [2]int{0, 1}, 60},
		{"filter change in place: 8 + 45", nil, at(50, 10), at(50, 10), [2]int{0, 1}, 53},
		{"change during the slew: the longer, 45", during, at(50, 10), at(50, 40), [2]int{0, 1}, 45},
		{"change during a long slew: 65", during, at(50, 0), at(50, 180), [2]int{0, 1}, 65},
		{"wrap: 350 lies at -10, the way to 20 is 30 deg", wrap(-180, 180), at(50, 350), at(50, 20), [2]int{0, 0}, 15},
		{"wrap: 190 lies at -170, the way to 170 is 340 deg: 340/3 + 2 + 3", wrap(-180, 180), at(50, 190), at(50, 170), [2]int{0, 0}, 340.0/3 + 5},
		{"wrap from 90 to 450: 80 lies at 440, 100 at 100", wrap(90, 450), at(50, 80), at(50, 100), [2]int{0, 0}, 340.0/3 + 5},
	}
	for _, tt := range tests {
		tel := altaz()
		if tt.edit != nil {
			tt.edit(tel)
		}
		near(t, tt.msg, Gap(tel, tt.from, tt.to, tt.filters[0], tt.filters[1], true, false), tt.want)
	}
}

func during(t *survey.Telescope) { t.DuringSlew = true }

func wrap(from, to float64) func(*survey.Telescope) {
	return func(t *survey.Telescope) {
		t.AzimuthRange = &survey.AzimuthRange{From: from * deg, To: to * deg}
	}
}

func TestEquatorialGap(t *testing.T) {
	at := func(ha, dec float64) Pointing { return Pointing{HourAngle: ha * deg, Declination: dec * deg} }
	flip := &survey.Flip{Time: 90, PastMeridian: 5 * deg}
	tests := []struct {
		msg              string
		flip             *survey.Flip
		from, to         Pointing
		fromEast, toEast bool
		want             float64
	}{
		{"30 deg of hour angle: 10 + 2 + 3", nil, at(-40, 20), at(-10, 20), true, true, 15},
		{"never past 12 h: -170 to 170 is 340 deg", nil, at(-170, 20), at(170, 20), true, false, 340.0/3 + 5},
		{"sides mean nothing without a flip", nil, at(-10, 20), at(20, 20), true, false, 15},
		{"a flip adds its time: 15 + 90", flip, at(-10, 20), at(20, 20), true, false, 105},
		{"same side: no flip, even past the meridian", flip, at(2, 20), at(-28, 20), true, true, 15},
		{"back over the meridian: 15 + 90", flip, at(20, 20), at(-10, 20), false, true, 105},
		{"a flip in place moves the mount, yet 3 s settle < 8 s readout: 8 + 90", flip, at(0, 20), at(0, 20), true, false, 98},
	}
	for _, tt := range tests {
		near(t, tt.msg, Gap(equatorial(tt.flip), tt.from, tt.to, 0, 0, tt.fromEast, tt.toEast), tt.want)
	}
	slow := equatorial(flip)
	slow.Slew.Settle = 20
	near(t, "a flip in place wants its settle: 20 + 90", Gap(slow, at(0, 20), at(0, 20), 0, 0, true, false), 110)
}

func TestUnwrap(t *testing.T) {
	tests := []struct {
		from, to, az, want float64
		ok                 bool
	}{
		{0, 360, 10, 10, true},
		{0, 360, -10, 350, true},
		{-180, 180, 190, -170, true},
		{-180, 180, 180, -180, true},
		{-30, 200, 250, 250, false},
		{-30, 200, 340, -20, true},
		{100, 150, 120, 120, true},
		{100, 150, 90, 450, false},
		{450, 810, 100, 460, true},
	}
	for _, tt := range tests {
		got, ok := Unwrap(survey.AzimuthRange{From: tt.from * deg, To: tt.to * deg}, tt.az*deg)
		if ok != tt.ok || math.Abs(got-tt.want*deg) > 1e-12 {
			t.Errorf("unwrap %g into [%g, %g]: got %g, %v; want %g, %v", tt.az, tt.from, tt.to, got/deg, ok, tt.want, tt.ok)
		}
	}
}

func anyPointing(t *rapid.T, name string) Pointing {
	return Pointing{
		Altitude:    rapid.Float64Range(0, math.Pi/2).Draw(t, name+" altitude"),
		Azimuth:     rapid.Float64Range(0, 2*math.Pi).Draw(t, name+" azimuth"),
		HourAngle:   rapid.Float64Range(-math.Pi, math.Pi).Draw(t, name+" hour angle"),
		Declination: rapid.Float64Range(-math.Pi/2, math.Pi/2).Draw(t, name+" declination"),
	}
}

// Laws of any mount: no gap is under the least one; the way back takes as
// long; a cable wrap never makes a slew shorter; a faster axis never slower.
func TestGapLaws(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := anyPointing(t, "a"), anyPointing(t, "b")
		f, g := rapid.IntRange(0, 2).Draw(t, "f"), rapid.IntRange(0, 2).Draw(t, "g")
		ea, eb := East(a), East(b)
		tel := altaz()
		if rapid.Bool().Draw(t, "equatorial") {
			tel = equatorial(&survey.Flip{Time: 60})
		}
		tel.DuringSlew = rapid.Bool().Draw(t, "during")
		there, back := Gap(tel, a, b, f, g, ea, eb), Gap(tel, b, a, g, f, eb, ea)
		if there < LeastGap(tel) {
			t.Fatalf("gap %g s under the least %g s", there, LeastGap(tel))
		}
		if math.Abs(there-back) > 1e-9 {
			t.Fatalf("there %g s, back %g s", there, back)
		}
		wrapped := *tel
		from := rapid.Float64Range(-2*math.Pi, 0).Draw(t, "from")
		wrapped.AzimuthRange = &survey.AzimuthRange{From: from, To: from + 2*math.Pi}
		if w := Gap(&wrapped, a, b, f, g, ea, eb); w < there-1e-9 {
			t.Fatalf("a wrap made %g s of %g s", w, there)
		}
		fast := *tel
		fast.Slew.Rate *= 1.5
		if q := Gap(&fast, a, b, f, g, ea, eb); q > there+1e-9 {
			t.Fatalf("a faster mount needs %g s, not %g s", q, there)
		}
	})
}

func BenchmarkGap(b *testing.B) {
	tel := altaz()
	var ps [64]Pointing
	for i := range ps {
		ps[i] = Pointing{Altitude: float64(30+i%50) * deg, Azimuth: float64(i*37%360) * deg}
	}
	sum, i := 0.0, 0
	for b.Loop() {
		sum += Gap(tel, ps[i&63], ps[(i+1)&63], i&1, i>>1&1, true, true)
		i++
	}
	if sum < 0 {
		b.Fatal("negative gaps")
	}
}
