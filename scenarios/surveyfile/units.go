package surveyfile

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"nightwright/constraints/survey"
	"nightwright/visibility/ephemeris"
)

const (
	degree = math.Pi / 180
	// milliarcsecond is one mas in rad.
	milliarcsecond = degree / 3600e3
	hourSeconds    = 3600.0
	daySeconds     = 86400.0
)

// wantDuration is what every message about a duration says would be right.
const wantDuration = "want a number with its unit, such as 90s, 10m, 12h, 3d or 1h30m"

var errNegative = errors.New("is negative")

// parseDuration reads 90s, 10m, 12h, 3d, 0.5h, or several from the larger
// unit to the smaller, such as 1h30m, as seconds. Plain 0 needs no unit.
func parseDuration(text string) (float64, error) {
	rest := strings.TrimSpace(text)
	if rest == "0" {
		return 0, nil
	}
	if strings.HasPrefix(rest, "-") {
		return 0, errNegative
	}
	var sum float64
	last := math.Inf(1)
	for first := true; first || rest != ""; first = false {
		n := strings.IndexFunc(rest, func(c rune) bool { return (c < '0' || c > '9') && c != '.' })
		if n < 0 && rest != "" {
			return 0, errors.New("has no unit")
		}
		if n <= 0 {
			return 0, errors.New("is no duration")
		}
		value, err := strconv.ParseFloat(rest[:n], 64)
		if err != nil {
			return 0, errors.New("is no duration")
		}
		unit := map[byte]float64{'s': 1, 'm': 60, 'h': hourSeconds, 'd': daySeconds}[rest[n]]
		if unit == 0 || (n+1 < len(rest) && (rest[n+1] < '0' || rest[n+1] > '9')) {
			return 0, fmt.Errorf("has the unit %q", strings.TrimSpace(rest[n:]))
		}
		if unit >= last {
			return 0, errors.New("does not go from the larger unit to the smaller")
		}
		sum += value * unit
		last, rest = unit, rest[n+1:]
	}
	return sum, nil
}

// formatDuration writes seconds the way parseDuration reads them.
func formatDuration(s float64) string {
	if s == 0 {
		return "0s"
	}
	for _, u := range []struct {
		name string
		size float64
	}{{"d", daySeconds}, {"h", hourSeconds}, {"m", 60}} {
		if s >= u.size && math.Mod(s, u.size) == 0 {
			return strconv.FormatFloat(s/u.size, 'f', -1, 64) + u.name
		}
	}
	return strconv.FormatFloat(s, 'f', -1, 64) + "s"
}

const wantInstant = "want an instant in UTC such as 2027-04-02T03:00:00Z"

// parseInstant reads an ISO 8601 instant with Z as UTC Unix seconds. Seconds
// may have a fraction or be left out; an instant inside a leap second is that
// of the second after.
func parseInstant(text string) (float64, error) {
	text = strings.TrimSpace(text)
	if t, err := time.Parse("2006-01-02T15:04Z", text); err == nil {
		return float64(t.Unix()), nil
	}
	if u, err := ephemeris.ParseUTC(text); err == nil {
		return u.Unix(), nil
	}
	if _, err := time.Parse(time.RFC3339, text); err == nil {
		return 0, errors.New("is not in UTC")
	}
	return 0, errors.New("is no instant")
}

// isDate tells a date from an instant by its shape.
func isDate(text string) bool {
	_, err := survey.ParseDay(strings.TrimSpace(text))
	return err == nil
}

// parseNumber reads a finite decimal number, as 12, -0.5 or 1e-3.
func parseNumber(text string) (float64, error) {
	text = strings.TrimSpace(text)
	switch strings.TrimLeft(strings.ToLower(text), "+-.") {
	case "nan", "inf", "infinity": // also YAML's own spelling, with a point
		return 0, errors.New("is not finite")
	}
	if strings.Trim(text, "0123456789+-.eE") != "" { // no hexadecimal, no _
		return 0, errors.New("is no number")
	}
	v, err := strconv.ParseFloat(text, 64)
	if errors.Is(err, strconv.ErrRange) {
		return 0, errors.New("is not finite")
	}
	if err != nil {
		return 0, errors.New("is no number")
	}
	return v, nil
}

const (
	wantRA  = "want degrees from 0 to below 360, or hours such as 12:34:56.7 or 12h34m56.7s"
	wantDec = "want degrees from -90 to 90, or such as -12:34:56.7 or -12d34m56.7s"
)

// parseRA reads a right ascension, in degrees or sexagesimal hours, as
// degrees; plain tells that it was written as degrees.
func parseRA(text string) (deg float64, plain bool, err error) {
	text = strings.TrimSpace(text)
	if strings.ContainsAny(text, ":h ") {
		hours, err := parseSexagesimal(text, 'h')
		if err != nil {
			return 0, false, err
		}
		if hours < 0 || hours >= 24 || text[0] == '-' {
			return 0, false, errors.New("is outside 0 to 24 hours")
		}
		return hours * 15, false, nil
	}
	deg, err = parseNumber(text)
	if err == nil && (deg < 0 || deg >= 360) {
		err = errors.New("is out of range")
	}
	return deg, true, err
}

// parseDec reads a declination, in degrees, plain or sexagesimal.
func parseDec(text string) (deg float64, err error) {
	text = strings.TrimSpace(text)
	if strings.ContainsAny(text, ":d ") {
		deg, err = parseSexagesimal(text, 'd')
	} else {
		deg, err = parseNumber(text)
	}
	if err == nil && (deg < -90 || deg > 90) {
		err = errors.New("is out of range")
	}
	return deg, err
}

// parseSexagesimal reads [+-]A:B[:C], A B C, or AuBmCs where u is the unit
// letter of A; minutes and seconds are below 60, and only the last part may
// have a fraction.
func parseSexagesimal(text string, unit byte) (float64, error) {
	bad := errors.New("is no sexagesimal number")
	sign, rest := 1.0, text
	switch {
	case strings.HasPrefix(rest, "-"):
		sign, rest = -1, rest[1:]
	case strings.HasPrefix(rest, "+"):
		rest = rest[1:]
	}
	var parts []string
	switch {
	case strings.ContainsRune(rest, ':'):
		parts = strings.Split(rest, ":")
	case strings.IndexByte(rest, unit) >= 0:
		for _, u := range []byte{unit, 'm', 's'} {
			before, after, ok := strings.Cut(rest, string(u))
			if !ok {
				break
			}
			parts, rest = append(parts, strings.TrimSpace(before)), strings.TrimSpace(after)
		}
		if rest != "" {
			return 0, bad
		}
	default:
		parts = strings.Fields(rest)
	}
	if len(parts) == 0 || len(parts) > 3 || (len(parts) == 1 && strings.IndexByte(text, unit) < 0) {
		return 0, bad
	}
	var sum float64
	scale := 1.0
	for i, p := range parts {
		if p == "" || strings.Trim(p, "0123456789.") != "" || (i < len(parts)-1 && strings.Contains(p, ".")) {
			return 0, bad
		}
		v, err := strconv.ParseFloat(p, 64)
		if err != nil {
			return 0, bad
		}
		if i > 0 && v >= 60 {
			return 0, errors.New("has minutes or seconds of 60 or more")
		}
		sum += v / scale
		scale *= 60
	}
	return sign * sum, nil
}
