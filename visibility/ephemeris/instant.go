package ephemeris

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"
)

// UTC is an instant of Coordinated Universal Time that can also stand inside
// a leap second, which Unix seconds can't: the day and the seconds since its
// start, 86400 and more only within the leap second 23:59:60.
type UTC struct {
	MJD    int     // Modified Julian Date of the day
	Second float64 // SI seconds since 0h UTC, [0, 86401)
}

// DayFraction is an instant in a uniform scale (TAI, TT, UT1) as a Modified
// Julian Date in two parts, which keeps 1e-11 s.
type DayFraction struct {
	Day      int
	Fraction float64 // of 86400 s, [0, 1)
}

// unixMJD is 1970-01-01 as MJD.
const unixMJD = 40587

// UTCFromUnix converts Unix s (leap seconds not counted).
func UTCFromUnix(unix float64) UTC {
	day := math.Floor(unix / 86400)
	return UTC{MJD: int(day) + unixMJD, Second: unix - day*86400}
}

// Unix returns Unix s; 23:59:60.x gets the value of 00:00:00.x a second later,
// as POSIX counts.
func (u UTC) Unix() float64 {
	return float64(u.MJD-unixMJD)*86400 + u.Second
}

// ParseUTC reads ISO 8601 with Z, such as 2016-12-31T23:59:60.250Z; the
// fraction is optional. Whether that minute really had a leap second is not
// checked here but by Clock.Check.
func ParseUTC(s string) (UTC, error) {
	bad := func() (UTC, error) {
		return UTC{}, fmt.Errorf("%q isn't a UTC instant; one such as 2027-02-01T03:04:05Z is wanted", s)
	}
	if len(s) < 20 || s[10] != 'T' || s[len(s)-1] != 'Z' || s[16] != ':' {
		return bad()
	}
	minute, err := time.Parse("2006-01-02T15:04", s[:16])
	if err != nil {
		return bad()
	}
	word := s[17 : len(s)-1]
	if strings.Trim(word, "0123456789.") != "" || len(word) < 2 || (len(word) > 2 && (word[2] != '.' || len(word) == 3)) {
		return bad()
	}
	sec, err := strconv.ParseFloat(word, 64)
	if err != nil || sec >= 61 || (sec >= 60 && (minute.Hour() != 23 || minute.Minute() != 59)) {
		return bad()
	}
	day := minute.Truncate(24 * time.Hour)
	mjd := int(math.Floor(float64(day.Unix())/86400)) + unixMJD
	return UTC{MJD: mjd, Second: minute.Sub(day).Seconds() + sec}, nil
}

// String returns ISO 8601 with Z to the millisecond, truncated; inside a leap
// second the seconds read 60.
func (u UTC) String() string {
	day := time.Unix(int64(u.MJD-unixMJD)*86400, 0).UTC()
	// To the microsecond first: Unix s carry an error of that size.
	ms := int64(math.Round(u.Second*1e6)) / 1000
	if u.Second < 86400 {
		ms = min(ms, 86399999) // never a :60 that isn't there
	}
	minute := min(ms/60000, 1439)
	rest := ms - minute*60000
	return fmt.Sprintf("%sT%02d:%02d:%02d.%03dZ", day.Format(time.DateOnly), minute/60, minute%60, rest/1000, rest%1000)
}

// Add returns the instant the given number of days of 86400 s later.
func (d DayFraction) Add(days float64) DayFraction {
	f := d.Fraction + days
	n := math.Floor(f)
	f -= n
	if f >= 1 { // a tiny negative number, rounded up
		n, f = n+1, 0
	}
	return DayFraction{Day: d.Day + int(n), Fraction: f}
}

// SinceJ2000 returns the days since MJD 51544.5.
func (d DayFraction) SinceJ2000() float64 {
	return float64(d.Day-51544) + (d.Fraction - 0.5)
}
