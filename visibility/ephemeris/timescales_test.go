package ephemeris

import (
	"math"
	"strings"
	"testing"
)

// Every column of the time-scale table (ERFA 2.0.0.1; 27 of the 200 rows sit
// on leap-second edges, 9 of them inside 23:59:60).
func TestTimeScalesAgreeWithERFA(t *testing.T) {
	tab := readTable(t, "../../testdata/reference/timescales_public.csv")
	var tai, tt, ut1, tdb, era, gmst, gast, eo, dpsi, deps, eps, unixERA worst
	inside := 0
	for i := range tab.rows {
		u, err := ParseUTC(tab.text(i, "utc"))
		if err != nil {
			t.Fatalf("row %d: %v", i+1, err)
		}
		c := NewClock(nil, Orientation{DUT1: tab.num(i, "dut1_s")})
		if err := c.Check(u); err != nil {
			t.Errorf("row %d: %v", i+1, err)
		}
		diff := func(d DayFraction, prefix string) float64 {
			return (float64(d.Day) - tab.num(i, prefix+"_mjd_int") + d.Fraction - tab.num(i, prefix+"_mjd_frac")) * 86400
		}
		tai.add(diff(c.TAI(u), "tai"))
		tt.add(diff(c.TT(u), "tt"))
		ut1.add(diff(c.UT1(u), "ut1"))
		tdb.add(tab.num(i, "tdb_minus_tt_s")) // ignored by this package: how much is that?
		cent := c.CenturiesTT(u)
		a := EarthRotationAngle(c.UT1(u))
		era.add(angleError(a, tab.num(i, "era_deg")*degree) / degree)
		gmst.add(angleError(GMST(a, cent), tab.num(i, "gmst06_deg")*degree) / degree)
		gast.add(angleError(GAST(a, cent), tab.num(i, "gast06a_deg")*degree) / arcsec)
		eo.add((EquationOfOrigins(cent) - tab.num(i, "eo_deg")*degree) / arcsec)
		p, e := Nutation(cent)
		dpsi.add(p/arcsec - tab.num(i, "dpsi_arcsec"))
		deps.add(e/arcsec - tab.num(i, "deps_arcsec"))
		eps.add((MeanObliquity(cent) - tab.num(i, "eps_mean06_deg")*degree) / arcsec)
		if got := c.TAI(u).SinceJ2000() - u.Unix()/86400; strings.Contains(tab.text(i, "utc"), ":60.") {
			inside++ // Unix s repeat here, which the days since J2000 must not
			if math.Abs(c.TAIMinusUTC(u.Unix())-tab.num(i, "tai_utc_s")-1) > 0 {
				t.Errorf("row %d: Unix s inside a leap second must read as the second after it (%g)", i+1, got)
			}
			continue
		}
		if got, want := c.TAIMinusUTC(u.Unix()), tab.num(i, "tai_utc_s"); got != want {
			t.Errorf("row %d: TAI-UTC %g, want %g", i+1, got, want)
		}
		unixERA.add(angleError(c.ERA(u.Unix()), tab.num(i, "era_deg")*degree) / degree)
		if d := (c.Centuries(u.Unix()) - cent) * 36525 * 86400; math.Abs(d) > 1e-6 {
			t.Errorf("row %d: Centuries is %g s off CenturiesTT", i+1, d)
		}
	}
	if inside != 9 {
		t.Errorf("%d rows inside a leap second, want 9", inside)
	}
	// The table has 14 digits of a day (9e-10 s) and 10 of a degree.
	tai.check(t, "TAI, s", 1e-9)
	tt.check(t, "TT, s", 1e-9)
	ut1.check(t, "UT1, s", 1e-9)
	tdb.check(t, "TDB-TT, neglected, s", 1.7e-3)
	era.check(t, "ERA, deg", 1e-9)
	unixERA.check(t, "ERA from Unix s, deg", 2e-9)
	gmst.check(t, "GMST06, deg", 1e-9)
	// Below: IAU 2000B here against 2000A there, which its authors put at 1 mas
	// for 1995-2050.
	gast.check(t, "GAST06A, arcsec", 0.003)
	eo.check(t, "equation of origins, arcsec", 0.003)
	dpsi.check(t, "dpsi, arcsec", 0.003)
	deps.check(t, "deps, arcsec", 0.001)
	eps.check(t, "mean obliquity, arcsec", 1e-6)
}

// All 28 rows of the leap-second reference (IERS Bulletin C as in the tz
// database) and the second before each.
func TestEmbeddedLeapSeconds(t *testing.T) {
	tab := readTable(t, "../../testdata/reference/leap_seconds.csv")
	leap := EmbeddedLeapSeconds()
	if len(leap.from) != len(tab.rows) {
		t.Fatalf("%d rows, want %d", len(leap.from), len(tab.rows))
	}
	for i := range tab.rows {
		unix := (tab.num(i, "mjd_utc_start") - 40587) * 86400
		want := tab.num(i, "tai_minus_utc_s")
		if got := leap.At(unix); got != want {
			t.Errorf("%s: TAI-UTC %g, want %g", tab.text(i, "date"), got, want)
		}
		if i == 0 {
			continue
		}
		if got := leap.At(unix - 1e-3); got != want-1 {
			t.Errorf("just before %s: TAI-UTC %g, want %g", tab.text(i, "date"), got, want-1)
		}
		if got := leap.dayLength(unix - 86400); got != 86401 {
			t.Errorf("the day before %s has %g s, want 86401", tab.text(i, "date"), got)
		}
	}
	if got := UTCFromUnix(leap.Expires()).String(); got != "2027-06-28T00:00:00.000Z" {
		t.Errorf("expires %s, want 2027-06-28", got)
	}
	if got := NewClock(nil, Orientation{}).LeapExpires(); got != leap.Expires() {
		t.Errorf("the clock says the table expires %g", got)
	}
}

// Before 1972 the first value holds, after the end the last.
func TestLeapSecondsBeyondTheTable(t *testing.T) {
	leap := EmbeddedLeapSeconds()
	if got := leap.At(-1e9); got != 10 {
		t.Errorf("in 1938: %g, want 10", got)
	}
	if got := leap.At(4e9); got != 37 {
		t.Errorf("in 2096: %g, want 37", got)
	}
}
