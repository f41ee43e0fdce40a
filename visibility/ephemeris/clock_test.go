package ephemeris

import (
	"math"
	"os"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"
)

func unixOf(t *testing.T, s string) float64 {
	t.Helper()
	u, err := ParseUTC(s)
	if err != nil {
		t.Fatal(err)
	}
	return u.Unix()
}

// J2000.0 is 2000-01-01 12:00 TT = 11:58:55.816 UTC (IAU definition, with 32
// leap seconds' worth of TAI-UTC).
func TestCenturiesAtJ2000(t *testing.T) {
	c := NewClock(nil, Orientation{})
	if got := c.Centuries(unixOf(t, "2000-01-01T11:58:55.816Z")) * 36525 * 86400; math.Abs(got) > 1e-6 {
		t.Errorf("%g s from J2000.0, want 0", got)
	}
	// Within 2017..2027 TT-UTC = 69.184 s (IERS Bulletin C).
	u := UTC{MJD: 60000, Second: 1000}
	if got := c.TT(u); got.Day != 60000 || math.Abs(got.Fraction*86400-1069.184) > 1e-9 {
		t.Errorf("TT %v, want 60000 and 1069.184 s", got)
	}
}

// ERA at UT1 = J2000.0 is 0.7790572732640 turns = 280.46061837504 deg (Capitaine
// et al. 2000, the definition), and its period 86164.0989 s of UT1 is
// 23h56m04s (common practice).
func TestERAPeriod(t *testing.T) {
	c := NewClock(nil, Orientation{})
	if got := c.ERA(j2000Unix) / degree; math.Abs(got-280.46061837504) > 1e-9 {
		t.Errorf("ERA at J2000.0 %.12f deg, want 280.460618375040", got)
	}
	tab := readTable(t, "../../testdata/reference/geometry_checks.csv")
	period := 0.0
	for i := range tab.rows {
		if strings.HasPrefix(tab.text(i, "quantity"), "stellar day") {
			period = tab.num(i, "value")
		}
	}
	if d := period - (23*3600 + 56*60 + 4); d < 0 || d > 0.2 {
		t.Fatalf("the stellar day read is %g s", period)
	}
	rapid.Check(t, func(r *rapid.T) {
		unix := rapid.Float64Range(0, 3e9).Draw(r, "unix")
		if d := angleError(c.ERA(unix+period), c.ERA(unix)) / arcsec; math.Abs(d) > 2e-5 {
			r.Errorf("ERA moved by %g\" in one period", d)
		}
		e := c.ERA(unix)
		if !(e >= 0 && e < 2*math.Pi) {
			r.Errorf("ERA %g outside [0, 2 pi)", e)
		}
		if d := angleError(EarthRotationAngle(c.UT1(UTCFromUnix(unix))), e) / arcsec; math.Abs(d) > 2e-5 {
			r.Errorf("the two ways to ERA differ by %g\"", d)
		}
	})
}

// One second of DUT1 turns the Earth by 15.041" (1.0027 x 360 deg a day).
func TestDUT1Constant(t *testing.T) {
	a := NewClock(nil, Orientation{DUT1: 0.5})
	b := NewClock(nil, Orientation{DUT1: -0.5})
	got := angleError(a.ERA(1.8e9), b.ERA(1.8e9)) / arcsec
	if math.Abs(got-15.0410672) > 1e-5 {
		t.Errorf("%g\" a second, want 15.0410672", got)
	}
	if a.DUT1(1e9) != 0.5 {
		t.Error("the constant isn't used as it is")
	}
	if _, _, ok := a.TableSpan(); ok {
		t.Error("a span without a table")
	}
}

// Across the leap second at the end of 2016 UT1-UTC jumps by a second and
// UT1-TAI doesn't. Values: IERS EOP 14 C04.
func TestDUT1AcrossALeapSecond(t *testing.T) {
	rows := []DUT1Row{{57752, -0.4069175}, {57753, -0.4077492}, {57754, 0.5912977}, {57755, 0.5901980}}
	c := NewClock(nil, Orientation{Table: rows})
	for _, r := range rows {
		if got := c.DUT1((r.MJD - 40587) * 86400); math.Abs(got-r.DUT1) > 1e-9 {
			t.Errorf("MJD %g: %.7f, want %.7f", r.MJD, got, r.DUT1)
		}
	}
	noon := (57753.5 - 40587) * 86400
	want := (-0.4077492 + 0.5912977 - 1) / 2
	if got := c.DUT1(noon); math.Abs(got-want) > 1e-9 {
		t.Errorf("noon before the leap second: %.7f, want %.7f", got, want)
	}
	// UT1 goes on evenly from 23:59:59 over :60 to 00:00:00.
	last := c.UT1(UTC{57753, 86399}).SinceJ2000()
	in := c.UT1(UTC{57753, 86400}).SinceJ2000()
	next := c.UT1(UTC{57754, 0}).SinceJ2000()
	for _, step := range []float64{in - last, next - in} {
		if math.Abs(step*86400-1) > 2e-6 {
			t.Errorf("UT1 moved by %.9f s in a second", step*86400)
		}
	}
	// Beyond the rows the nearest value holds; nonsense gives nonsense, no panic.
	if got := c.ERA(math.NaN()); !math.IsNaN(got) {
		t.Errorf("ERA of NaN: %g", got)
	}
	if got := c.DUT1(0); got != -0.4069175 {
		t.Errorf("before the table: %g", got)
	}
	if got := c.DUT1(2e9); got != 0.5901980 {
		t.Errorf("after the table: %g", got)
	}
	from, to, ok := c.TableSpan()
	if !ok || from != (57752-40587)*86400 || to != (57755-40587)*86400 {
		t.Errorf("span %g to %g, %v", from, to, ok)
	}
}

func TestCheckFindsInventedLeapSeconds(t *testing.T) {
	c := NewClock(nil, Orientation{})
	for s, good := range map[string]bool{
		"2016-12-31T23:59:60Z":     true,
		"2016-12-31T23:59:60.999Z": true,
		"2017-12-31T23:59:60Z":     false,
		"2017-12-31T23:59:59.999Z": true,
	} {
		u, err := ParseUTC(s)
		if err != nil {
			t.Fatal(err)
		}
		if err := c.Check(u); (err == nil) != good {
			t.Errorf("%s: %v", s, err)
		}
	}
	if err := c.Check(UTC{57000, -1}); err == nil {
		t.Error("a negative second passed")
	}
}

func TestUTCInAndOut(t *testing.T) {
	for _, s := range []string{"2016-12-31T23:59:60.250Z", "1972-01-01T00:00:00.000Z", "2027-02-28T03:04:05.678Z", "1969-12-31T23:59:59.000Z"} {
		u, err := ParseUTC(s)
		if err != nil {
			t.Fatal(err)
		}
		if got := u.String(); got != s {
			t.Errorf("%s came back as %s", s, got)
		}
	}
	for _, s := range []string{
		"", "2027-02-01", "2027-02-01T03:04:05", "2027-02-29T03:04:05Z", "2027-02-01T24:00:00Z", "2027-02-01T03:04:60Z",
		"2027-02-01T23:59:61Z", "2027-02-01T03:04:5Z", "2027-02-01T03:04:05.Z", "2027-02-01T03:04:+5Z", "2027-02-01 03:04:05Z", "2027-02-01T03:04:05.1.2Z", "2027-02-01T03:04:05.5.Z",
	} {
		if u, err := ParseUTC(s); err == nil {
			t.Errorf("%q was read as %v", s, u)
		} else if !strings.Contains(err.Error(), "is wanted") {
			t.Errorf("%q: %v doesn't say what would be right", s, err)
		}
	}
	if got := (UTC{MJD: 57753, Second: 86399.9999999}).String(); got != "2016-12-31T23:59:59.999Z" {
		t.Errorf("%s, want 23:59:59.999", got)
	}
	rapid.Check(t, func(r *rapid.T) {
		ms := rapid.Int64Range(-2e12, 4e12).Draw(r, "ms")
		want := time.UnixMilli(ms).UTC().Format("2006-01-02T15:04:05.000Z")
		u := UTCFromUnix(float64(ms) / 1000)
		if got := u.String(); got != want {
			r.Errorf("%d ms: %s, want %s", ms, got, want)
		}
		if math.Abs(u.Unix()-float64(ms)/1000) > 1e-6 {
			r.Errorf("%d ms came back as %f", ms, u.Unix())
		}
	})
}

func TestDayFractionStaysInTheDay(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		d := DayFraction{Day: 60000, Fraction: rapid.Float64Range(0, 0.999999999).Draw(r, "f")}
		got := d.Add(rapid.Float64Range(-3, 3).Draw(r, "days"))
		if got.Fraction < 0 || got.Fraction >= 1 {
			r.Errorf("fraction %g", got.Fraction)
		}
	})
	if got := (DayFraction{Day: 5}).Add(-1e-300); got != (DayFraction{Day: 5}) {
		t.Errorf("%v, want day 5", got)
	}
}

// The rows of a real file: values read by eye.
func TestFinals2000ASample(t *testing.T) {
	f, err := os.Open("testdata/finals2000A.sample")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var b strings.Builder
	buf := make([]byte, 1<<16)
	n, _ := f.Read(buf)
	for line := range strings.Lines(string(buf[:n])) {
		if line[0] != '#' {
			b.WriteString(line)
		}
	}
	rows, err := ParseFinals2000A(strings.NewReader(b.String()))
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 12 || rows[0] != (DUT1Row{57502, -0.1251404}) || rows[11] != (DUT1Row{57513, -0.1424457}) {
		t.Errorf("%d rows, %v to %v", len(rows), rows[0], rows[len(rows)-1])
	}
	crlf := "\ufeff" + strings.ReplaceAll(b.String(), "\n", "\r\n")
	again, err := ParseFinals2000A(strings.NewReader(crlf))
	if err != nil || len(again) != 12 {
		t.Errorf("with byte order mark and CRLF: %d rows, %v", len(again), err)
	}
}
