package ephemeris

import (
	"math"
	"strings"
	"testing"
)

// Worked examples of Meeus, Astronomical Algorithms (1998). All values here are
// from memory.

// centuriesOf converts a Julian Ephemeris Day.
func centuriesOf(jde float64) float64 { return (jde - 2451545) / 36525 }

// Example 47.a: the Moon, 1992 April 12, 0h TD. The book's longitude holds the
// mean light time of 1.29 s, 0.745" of the mean motion, which the geometric
// place here doesn't.
func TestMeeusMoon(t *testing.T) {
	lon, lat, dist := MoonEcliptic(centuriesOf(2448724.5))
	lightTime := (218.31665436 - 218.3164477) // deg, difference of the two constants
	if got := lon/degree - lightTime; math.Abs(got-133.162655) > 2e-6 {
		t.Errorf("longitude %.6f, want 133.162655 deg", got)
	}
	if got := lat / degree; math.Abs(got+3.229126) > 2e-6 {
		t.Errorf("latitude %.6f, want -3.229126 deg", got)
	}
	if math.Abs(dist-368409.7) > 0.06 {
		t.Errorf("distance %.2f, want 368409.7 km", dist)
	}
	// Apparent right ascension 134.688470 and declination 13.768368 deg: with
	// the older nutation the book used, good to 0.1".
	v := TrueEquator(centuriesOf(2448724.5)).Apply(MoonGeocentric(centuriesOf(2448724.5)))
	ra, dec := math.Atan2(v[1], v[0])/degree, math.Asin(v[2]/v.Norm())/degree
	if math.Abs(ra-lightTime*1.03-134.688470) > 5e-5 || math.Abs(dec-13.768368) > 7e-5 {
		t.Errorf("right ascension %.6f, declination %.6f; want 134.688470, 13.768368", ra, dec)
	}
}

// Example 25.b: the Sun, 1992 October 13, 0h TD: apparent longitude
// 199 deg 54' 21.818" (with -20.539" of aberration), latitude +0.721"
// and distance 0.99760853 au (complete VSOP87).
func TestMeeusSun(t *testing.T) {
	c := centuriesOf(2448908.5)
	v := TrueEcliptic(c).Apply(SunGeocentric(c))
	lon := math.Atan2(v[1], v[0])
	want := (199+54/60.0+21.818/3600)*degree + 20.539*arcsec
	if d := angleError(lon, want) / arcsec; math.Abs(d) > 0.3 {
		t.Errorf("longitude off by %g\"", d)
	}
	if lat := math.Asin(v[2]/v.Norm()) / arcsec; math.Abs(lat-0.721) > 0.2 {
		t.Errorf("latitude %g\", want 0.721", lat)
	}
	if math.Abs(v.Norm()-0.99760853) > 3e-7 {
		t.Errorf("distance %.8f, want 0.99760853", v.Norm())
	}
}

// Example 22.a: nutation and obliquity, 1987 April 10, 0h TD: dpsi -3.788",
// deps +9.443", mean obliquity 23 deg 26' 27.407", true 23 deg 26' 36.850",
// by the IAU 1980 theory and 1976 precession.
func TestMeeusNutation(t *testing.T) {
	c := centuriesOf(2446895.5)
	dpsi, deps := Nutation(c)
	// IAU 1980 and 2000 differ by some mas, and their precession constants by
	// 0.3" a century in longitude.
	if math.Abs(dpsi/arcsec+3.788) > 0.06 || math.Abs(deps/arcsec-9.443) > 0.02 {
		t.Errorf("nutation %.4f\" and %.4f\", want -3.788 and 9.443", dpsi/arcsec, deps/arcsec)
	}
	mean := MeanObliquity(c)
	if want := (23+26/60.0)*3600 + 27.407; math.Abs(mean/arcsec-want) > 0.06 {
		t.Errorf("mean obliquity %.4f\", want %.3f", mean/arcsec, want)
	}
	if want := (23+26/60.0)*3600 + 36.850; math.Abs((mean+deps)/arcsec-want) > 0.07 {
		t.Errorf("true obliquity %.4f\", want %.3f", (mean+deps)/arcsec, want)
	}
}

// Examples 12.a and 12.b: sidereal time at Greenwich, 1987 April 10: mean at
// 0h UT 13h 10m 46.3668s, apparent 13h 10m 46.1351s, mean at 19h 21m 00s UT
// 8h 34m 57.0896s, by the IAU 1982 formula.
func TestMeeusSiderealTime(t *testing.T) {
	hms := func(h, m, s float64) float64 { return (h + m/60 + s/3600) * 15 * degree }
	at := func(frac float64) (mean, apparent float64) {
		ut1 := DayFraction{Day: 46895, Fraction: frac}
		c := ut1.Add(55.8/86400).SinceJ2000() / 36525 // TT-UT1 of 1987
		era := EarthRotationAngle(ut1)
		return GMST(era, c), GAST(era, c)
	}
	mean, apparent := at(0)
	for _, x := range []struct {
		what      string
		got, want float64
	}{{"mean", mean, hms(13, 10, 46.3668)}, {"apparent", apparent, hms(13, 10, 46.1351)}} {
		if d := angleError(x.got, x.want) / arcsec / 15; math.Abs(d) > 0.005 {
			t.Errorf("%s off by %g s", x.what, d)
		}
	}
	mean, _ = at((19*3600 + 21*60) / 86400.0)
	if d := angleError(mean, hms(8, 34, 57.0896)) / arcsec / 15; math.Abs(d) > 0.005 {
		t.Errorf("mean in the evening off by %g s", d)
	}
}

// The obliquity at J2000.0 is 84381.406" (IAU 2006), and general precession
// 5028.796195" a century (Capitaine et al. 2003).
func TestPrecessionConstants(t *testing.T) {
	if got := MeanObliquity(0) / arcsec; math.Abs(got-84381.406) > 1e-9 {
		t.Errorf("obliquity %.6f\"", got)
	}
	// The equinox of date in the ecliptic of date one year either side: the
	// longitude of a fixed star grows by the general precession.
	star := MeanEcliptic(0)[0]
	lon := func(c float64) float64 {
		v := MeanEcliptic(c).Apply(star)
		return math.Atan2(v[1], v[0]) / arcsec
	}
	if got := (lon(0.01) - lon(-0.01)) / 0.02; math.Abs(got-5028.796195) > 0.001 {
		t.Errorf("%.6f\" a century, want 5028.796195", got)
	}
}

// Equinoxes and solstices of the reference table (Sun's apparent longitude 0,
// 90, 180 and 270 deg; ERFA epv00), and the trade's rule that its right
// ascension is 0 h in March and 12 h in September (common practice).
func TestEquinoxesAndSolstices(t *testing.T) {
	tab := readTable(t, "../../testdata/reference/geometry_checks.csv")
	clock := NewClock(nil, Orientation{})
	n := 0
	for i := range tab.rows {
		what := tab.text(i, "quantity")
		quarter := -1
		for k, name := range []string{"March equinox", "June solstice", "September equinox", "December solstice"} {
			if strings.HasPrefix(what, name) {
				quarter = k
			}
		}
		if quarter < 0 {
			continue
		}
		n++
		u, err := ParseUTC(tab.text(i, "value"))
		if err != nil {
			t.Fatalf("%s: %v", what, err)
		}
		c := clock.CenturiesTT(u)
		// The Sun hardly moves in its light time: aberration is all it takes.
		dir := SunGeocentric(c).Unit().Add(EarthVelocity(c))
		want := float64(quarter) * math.Pi / 2
		v := TrueEcliptic(c).Apply(dir)
		if d := angleError(math.Atan2(v[1], v[0]), want) / arcsec; math.Abs(d) > 0.15 {
			t.Errorf("%s: longitude off by %g\"", what, d)
		}
		// The Sun's latitude, up to 1", shows in right ascension.
		w := TrueEquator(c).Apply(dir)
		if d := angleError(math.Atan2(w[1], w[0]), want) / arcsec; math.Abs(d) > 1 {
			t.Errorf("%s: right ascension off by %g\"", what, d)
		}
	}
	if n != 6 {
		t.Fatalf("%d equinoxes and solstices in the table, want 6", n)
	}
}
