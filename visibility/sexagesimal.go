package visibility

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
)

// Sexagesimal angles as catalogues write them: 12:34:56.7, 12 34 56.7 or
// 12h34m56.7s for hours; -05:06:07.8, -5 6 7.8, -5d06m07.8s or -5°06'07.8" for
// degrees. All three parts must be there, minutes and seconds under 60, and
// separators of one kind.

const sexagesimalTail = `(\d{1,2}(?:\.\d*)?)`

var (
	plainForms = []*regexp.Regexp{
		regexp.MustCompile(`^([+-]?)(\d{1,3}):(\d{1,2}):` + sexagesimalTail + `$`),
		regexp.MustCompile(`^([+-]?)(\d{1,3})[ \t]+(\d{1,2})[ \t]+` + sexagesimalTail + `$`),
	}
	hourForms = append([]*regexp.Regexp{
		regexp.MustCompile(`^([+-]?)(\d{1,3})[ ]?h[ ]?(\d{1,2})[ ]?m[ ]?` + sexagesimalTail + `[ ]?s$`),
	}, plainForms...)
	degreeForms = append([]*regexp.Regexp{
		regexp.MustCompile(`^([+-]?)(\d{1,3})[ ]?[d°][ ]?(\d{1,2})[ ]?[m'′][ ]?` + sexagesimalTail + `[ ]?[s"″]$`),
	}, plainForms...)
)

// sexagesimal reads three parts by any of the forms, in units of the first.
func sexagesimal(text string, forms []*regexp.Regexp, want string) (float64, error) {
	s := strings.ReplaceAll(strings.TrimSpace(text), "−", "-")
	for _, form := range forms {
		m := form.FindStringSubmatch(s)
		if m == nil {
			continue
		}
		// The forms let only digits and one point through.
		whole, _ := strconv.ParseFloat(m[2], 64)
		minutes, _ := strconv.ParseFloat(m[3], 64)
		seconds, err := strconv.ParseFloat(m[4], 64)
		switch {
		case err != nil:
			return 0, fmt.Errorf("seconds %q in %q are no number; want %s", m[4], text, want)
		case minutes >= 60:
			return 0, fmt.Errorf("%s minutes in %q; want 0 to 59", m[3], text)
		case seconds >= 60:
			return 0, fmt.Errorf("%s seconds in %q; want less than 60", m[4], text)
		}
		x := whole + (minutes+seconds/60)/60
		if m[1] == "-" {
			x = -x
		}
		return x, nil
	}
	return 0, fmt.Errorf("got %q; want %s", text, want)
}

const (
	wantHours   = "hours as 12:34:56.7, 12 34 56.7 or 12h34m56.7s"
	wantDegrees = "degrees as -05:06:07.8, -05 06 07.8 or -05d06m07.8s"
)

// ParseHours reads sexagesimal hours, 0 to 24 (24 excluded), as rad.
func ParseHours(text string) (float64, error) {
	h, err := sexagesimal(text, hourForms, wantHours)
	if err != nil {
		return 0, err
	}
	if h < 0 || h >= 24 || math.Signbit(h) {
		return 0, fmt.Errorf("%s is outside the day; want 00:00:00 to 23:59:59.9", text)
	}
	return h * 15 * degree, nil
}

// ParseDegrees reads sexagesimal degrees with or without a sign, -360 to 360, as rad.
func ParseDegrees(text string) (float64, error) {
	d, err := sexagesimal(text, degreeForms, wantDegrees)
	if err != nil {
		return 0, err
	}
	if math.Abs(d) > 360 {
		return 0, fmt.Errorf("%s is more than a turn; want -360 to 360 degrees", text)
	}
	return d * degree, nil
}

// ParseRightAscension reads a right ascension: a plain number is degrees, 0
// to 360 (360 excluded); with minutes and seconds it is hours. Result in rad.
func ParseRightAscension(text string) (float64, error) {
	if x, ok, err := decimal(text); ok {
		if err == nil && !(x >= 0 && x < 360) {
			err = fmt.Errorf("right ascension %s; want degrees from 0 to below 360, or %s", strings.TrimSpace(text), wantHours)
		}
		return x * degree, err
	}
	return ParseHours(text)
}

// ParseDeclination reads a declination in degrees, plain or sexagesimal, -90
// to 90. Result in rad.
func ParseDeclination(text string) (float64, error) {
	x, ok, err := decimal(text)
	if ok {
		x *= degree
	} else {
		x, err = ParseDegrees(text)
	}
	if err == nil && !(math.Abs(x) <= 90*degree) {
		err = fmt.Errorf("declination %s; want -90 to 90 degrees", strings.TrimSpace(text))
	}
	return x, err
}

// decimal reads a plain finite number; ok tells whether the text is one
// number at all.
func decimal(text string) (x float64, ok bool, err error) {
	s := strings.ReplaceAll(strings.TrimSpace(text), "−", "-")
	x, err = strconv.ParseFloat(s, 64)
	if err != nil && x == 0 {
		return 0, false, nil
	}
	if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, true, fmt.Errorf("got %q; want a finite number", text)
	}
	return x, true, nil
}

// FormatHours writes an angle (rad) as hours, HH:MM:SS with the given number
// of decimals (0 to 9) to the seconds, wrapped into 0 to 24 h.
func FormatHours(rad float64, decimals int) string {
	return sexagesimalText(wrapTurn(rad)/degree/15, decimals, 24, "")
}

// FormatDegrees writes an angle (rad) as signed degrees, +DD:MM:SS with the
// given number of decimals (0 to 9) to the seconds.
func FormatDegrees(rad float64, decimals int) string {
	sign := "+"
	if math.Signbit(rad) {
		sign = "-"
	}
	return sexagesimalText(math.Abs(rad)/degree, decimals, math.Inf(1), sign)
}

// sexagesimalText rounds first and splits then, so that no part shows 60.
func sexagesimalText(x float64, decimals int, turn float64, sign string) string {
	decimals = min(max(decimals, 0), 9)
	scale := math.Pow(10, float64(decimals))
	units := math.Round(x * 3600 * scale)
	if units >= turn*3600*scale {
		units -= turn * 3600 * scale
	}
	n := int64(units)
	second := int64(scale) * 60
	minutes := n / second
	seconds := strconv.FormatInt(n%second/int64(scale), 10)
	if len(seconds) < 2 {
		seconds = "0" + seconds
	}
	if decimals > 0 {
		seconds += fmt.Sprintf(".%0*d", decimals, n%int64(scale))
	}
	return fmt.Sprintf("%s%02d:%02d:%s", sign, minutes/60, minutes%60, seconds)
}
