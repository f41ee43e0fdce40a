package ephemeris

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"time"
)

// ParseFinals2000A reads UT1-UTC (IERS Bulletin A, observed and predicted)
// from an IERS file finals2000A.all, .data or .daily: fixed columns, of which
// 1-6 (date), 8-15 (MJD, UTC) and 59-68 (UT1-UTC, s) are used, as the IERS
// readme for these files describes them. Rows at the end whose UT1-UTC is
// blank, where no prediction reaches, are left out. Errors start with
// "line N: ".
func ParseFinals2000A(r io.Reader) ([]DUT1Row, error) {
	var (
		rows  []DUT1Row
		blank int // first line without a value
		n     int
	)
	sc := bufio.NewScanner(r)
	for sc.Scan() {
		n++
		line := strings.TrimRight(strings.TrimPrefix(sc.Text(), "\ufeff"), " \t\r")
		if line == "" {
			continue
		}
		row, has, err := finalsRow(line)
		if err != nil {
			return nil, fmt.Errorf("line %d: %w", n, err)
		}
		if !has {
			if blank == 0 {
				blank = n
			}
			continue
		}
		if blank > 0 {
			return nil, fmt.Errorf("line %d: columns 59-68 (UT1-UTC) are blank but later rows have a value; only the end of the file may be blank", blank)
		}
		if k := len(rows); k > 0 && row.MJD != rows[k-1].MJD+1 {
			return nil, fmt.Errorf("line %d: MJD %.2f follows %.2f; one row a day, ascending, is wanted", n, row.MJD, rows[k-1].MJD)
		}
		rows = append(rows, row)
	}
	if err := sc.Err(); err != nil {
		return nil, fmt.Errorf("line %d: not a text line: %w", n+1, err)
	}
	if len(rows) == 0 {
		return nil, fmt.Errorf("line %d: no row with a value of UT1-UTC found; a file of the kind finals2000A is wanted", n)
	}
	return rows, nil
}

// finalsRow reads one line; has is false when UT1-UTC is blank.
func finalsRow(line string) (row DUT1Row, has bool, err error) {
	if len(line) < 15 {
		return row, false, fmt.Errorf("%d characters; at least 15 are wanted (date in columns 1-6, MJD in 8-15)", len(line))
	}
	mjd, err := strconv.ParseFloat(strings.TrimSpace(line[7:15]), 64)
	if err != nil || !(mjd >= 41317 && mjd < 100000) {
		return row, false, fmt.Errorf("MJD %q in columns 8-15; a number from 41317 (1972-01-01) to 99999 is wanted", line[7:15])
	}
	if mjd != math.Trunc(mjd) {
		return row, false, fmt.Errorf("MJD %q in columns 8-15 isn't a whole day; rows hold for 0h UTC", line[7:15])
	}
	date, err := finalsDate(line[:6], mjd)
	if err != nil {
		return row, false, err
	}
	if got := float64(date.Unix()/86400 + 40587); got != mjd {
		return row, false, fmt.Errorf("the date in columns 1-6 is %s, MJD %.0f, but columns 8-15 say MJD %.0f; both must be the same day", date.Format(time.DateOnly), got, mjd)
	}
	if len(line) < 59 {
		return row, false, nil
	}
	field := strings.TrimSpace(line[58:min(68, len(line))])
	if field == "" {
		return row, false, nil
	}
	v, err := strconv.ParseFloat(field, 64)
	if err != nil || !(math.Abs(v) < 100) {
		return row, false, fmt.Errorf("UT1-UTC %q in columns 59-68; seconds such as -0.0123456 are wanted", field)
	}
	return DUT1Row{MJD: mjd, DUT1: v}, true, nil
}

// finalsDate reads the two-digit year, month and day in columns 1-6, blank
// padded; the century follows from the MJD.
func finalsDate(cols string, mjd float64) (time.Time, error) {
	var v [3]int
	for i := range v {
		x, err := strconv.Atoi(strings.TrimSpace(cols[2*i : 2*i+2]))
		if err != nil || x < 0 {
			return time.Time{}, fmt.Errorf("date %q in columns 1-6; two digits each of year, month and day are wanted", cols)
		}
		v[i] = x
	}
	year := 1900 + v[0]
	if mjd > 51543 {
		year += 100
	}
	d := time.Date(year, time.Month(v[1]), v[2], 0, 0, 0, 0, time.UTC)
	if int(d.Month()) != v[1] || d.Day() != v[2] {
		return d, errors.New("no such day in the calendar: " + strconv.Quote(cols) + " in columns 1-6")
	}
	return d, nil
}
