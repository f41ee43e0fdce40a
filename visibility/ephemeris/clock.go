package ephemeris

import (
	"fmt"
	"math"
	"sort"
)

// Clock converts UTC to the other time scales. It is immutable and safe for
// concurrent use.
//
// Instants are Unix s (leap seconds not counted) or UTC values, which also
// reach into leap seconds. TT is TAI + 32.184 s; TDB is taken as TT: they
// differ by less than 1.7 ms, in which the Moon moves by 0.9 mas.
type Clock struct {
	leap *LeapTable
	dut1 float64
	// rows in ascending MJD, with UT1-TAI instead of UT1-UTC: it has no steps.
	mjd, ut1tai []float64
	first, last DUT1Row
}

const (
	ttMinusTAI  = 32.184    // s, IAU 1991 A4
	j2000Unix   = 946728000 // 2000-01-01 12:00 as Unix s
	dayS        = 86400.0
	centuryDays = 36525.0
	turn        = 2 * math.Pi
)

// NewClock builds a clock; leap nil stands for the embedded table.
func NewClock(leap *LeapTable, o Orientation) *Clock {
	if leap == nil {
		leap = EmbeddedLeapSeconds()
	}
	c := &Clock{leap: leap, dut1: o.DUT1}
	if n := len(o.Table); n > 0 {
		c.first, c.last = o.Table[0], o.Table[n-1]
		c.mjd = make([]float64, n)
		c.ut1tai = make([]float64, n)
		for i, r := range o.Table {
			c.mjd[i] = r.MJD
			c.ut1tai[i] = r.DUT1 - leap.At((r.MJD-unixMJD)*dayS)
		}
	}
	return c
}

// LeapExpires returns the instant (Unix s) up to which the leap-second table
// is known to be complete, 0 when it doesn't say.
func (c *Clock) LeapExpires() float64 { return c.leap.expires }

// TableSpan returns the first and last instant (Unix s) that the table of
// UT1-UTC covers, and whether there is one.
func (c *Clock) TableSpan() (from, to float64, ok bool) {
	if len(c.mjd) == 0 {
		return 0, 0, false
	}
	return (c.first.MJD - unixMJD) * dayS, (c.last.MJD - unixMJD) * dayS, true
}

// Check says whether u exists: 23:59:60 does on the days of leap seconds only.
func (c *Clock) Check(u UTC) error {
	length := c.leap.dayLength(float64(u.MJD-unixMJD) * dayS)
	if u.Second < 0 || u.Second >= length {
		return fmt.Errorf("%v doesn't exist: that day has %.0f seconds", u, length)
	}
	return nil
}

// TAIMinusUTC returns TAI-UTC in s at Unix s.
func (c *Clock) TAIMinusUTC(unix float64) float64 { return c.leap.At(unix) }

// DUT1 returns UT1-UTC in s at Unix s: the constant, or between the table's
// rows UT1-TAI linear in time (error below 0.1 ms, the tides within a day),
// and beyond them the nearest row's value.
func (c *Clock) DUT1(unix float64) float64 {
	return c.dut1At(unix, c.leap.At(unix))
}

func (c *Clock) dut1At(unix, tai float64) float64 {
	n := len(c.mjd)
	if n == 0 {
		return c.dut1
	}
	d := unix/dayS + unixMJD
	switch {
	case !(d > c.mjd[0]): // also for NaN, which the search below couldn't place
		return c.first.DUT1
	case d >= c.mjd[n-1]:
		return c.last.DUT1
	}
	i := sort.SearchFloat64s(c.mjd, d) // mjd[i-1] < d <= mjd[i]
	a, b := c.mjd[i-1], c.mjd[i]
	return c.ut1tai[i-1] + (c.ut1tai[i]-c.ut1tai[i-1])*(d-a)/(b-a) + tai
}

// Centuries returns TT as Julian centuries since J2000.0, resolved to 0.2
// microseconds.
func (c *Clock) Centuries(unix float64) float64 {
	return (unix - j2000Unix + c.leap.At(unix) + ttMinusTAI) / (dayS * centuryDays)
}

// ERA returns the Earth rotation angle at Unix s, rad in [0, 2 pi). Error:
// that of UT1-UTC (15" a second) and 4e-6" of arithmetic.
func (c *Clock) ERA(unix float64) float64 {
	day := math.Floor(unix / dayS)
	return earthRotation(day-(j2000Unix/dayS-0.5)-0.5, (unix-day*dayS+c.DUT1(unix))/dayS)
}

// TAI converts to International Atomic Time.
func (c *Clock) TAI(u UTC) DayFraction {
	return DayFraction{Day: u.MJD}.Add((u.Second + c.offset(u)) / dayS)
}

// TT converts to Terrestrial Time.
func (c *Clock) TT(u UTC) DayFraction {
	return DayFraction{Day: u.MJD}.Add((u.Second + c.offset(u) + ttMinusTAI) / dayS)
}

// UT1 converts to Universal Time. Within a leap second UT1-UTC is that of the
// day it ends.
func (c *Clock) UT1(u UTC) DayFraction {
	return DayFraction{Day: u.MJD}.Add((u.Second + c.dut1At(u.Unix(), c.offset(u))) / dayS)
}

// offset is TAI-UTC of the day that holds u, leap second included.
func (c *Clock) offset(u UTC) float64 { return c.leap.At(float64(u.MJD-unixMJD) * dayS) }

// CenturiesTT returns TT as Julian centuries since J2000.0.
func (c *Clock) CenturiesTT(u UTC) float64 { return c.TT(u).SinceJ2000() / centuryDays }
