package surveyfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"

	"nightwright/constraints/survey"
	"nightwright/visibility/ephemeris"
)

// orientation reads how UT1 follows from UTC, and the leap seconds.
func (l *loader) orientation(m *mapping) {
	o := m.group("earth_orientation", "earth_orientation")
	// UTC is kept within 0.9 s of UT1 (Recommendation ITU-R TF.460).
	l.sv.Orientation.DUT1, _ = o.number("dut1_s", span{low: -1, high: 1, unit: " s"})
	if o.has("dut1_s") && o.has("iers") {
		l.fault(o.at("iers"), "earth_orientation has both dut1_s and iers", "want one of them")
	}
	l.orientationFile(o, "iers", func(r io.Reader) error {
		table, err := ephemeris.ParseFinals2000A(r)
		l.sv.Orientation.Table = table
		return err
	})
	l.orientationFile(o, "leap_seconds", func(r io.Reader) error {
		table, err := ephemeris.ParseLeapSeconds(r)
		l.sv.LeapSeconds = table
		return err
	})
	if table := l.sv.Orientation.Table; len(table) > 0 && l.marks.period {
		first, last := mjdDay(table[0].MJD), mjdDay(table[len(table)-1].MJD)
		if l.sv.FirstNight < first || l.sv.LastNight+1 > last {
			l.warn(o.at("iers"), fmt.Sprintf("UT1-UTC is in the file from %s to %s, not for all nights from %s to %s", first, last, l.sv.FirstNight, l.sv.LastNight),
				"outside it the nearest value is held, which may be off by some tenths of a second")
		}
	}
}

// mjdDay is the date of a Modified Julian Date.
func mjdDay(mjd float64) survey.Day {
	const unixEpoch = 40587 // MJD of 1970-01-01
	return survey.Day(mjd - unixEpoch)
}

// orientationFile reads the file that a key names.
func (l *loader) orientationFile(o *mapping, key string, parse func(io.Reader) error) {
	const want = "want the name of such a file in the survey's folder"
	name, ok := o.text(key, want)
	if !ok {
		return
	}
	text, err := l.folder.read(filepath.FromSlash(name), MaxOrientationBytes)
	if err != nil {
		l.fault(o.at(key), fmt.Sprintf("%s: %q can't be read: %v", key, clip(name), reason(err)), want)
		return
	}
	if err := parse(bytes.NewReader(text)); err != nil {
		l.issues = append(l.issues, lineIssue(filepath.Join(l.folder.source.Root, name), err))
	}
}

// lineError finds the line in the parsers' messages, which have the form
// "line N: what is wrong; what is wanted".
var lineError = regexp.MustCompile(`^line (\d+): (.*)$`)

func lineIssue(file string, err error) Issue {
	i := Issue{File: file, Line: 1, What: err.Error()}
	if m := lineError.FindStringSubmatch(i.What); m != nil {
		n, _ := strconv.Atoi(m[1])
		i.Line, i.What = max(1, n), m[2]
	}
	if what, want, ok := strings.Cut(i.What, "; "); ok {
		i.What, i.Want = what, want
	}
	return i
}

// reason drops the operation and path of a file error: the message around it
// names them.
func reason(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}
