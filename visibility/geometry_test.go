package visibility

import (
	"math"
	"strings"
	"testing"

	"nightwright/visibility/ephemeris"
)

// The facts of the trade: what any model of the sky must show.

// icrsOfDate returns the ICRS position whose apparent place has the given
// right ascension (from the intermediate origin) and declination of date.
func icrsOfDate(n *Instant, ra, dec float64) Position {
	target := fromAngles(ra, dec)
	v := n.matrix.Transpose().Apply(target)
	for range 5 { // undo aberration and deflection
		lon, lat := toAngles(v)
		p := Position{RA: lon, Dec: lat}
		d := n.sun.Norm()
		seen := n.matrix.Apply(aberrate(deflect(p.at(n.t), n.sun.Scale(-1/d), d), n.velocity, d))
		v = v.Add(n.matrix.Transpose().Apply(target.Sub(seen))).Unit()
	}
	lon, lat := toAngles(v)
	return Position{RA: lon, Dec: lat}
}

// TestPoleStandsAsHighAsLatitude (common practice).
func TestPoleStandsAsHighAsLatitude(t *testing.T) {
	n := exactWith(0).At(1.81e9)
	pole := icrsOfDate(n, 0, math.Pi/2)
	for _, lat := range []float64{-90, -45, 0, 31.7, 89.9, 90} {
		h := n.Star(Site{Latitude: lat * degree, Longitude: 1}, pole)
		// Diurnal aberration moves it by at most 0.32".
		if d := arcsec(h.Altitude - lat*degree); math.Abs(d) > 0.33 {
			t.Errorf("latitude %g: pole off by %g\"", lat, d)
		}
		if math.Abs(lat) < 89 && math.Abs(turnDiff(h.Azimuth, 0)) > 0.01*degree {
			t.Errorf("latitude %g: pole in azimuth %g", lat, h.Azimuth/degree)
		}
	}
}

// TestZenithPassage: a star whose declination equals the latitude passes
// through the zenith (common practice).
func TestZenithPassage(t *testing.T) {
	n := exactWith(0).At(1.81e9)
	for _, lat := range []float64{-77.6, -23.4, 0, 50} {
		s := Site{Latitude: lat * degree, Longitude: -0.7}
		h := n.Star(s, icrsOfDate(n, wrapTurn(n.Rotation+s.Longitude), s.Latitude))
		if d := arcsec(math.Pi/2 - h.Altitude); d > 0.33 {
			t.Errorf("latitude %g: %g\" from the zenith", lat, d)
		}
	}
}

// TestEquatorAtThePole: at the pole a star on the equator rides the horizon
// (common practice).
func TestEquatorAtThePole(t *testing.T) {
	e := exactWith(0)
	star := icrsOfDate(e.At(1.81e9), 1, 0)
	for k := range 24 {
		for _, lat := range []float64{-90, 90} {
			h := e.Star(Site{Latitude: lat * degree, Longitude: 0.5}, star, 1.81e9+3600*float64(k))
			if d := arcsec(h.Altitude); math.Abs(d) > 0.5 { // a day of precession and aberration
				t.Errorf("latitude %g, hour %d: altitude %g\"", lat, k, d)
			}
		}
	}
}

// TestCulminations: altitudes of upper and lower culmination, hour angle at
// altitude 30 deg and semi-diurnal arc by spherical trigonometry, from the
// reference table.
func TestCulminations(t *testing.T) {
	n := exactWith(0).At(1.81e9)
	found := 0
	for _, r := range table(t, "geometry_checks.csv") {
		var lat, dec float64
		i := strings.Index(r["quantity"], "lat=")
		if i < 0 {
			continue
		}
		lat, dec = latDec(t, r["quantity"][i:])
		s := Site{Latitude: lat * degree, Longitude: 0.3}
		at := func(ha float64) Horizontal {
			return n.Star(s, icrsOfDate(n, wrapTurn(n.Rotation+s.Longitude-ha), dec*degree))
		}
		value := r["value"]
		switch {
		case strings.HasPrefix(r["quantity"], "upper/lower"):
			parts := strings.Split(value, " / ")
			up, low := parse(t, parts[0])*degree, parse(t, parts[1])*degree
			if d := arcsec(at(0).Altitude - up); math.Abs(d) > 0.35 {
				t.Errorf("%s: upper off by %g\"", r["quantity"], d)
			}
			if d := arcsec(at(math.Pi).Altitude - low); math.Abs(d) > 0.35 {
				t.Errorf("%s: lower off by %g\"", r["quantity"], d)
			}
		case strings.HasPrefix(r["quantity"], "hour angle at altitude 30"):
			checkReach(t, r["quantity"], value, 30, at)
		default:
			checkReach(t, r["quantity"], value, 0, at)
		}
		found++
	}
	if found < 24 {
		t.Fatalf("%d rows", found)
	}
}

// checkReach checks the hour angle at which a star has an altitude (deg), or
// that it never has it.
func checkReach(t *testing.T, what, value string, alt float64, at func(float64) Horizontal) {
	t.Helper()
	top, bottom := at(0).Altitude/degree, at(math.Pi).Altitude/degree
	switch value {
	case "never reaches", "never rises":
		if top > alt {
			t.Errorf("%s: reaches %g", what, top)
		}
	case "circumpolar":
		if bottom < alt-1e-4 {
			t.Errorf("%s: comes down to %g", what, bottom)
		}
	default:
		ha := parse(t, value) * degree
		for _, side := range []float64{-1, 1} {
			if d := arcsec(at(side*ha).Altitude - alt*degree); math.Abs(d) > 0.35 {
				t.Errorf("%s: off by %g\"", what, d)
			}
		}
	}
}

// TestEquinoxes: the Sun's right ascension is 0, 6, 12, 18 h at equinoxes and
// solstices, at the instants of the reference table; obliquity as there.
func TestEquinoxes(t *testing.T) {
	found := 0
	for _, r := range table(t, "geometry_checks.csv") {
		hours := -1.0
		for name, h := range map[string]float64{"March eq": 0, "June sol": 6, "September eq": 12, "December sol": 18} {
			if strings.HasPrefix(r["quantity"], name) {
				hours = h
			}
		}
		if hours < 0 {
			continue
		}
		found++
		n := exactWith(0).At(instant(t, r["value"]))
		d := n.sun.Norm()
		c := n.matrix.Apply(aberrate(n.sun.Scale(1/d), n.velocity, d))
		ra, dec := toAngles(c)
		ra -= ephemeris.EquationOfOrigins(n.t)
		if off := arcsec(turnDiff(ra, hours*15*degree)); math.Abs(off) > 0.3 {
			t.Errorf("%s: right ascension off by %g\"", r["quantity"], off)
		}
		want := math.Sin(hours*15*degree) * 23.438
		if math.Abs(dec/degree-want) > 1e-3 {
			t.Errorf("%s: declination %g, want %g", r["quantity"], dec/degree, want)
		}
	}
	if found != 6 {
		t.Fatalf("%d rows, want 6", found)
	}
}

// TestHalfTheSphereIsUp at any time, anywhere (common practice).
func TestHalfTheSphereIsUp(t *testing.T) {
	e := exactWith(0)
	const n = 20000
	for k, s := range []Site{{0, 0, 0}, {1.2, -2, 500}, {-math.Pi / 2, 0, 2800}} {
		in := e.At(1.8e9 + 5000*float64(k))
		up := 0
		for i := range n { // a golden spiral covers the sphere evenly
			z := 1 - (2*float64(i)+1)/n
			p := Position{RA: math.Mod(float64(i)*math.Pi*(3-math.Sqrt(5)), 2*math.Pi), Dec: math.Asin(z)}
			if in.Star(s, p).Altitude > 0 {
				up++
			}
		}
		if f := float64(up) / n; math.Abs(f-0.5) > 0.002 {
			t.Errorf("site %d: %g of the sphere up", k, f)
		}
	}
}

// TestStarReturns after a sidereal day, 23 h 56 m 04 s, and the Sun after
// about a solar one (common practice; 86164.0905 s: Aoki et al. 1982).
func TestStarReturns(t *testing.T) {
	e := exactWith(0)
	s, p := Site{0.6, 1, 0}, Position{RA: 2, Dec: 0.3}
	a, b := e.Star(s, p, 1.8e9), e.Star(s, p, 1.8e9+86164.0905)
	if d := arcsec(Separation(a, b)); d > 1 {
		t.Errorf("off by %g\" after a sidereal day", d)
	}
	if d := arcsec(turnDiff(e.Star(s, p, 1.8e9+1).HourAngle, a.HourAngle)); math.Abs(d-15.041068) > 1e-3 {
		t.Errorf("hour angle grows by %g\" a second, want 15.041068\"", d)
	}
}

// TestParallaxes: the Moon stands lower than from the centre by up to its
// horizontal parallax, 53.9' to 61.5' (common practice).
func TestParallaxes(t *testing.T) {
	e := exactWith(0)
	least, most := math.Inf(1), 0.0
	for k := range 400 {
		m := e.Moon(Site{}, 1.8e9+86400*3.7*float64(k))
		if p := math.Asin(wgs84Km/m.DistanceKm) / degree * 60; m.Altitude < 0.02 && m.Altitude > -0.02 || k%10 == 0 {
			least, most = math.Min(least, p), math.Max(most, p)
		}
	}
	if least < 52.5 || most > 62.6 || most-least < 5 { // from the surface: a Moon overhead is 1.7 % nearer
		t.Errorf("parallax %g' to %g'", least, most)
	}
	h := e.Sun(Site{}, 1.8e9)
	if p := arcsec(wgs84Km / h.DistanceKm); math.Abs(p/8.794-1) > 0.02 {
		t.Errorf("Sun's parallax %g\"", p)
	}
}
