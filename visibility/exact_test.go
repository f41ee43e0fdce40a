package visibility

import (
	"math"
	"strconv"
	"sync"
	"testing"

	"nightwright/visibility/ephemeris"
)

// TestExactStars compares with ERFA's atco13 (IAU SOFA algorithms), airless,
// no polar motion: 2,000 fields, near pole, zenith, nadir, horizon and Sun.
// Separations are compared, because azimuth means nothing at the zenith.
func TestExactStars(t *testing.T) {
	var sep, ha, last, ra, dec worst
	for _, r := range table(t, "altaz_public.csv") {
		s := r.site(t)
		n := exactWith(r.num(t, "dut1_s")).At(r.unix(t))
		h := n.Star(s, Position{RA: r.rad(t, "ra_icrs_deg"), Dec: r.rad(t, "dec_icrs_deg")})
		at := r["id"] + " " + r["kind"]
		sep.see(arcsec(angle(h.Direction, seen(r.rad(t, "alt_deg"), r.rad(t, "az_deg")))), at)
		sep.see(arcsec(angle(h.Direction, seen(h.Altitude, h.Azimuth))), at)
		// On the sky: near the pole an hour angle means little.
		ha.see(arcsec(turnDiff(h.HourAngle, r.rad(t, "ha_deg")))*math.Cos(h.Declination), at)
		lst := n.SiderealTime(s.Longitude)
		last.see(arcsec(turnDiff(lst, r.rad(t, "last_deg"))), at)
		ra.see(arcsec(turnDiff(lst-h.HourAngle, r.rad(t, "ra_app_deg")))*math.Cos(h.Declination), at)
		dec.see(arcsec(h.Declination-r.rad(t, "dec_app_deg")), at)
	}
	sep.check(t, "direction, arcsec", 0.01)
	ha.check(t, "hour angle on the sky, arcsec", 0.01)
	last.check(t, "sidereal time, arcsec", 0.01)
	ra.check(t, "right ascension of date on the sky, arcsec", 0.01)
	dec.check(t, "declination of date, arcsec", 0.01)
}

// TestExactSunMoon compares with the reference chain over ERFA's epv00 and
// moon98, and over JPL DE405.
func TestExactSunMoon(t *testing.T) {
	rows := table(t, "sunmoon_public.csv")
	for _, source := range []struct {
		suffix         string
		sun, moon, lit float64
		distance       float64 // km
	}{
		{"", 0.15, 0.1, 1e-5, 1},
		{"_de405", 1, 20, 1e-3, 35},
	} {
		var sun, moon, lit, phase, dist, sunDist, between worst
		for _, r := range rows {
			s := r.site(t)
			n := exactWith(r.num(t, "dut1_s")).At(r.unix(t))
			x := func(col string) float64 { return r.rad(t, col+"_deg"+source.suffix) }
			at := r["id"] + " " + r["site"]
			a := n.Sun(s)
			sun.see(arcsec(angle(a.Direction, seen(x("sun_alt"), x("sun_az")))), at)
			sunDist.see(a.DistanceKm/auKm-r.num(t, "sun_dist_au"+source.suffix), at)
			m := n.Moon(s)
			moon.see(arcsec(angle(m.Direction, seen(x("moon_alt"), x("moon_az")))), at)
			dist.see(m.DistanceKm-r.num(t, "moon_dist_km"+source.suffix), at)
			lit.see(m.Illumination-r.num(t, "moon_illum"+source.suffix), at)
			phase.see(arcsec(m.PhaseAngle-x("moon_phase_angle")), at)
			between.see(arcsec(Separation(a.Horizontal, m.Horizontal)-x("sun_moon_sep")), at)
		}
		t.Run("against"+source.suffix, func(t *testing.T) {
			sun.check(t, "Sun, arcsec", source.sun)
			sunDist.check(t, "Sun's distance, au", 5e-7)
			moon.check(t, "Moon, arcsec", source.moon)
			dist.check(t, "Moon's distance, km", source.distance)
			lit.check(t, "lit fraction", source.lit)
			phase.check(t, "phase angle, arcsec", source.moon+1)
			between.check(t, "Sun to Moon, arcsec", source.moon+source.sun)
		})
	}
}

// TestDayTable compares the interpolated slow part with direct evaluation.
func TestDayTable(t *testing.T) {
	var c dayCache
	var matrix, velocity, sun, moon worst
	for k := range 400 {
		x := 0.2 + 0.15*float64(k)/400 + 1e-9*float64(k*k) // 2020 to 2035
		d, u := c.table(x)
		a, b := d.at(u), slowAt(x)
		at := strconv.FormatFloat(x, 'g', 12, 64)
		for i := range 3 {
			for j := range 3 {
				matrix.see(a.matrix[i][j]-b.matrix[i][j], at)
			}
		}
		velocity.see(a.velocity.Sub(b.velocity).Norm(), at)
		sun.see(a.sun.Sub(b.sun).Norm(), at)
		moon.see(a.moon.Sub(b.moon).Norm()/b.moon.Norm(), at)
		moon.see(d.moonAt(u-3.0/86400).Sub(ephemeris.MoonGeocentric(x-3.0/86400/36525)).Norm()/b.moon.Norm(), at)
	}
	matrix.check(t, "matrix", 1e-12)
	velocity.check(t, "velocity, c", 1e-12)
	sun.check(t, "Sun, au", 1e-11)
	moon.check(t, "Moon, parts", 1e-10)
}

// TestDayTableEdges: the tables of neighbouring days agree where they meet,
// and a day beyond the cache is evaluated all the same.
func TestDayTableEdges(t *testing.T) {
	a, b := newDayTable(9862).at(1), newDayTable(9863).at(0)
	if d := a.moon.Sub(b.moon).Norm(); d > 1e-4 {
		t.Errorf("Moon jumps by %g km at the edge of a day", d)
	}
	var c dayCache
	for _, x := range []float64{-1.5, 2.5} {
		d, u := c.table(x)
		if got, want := d.at(u).sun, ephemeris.SunGeocentric(x); got.Sub(want).Norm() > 1e-10 {
			t.Errorf("t = %g: Sun at %v, want %v", x, got, want)
		}
	}
}

// TestExactSameBits: a result doesn't depend on what was asked before or by whom.
func TestExactSameBits(t *testing.T) {
	s := Site{0.4, -1.1, 2100}
	instants := make([]float64, 200)
	want := make([]MoonBody, len(instants))
	for k := range instants {
		instants[k] = 1.8e9 + 7919.25*float64(k)
		want[k] = exactWith(0.1).Moon(s, instants[k])
	}
	shared := exactWith(0.1)
	var wg sync.WaitGroup
	for w := range 4 {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for k := range instants {
				k = (k*7 + w*50) % len(instants)
				if got := shared.Moon(s, instants[k]); got != want[k] {
					t.Errorf("instant %d: %v, want %v", k, got, want[k])
				}
			}
		}()
	}
	wg.Wait()
}

// TestProperMotion moves a star as far as it should go, on the great circle.
func TestProperMotion(t *testing.T) {
	// 10"/yr in right ascension at declination 60 deg, 20 years after J2000.
	p := Position{RA: 1, Dec: 60 * degree, PMRA: 10 * degree / 3600}
	moved := p.at(0.2)
	lon, lat := toAngles(moved)
	if got := arcsec(turnDiff(lon, 1)) * math.Cos(60*degree); math.Abs(got-200) > 0.4 {
		t.Errorf("moved %g\" in right ascension, want 200\" on the sky", got)
	}
	if got := arcsec(angle(moved, fromAngles(1, 60*degree))); math.Abs(got-200) > 1e-4 {
		t.Errorf("moved %g\", want 200\"", got)
	}
	if d := arcsec(lat - 60*degree); d > 0 || d < -0.3 {
		t.Errorf("a great circle eastwards bends to the equator; declination changed by %g\"", d)
	}
}

// TestInstantShared: one instant for many places gives the bits of one call each.
func TestInstantShared(t *testing.T) {
	e := exactWith(0.1)
	n := e.At(1.83e9)
	for _, s := range []Site{{0.5, -1, 2000}, {-1.2, 3, 10}, {math.Pi / 2, 0, 0}} {
		for _, p := range scatter(20) {
			if a, b := n.Star(s, p), exactWith(0.1).Star(s, p, 1.83e9); a != b {
				t.Errorf("star %v, want %v", a, b)
			}
		}
		if a, b := n.Sun(s), e.Sun(s, 1.83e9); a != b {
			t.Errorf("Sun %v, want %v", a, b)
		}
		if a, b := n.Moon(s), e.Moon(s, 1.83e9); a != b {
			t.Errorf("Moon %v, want %v", a, b)
		}
	}
	if c := n.Centuries(); math.Abs(c-0.2796) > 1e-3 { // 2028 minus 2000
		t.Errorf("%g centuries", c)
	}
}

// TestWrapTurn keeps angles in [0, 2 pi), rounding included.
func TestWrapTurn(t *testing.T) {
	for _, a := range []float64{0, -1e-300, -1e-17, 1e-17, 2 * math.Pi, -2 * math.Pi, 1e5, -1e5, math.Nextafter(2*math.Pi, 0)} {
		if w := wrapTurn(a); !(w >= 0 && w < 2*math.Pi) || math.Abs(turnDiff(w, a)) > 1e-9 {
			t.Errorf("%g wraps to %g", a, w)
		}
	}
}
