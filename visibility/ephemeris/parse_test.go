package ephemeris

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// finalsLine writes one row as the IERS does, columns 1-68.
func finalsLine(year, month, day int, mjd float64, dut1 string) string {
	return fmt.Sprintf("%02d%2d%2d %8.2f I  0.082873 0.000059  0.263556 0.000045  I%10s", year, month, day, mjd, dut1)
}

func TestFinals2000AErrorsNameTheLine(t *testing.T) {
	good := finalsLine(17, 1, 1, 57754, "0.5912977") + "\n"
	for _, c := range []struct{ name, text, want string }{
		{"short", good + "17 1 2\n", "line 2: 6 characters"},
		{"no MJD", good + "17 1 2 57755,00 I\n", "line 2: MJD"},
		{"half a day", finalsLine(17, 1, 1, 57754.5, "0.5") + "\n", "line 1: MJD \"57754.50\" in columns 8-15 isn't a whole day"},
		{"date against MJD", finalsLine(17, 1, 2, 57754, "0.5"), "line 1: the date in columns 1-6 is 2017-01-02, MJD 57755, but columns 8-15 say MJD 57754"},
		{"no such day", finalsLine(17, 2, 30, 57754, "0.5"), "line 1: no such day"},
		{"letters", "ab c d 57754.00 I", "line 1: date"},
		{"value", finalsLine(17, 1, 1, 57754, "0.59x"), "line 1: UT1-UTC"},
		{"huge", finalsLine(17, 1, 1, 57754, "591.2977"), "line 1: UT1-UTC"},
		{"not a number", finalsLine(17, 1, 1, 57754, "NaN"), "line 1: UT1-UTC"},
		{"gap", good + finalsLine(17, 1, 3, 57756, "0.5"), "line 2: MJD 57756.00 follows 57754.00; one row a day"},
		{"twice", good + good, "line 2: MJD 57754.00 follows"},
		{"hole", good + "17 1 2 57755.00\n" + finalsLine(17, 1, 3, 57756, "0.5"), "line 2: columns 59-68 (UT1-UTC) are blank but later rows"},
		{"empty", "", "line 0: no row"},
		{"all blank", "17 1 2 57755.00\n", "line 1: no row"},
		{"endless line", good + strings.Repeat("x", 1<<17), "line 2: not a text line"},
	} {
		_, err := ParseFinals2000A(strings.NewReader(c.text))
		if err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q...", c.name, err, c.want)
		}
	}
	// Two-digit years turn over after MJD 51543 (1999-12-31).
	rows, err := ParseFinals2000A(strings.NewReader(finalsLine(99, 12, 31, 51543, "0.3555") + "\n\n" + finalsLine(0, 1, 1, 51544, "0.3554")))
	if err != nil || len(rows) != 2 || rows[1].DUT1 != 0.3554 {
		t.Errorf("%v, %v", rows, err)
	}
}

const leapGood = "#$\t3676924800\n#@\t4023129600\n2272060800\t10\t# 1 Jan 1972\n2287785600\t11\t# 1 Jul 1972\n"

func TestLeapSecondErrorsNameTheLine(t *testing.T) {
	for _, c := range []struct{ name, text, want string }{
		{"empty", "", "line 0: no leap seconds"},
		{"comments only", "# x\n#\n", "line 2: no leap seconds"},
		{"one column", "2272060800\n", "line 1: 1 columns"},
		{"three columns", "2272060800 10 3\n", "line 1: 3 columns"},
		{"not a number", "x 10\n", "line 1: \"x\"; whole seconds"},
		{"before 1972", "1000 10\n", "line 1: \"1000\"; whole seconds"},
		{"within a day", "2272060801 10\n", "line 1: 2272060801 isn't the start of a UTC day"},
		{"offset", "2272060800 ten\n", "line 1: TAI-UTC \"ten\""},
		{"offset too small", "2272060800 9\n", "line 1: TAI-UTC \"9\""},
		{"order", leapGood + "2287785600 12\n", "line 5: 2287785600 isn't after"},
		{"jump", leapGood + "2303683200 13\n", "line 5: TAI-UTC goes from 11 to 13 s"},
		{"expiry word", "#@ soon\n" + leapGood, "line 1: \"soon\""},
		{"expired before it ends", "#@ 2272060800\n2272060800 10\n2287785600 11\n", "line 3: the file expires before"},
		{"hash", leapGood + "#h 1 2 3 4 5\n", "line 5: the checksum"},
		{"hash groups", leapGood + "#h 1 2 3 4\n", "line 5: #h has 4 groups"},
		{"hash too long", leapGood + "#h 123456789 2 3 4 5\n", "line 5: the checksum"},
		{"endless line", leapGood + strings.Repeat("x", 1<<17), "line 5: not a text line"},
	} {
		_, err := ParseLeapSeconds(strings.NewReader(c.text))
		if err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q...", c.name, err, c.want)
		}
	}
}

// The checksum of the list issued with the tz database 2025 (figures and hash
// as published by the IERS) holds, and one changed digit breaks it.
func TestLeapSecondChecksum(t *testing.T) {
	var b strings.Builder
	b.WriteString("\ufeff# a byte order mark does no harm\r\n#$ 3960835200\r\n#@ 3991593600\r\n")
	for line := range strings.Lines(embeddedLeapSeconds) {
		if line[0] != '#' {
			b.WriteString(strings.TrimSpace(line) + "\r\n")
		}
	}
	b.WriteString("#h\t49db2447 571e5e1b 2f002a53 9c8da8e4 39b8e49e\r\n")
	table, err := ParseLeapSeconds(strings.NewReader(b.String()))
	if err != nil {
		t.Fatal(err)
	}
	if got := UTCFromUnix(table.Expires()).String(); got != "2026-06-28T00:00:00.000Z" {
		t.Errorf("expires %s", got)
	}
	damaged := strings.Replace(b.String(), "#@ 3991593600", "#@ 3991593601", 1)
	if _, err := ParseLeapSeconds(strings.NewReader(damaged)); err == nil {
		t.Error("a changed digit went unnoticed")
	}
}

// A negative leap second, which has never happened, shortens its day.
func TestNegativeLeapSecond(t *testing.T) {
	table, err := ParseLeapSeconds(strings.NewReader(leapGood + "2303683200 10\n"))
	if err != nil {
		t.Fatal(err)
	}
	if got := table.dayLength(2303683200 - ntpToUnix - 86400); got != 86399 {
		t.Errorf("%g s, want 86399", got)
	}
	if err := NewClock(table, Orientation{}).Check(UTC{41682, 86399.5}); err == nil {
		t.Error("a second that was left out passed")
	}
}

func FuzzParseLeapSeconds(f *testing.F) {
	f.Add(embeddedLeapSeconds)
	f.Add(leapGood)
	f.Add(leapGood + "#h 1 2 3 4 5\n")
	f.Add("2272060800 10")
	f.Fuzz(func(t *testing.T, text string) {
		table, err := ParseLeapSeconds(strings.NewReader(text))
		if err != nil {
			if !strings.HasPrefix(err.Error(), "line ") {
				t.Errorf("%q: no line in %v", text, err)
			}
			return
		}
		for i, from := range table.from {
			if table.At(from) != table.offset[i] || (i > 0 && table.At(from-1) != table.offset[i-1]) {
				t.Errorf("%q: row %d isn't found again", text, i)
			}
		}
	})
}

func FuzzParseFinals2000A(f *testing.F) {
	f.Add(finalsLine(17, 1, 1, 57754, "0.5912977") + "\n" + finalsLine(17, 1, 2, 57755, "0.59") + "\n17 1 3 57756.00\n")
	f.Add("16 2 1 57419.00 I -0.003225 0.000031  0.299494 0.000025  I 0.0262864 0.0000042  1.3154 0.0035")
	f.Add("\r\n\r\n")
	f.Fuzz(func(t *testing.T, text string) {
		rows, err := ParseFinals2000A(strings.NewReader(text))
		if err != nil {
			if !strings.HasPrefix(err.Error(), "line ") {
				t.Errorf("%q: no line in %v", text, err)
			}
			return
		}
		c := NewClock(nil, Orientation{Table: rows})
		for i, r := range rows {
			if i > 0 && r.MJD != rows[i-1].MJD+1 {
				t.Errorf("%q: rows %d and %d aren't a day apart", text, i, i+1)
			}
			if got := c.DUT1((r.MJD - 40587) * 86400); math.Abs(got-r.DUT1) > 1e-9 {
				t.Errorf("%q: %g at a row that says %g", text, got, r.DUT1)
			}
		}
	})
}

func FuzzParseUTC(f *testing.F) {
	f.Add("2016-12-31T23:59:60.250Z")
	f.Add("2027-02-01T03:04:05Z")
	f.Add("2027-02-01T03:04:05.Z")
	f.Fuzz(func(t *testing.T, s string) {
		u, err := ParseUTC(s)
		if err != nil {
			return
		}
		again, err := ParseUTC(u.String())
		if err != nil || again.MJD != u.MJD || math.Abs(again.Second-u.Second) > 1.001e-3 {
			t.Errorf("%q: %v, then %v (%v)", s, u, again, err)
		}
	})
}
