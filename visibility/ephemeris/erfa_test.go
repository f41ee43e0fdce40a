package ephemeris

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// matError is the largest difference of two matrices' elements.
func matError(a, b Mat) float64 {
	w := 0.0
	for i := range a {
		for j := range a[i] {
			w = math.Max(w, math.Abs(a[i][j]-b[i][j]))
		}
	}
	return w
}

// Rotation, precession and nutation against the IAU's algorithms, 2015-2045
// and six epochs from 1972 to 2060 (testdata/erfa.csv, from ERFA).
func TestOrientationAgreesWithERFA(t *testing.T) {
	tab := readTable(t, "testdata/erfa.csv")
	var dpsiB, depsB, dpsiA, depsA, eps, ecl, npb, c2i, s, eo, era, gmst, gast worst
	for i := range tab.rows {
		days := tab.num(i, "tt_days")
		c := days / 36525
		p, e := Nutation(c)
		dpsiB.add(p/arcsec - tab.num(i, "dpsi_b_arcsec"))
		depsB.add(e/arcsec - tab.num(i, "deps_b_arcsec"))
		dpsiA.add(p/arcsec - tab.num(i, "dpsi_a_arcsec"))
		depsA.add(e/arcsec - tab.num(i, "deps_a_arcsec"))
		eps.add(MeanObliquity(c)/arcsec - tab.num(i, "obliquity_arcsec"))
		ecl.add(matError(MeanEcliptic(c), tab.mat(i, "ecl")) / arcsec)
		m := TrueEquator(c)
		npb.add(matError(m, tab.mat(i, "npb")) / arcsec)
		c2i.add(matError(CelestialToIntermediate(c), tab.mat(i, "c2i")) / arcsec)
		// The locator at ERFA's own pole, so that nutation stays out of it.
		s.add(locator(c, tab.mat(i, "npb")[2])/arcsec - tab.num(i, "s_arcsec"))
		eo.add(EquationOfOrigins(c)/arcsec - tab.num(i, "eo_arcsec"))
		a := EarthRotationAngle(DayFraction{Day: 51544, Fraction: 0.5}.Add(days))
		era.add(angleError(a, tab.num(i, "era_deg")*degree) / arcsec)
		gmst.add(angleError(GMST(a, c), tab.num(i, "gmst_deg")*degree) / arcsec)
		gast.add(angleError(GAST(a, c), tab.num(i, "gast_deg")*degree) / arcsec)
	}
	// The same series: differences are those of rounding.
	dpsiB.check(t, "dpsi 2000B, arcsec", 1e-8)
	depsB.check(t, "deps 2000B, arcsec", 1e-8)
	eps.check(t, "obliquity, arcsec", 1e-8)
	ecl.check(t, "mean ecliptic, arcsec", 1e-8)
	era.check(t, "ERA, arcsec", 1e-6)
	gmst.check(t, "GMST, arcsec", 1e-6)
	s.check(t, "locator s, arcsec", 1e-5)
	// 2000B against 2000A.
	dpsiA.check(t, "dpsi against 2000A, arcsec", 0.003)
	depsA.check(t, "deps against 2000A, arcsec", 0.0015)
	npb.check(t, "true equator, arcsec", 0.003)
	c2i.check(t, "to intermediate, arcsec", 0.0015)
	eo.check(t, "equation of origins, arcsec", 0.003)
	gast.check(t, "GAST, arcsec", 0.003)
}

// Sun, Moon and the Earth's velocity against ERFA's epv00 and moon98.
func TestBodiesAgreeWithERFA(t *testing.T) {
	tab := readTable(t, "testdata/erfa.csv")
	var sun, sunAU, vel, moon, moonKm worst
	for i := range tab.rows {
		c := tab.num(i, "tt_days") / 36525
		p, q := SunGeocentric(c), tab.vec(i, "sun_x_au", "sun_y_au", "sun_z_au")
		sun.add(apart(p, q) / arcsec)
		sunAU.add(p.Norm() - q.Norm())
		vel.add(EarthVelocity(c).Sub(tab.vec(i, "vel_x_c", "vel_y_c", "vel_z_c")).Norm() / arcsec)
		p, q = MoonGeocentric(c), tab.vec(i, "moon_x_km", "moon_y_km", "moon_z_km")
		moon.add(apart(p, q) / arcsec)
		moonKm.add(p.Norm() - q.Norm())
	}
	sun.check(t, "Sun, arcsec", 0.15)
	sunAU.check(t, "Sun, au", 1e-6)
	vel.check(t, "aberration, arcsec", 1e-4)
	moon.check(t, "Moon, arcsec", 1e-4)
	moonKm.check(t, "Moon, km", 1e-3)
}

// The same against the JPL ephemeris DE405 (testdata/de405.csv), which is
// where the errors in the functions' comments come from.
func TestBodiesAgreeWithDE405(t *testing.T) {
	tab := readTable(t, "testdata/de405.csv")
	var sun, sunAU, vel, moon, moonKm, oldSun, oldVel, oldMoon worst
	for i := range tab.rows {
		c := tab.num(i, "tdb_days") / 36525
		p, q := SunGeocentric(c), tab.vec(i, "sun_x_au", "sun_y_au", "sun_z_au")
		v := EarthVelocity(c).Sub(tab.vec(i, "vel_x_c", "vel_y_c", "vel_z_c")).Norm() / arcsec
		m, n := MoonGeocentric(c), tab.vec(i, "moon_x_km", "moon_y_km", "moon_z_km")
		if c < 0.15 || c > 0.45 { // 1972-2015 and 2045-2060
			oldSun.add(apart(p, q) / arcsec)
			oldVel.add(v)
			oldMoon.add(apart(m, n) / arcsec)
			continue
		}
		sun.add(apart(p, q) / arcsec)
		sunAU.add(p.Norm() - q.Norm())
		vel.add(v)
		moon.add(apart(m, n) / arcsec)
		moonKm.add(m.Norm() - n.Norm())
	}
	sun.check(t, "Sun, arcsec", 0.15)
	sunAU.check(t, "Sun, au", 1e-6)
	vel.check(t, "aberration, arcsec", 0.003)
	moon.check(t, "Moon, arcsec", 15)
	moonKm.check(t, "Moon, km", 15)
	oldSun.check(t, "Sun before and after, arcsec", 0.2)
	oldVel.check(t, "aberration before and after", 0.003)
	oldMoon.check(t, "Moon before and after", 18)
}

// Every matrix is a rotation.
func TestMatricesAreRotations(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		c := rapid.Float64Range(-0.5, 0.8).Draw(r, "t")
		for name, m := range map[string]Mat{
			"mean ecliptic": MeanEcliptic(c), "true ecliptic": TrueEcliptic(c), "mean equator": MeanEquator(c),
			"true equator": TrueEquator(c), "intermediate": CelestialToIntermediate(c),
		} {
			if e := matError(m.Mul(m.Transpose()), Mat{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}); e > 1e-15*4 {
				r.Errorf("%s: M M' is %g from one", name, e)
			}
			if det := m[0].Cross(m[1]).Dot(m[2]); math.Abs(det-1) > 1e-14 {
				r.Errorf("%s: determinant %g", name, det)
			}
		}
	})
}

// What the frames mean: the intermediate and the true equator share their
// pole and differ in right ascension by the equation of the origins; the mean
// and true ecliptic share their pole; GAST - GMST is dpsi cos(eps) to 3 mas
// (the complementary terms; IERS Conventions 2010, section 5.5.7).
func TestFramesHangTogether(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		c := rapid.Float64Range(-0.28, 0.6).Draw(r, "t")
		q, m := CelestialToIntermediate(c), TrueEquator(c)
		if e := matError(q, turnZ(-EquationOfOrigins(c)).Mul(m)); e > 1e-14 {
			r.Errorf("the equation of the origins leaves %g", e)
		}
		if d := apart(MeanEcliptic(c)[2], TrueEcliptic(c)[2]); d > 1e-15 {
			r.Errorf("ecliptic poles %g apart", d)
		}
		dpsi, deps := Nutation(c)
		if d := angleError(GAST(1, c)-GMST(1, c), dpsi*math.Cos(MeanObliquity(c)+deps)) / arcsec; math.Abs(d) > 0.003 {
			r.Errorf("equation of the equinoxes off by %g\"", d)
		}
		// The true equator is inclined to the ecliptic by the true obliquity.
		if d := apart(m[2], TrueEcliptic(c)[2]) - MeanObliquity(c) - deps; math.Abs(d) > 1e-14 {
			r.Errorf("obliquity off by %g", d)
		}
	})
}

// The Earth's velocity is the rate of change of its place: against central
// differences of SunGeocentric, less the Sun's own 16 m/s at most (common
// practice: the Sun moves about the barycentre by some 13 m/s for Jupiter).
func TestVelocityIsTheRateOfPlace(t *testing.T) {
	const h = 0.01 / 36525 // 0.01 d
	rapid.Check(t, func(r *rapid.T) {
		c := rapid.Float64Range(-0.28, 0.6).Draw(r, "t")
		helio := SunGeocentric(c - h).Sub(SunGeocentric(c + h)).Scale(1 / (200 * h * lightAuYear))
		sun := EarthVelocity(c).Sub(helio).Norm() * 299792458
		if sun < 5 || sun > 17 {
			r.Errorf("the Sun moves at %g m/s", sun)
		}
		if v := EarthVelocity(c).Norm() / arcsec; v < 20.1 || v > 20.9 {
			r.Errorf("aberration %g\", want 20.5 within 1.7 %%", v)
		}
	})
}

// The Moon and the Sun move without a break, also where arguments wrap.
func TestBodiesMoveSmoothly(t *testing.T) {
	const minute = 1.0 / 1440 / 36525
	rapid.Check(t, func(r *rapid.T) {
		c := rapid.Float64Range(-0.28, 0.6).Draw(r, "t")
		// Moon: 11.8 to 15.4 deg a day (common practice), 30 to 38" a minute.
		if d := apart(MoonGeocentric(c), MoonGeocentric(c+minute)) / arcsec; d < 28 || d > 40 {
			r.Errorf("the Moon moved by %g\" in a minute", d)
		}
		if d := apart(SunGeocentric(c), SunGeocentric(c+minute)) / arcsec; d < 2.3 || d > 2.65 {
			r.Errorf("the Sun moved by %g\" in a minute", d)
		}
	})
}
