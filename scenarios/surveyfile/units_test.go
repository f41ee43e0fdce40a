package surveyfile

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

func TestDurations(t *testing.T) {
	for text, want := range map[string]float64{
		"90s": 90, "10m": 600, "12h": 43200, "3d": 259200, "1h30m": 5400, "1d12h": 129600, "1m30.5s": 90.5,
		"0.5h": 1800, "0": 0, "0s": 0, " 10m ": 600, ".5s": 0.5,
	} {
		if got, err := parseDuration(text); err != nil || got != want {
			t.Errorf("%q is %g, %v; want %g", text, got, err, want)
		}
	}
	for text, want := range map[string]string{
		"": "is no duration", "10": "has no unit", "m": "is no duration", "10min": `has the unit "min"`, "10 m": `has the unit "m"`,
		"-3d": "is negative", "30m1h": "does not go from the larger unit to the smaller", "1h1h": "does not go from the larger unit to the smaller",
		"1.2.3s": "is no duration", "1h30": "has no unit", "1e3s": `has the unit "e3s"`, "10M": `has the unit "M"`, "ten": "is no duration",
	} {
		if _, err := parseDuration(text); err == nil || err.Error() != want {
			t.Errorf("%q: %v; want %s", text, err, want)
		}
	}
}

func TestDurationsAreWrittenAsTheyAreRead(t *testing.T) {
	for s, want := range map[float64]string{0: "0s", 90: "90s", 600: "10m", 5400: "90m", 7200: "2h", 86400: "1d", 1.5: "1.5s"} {
		if got := formatDuration(s); got != want {
			t.Errorf("%g s is %q; want %q", s, got, want)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.Float64Range(0, 1e8).Draw(t, "seconds")
		if got, err := parseDuration(formatDuration(s)); err != nil || math.Abs(got-s) > 1e-12*s {
			t.Errorf("%g s came back as %g, %v", s, got, err)
		}
	})
}

// The positions are worked by hand: 15 degrees an hour, 60 minutes, 60 seconds.
func TestSexagesimal(t *testing.T) {
	for text, want := range map[string]float64{
		"12:34:56.7": 188.73625, "12h34m56.7s": 188.73625, "12 34 56.7": 188.73625, "12h 34m 56.7s": 188.73625,
		"0:00:00": 0, "12h": 180, "6:30": 97.5, "23:59:59.999": 359.99999583333334, "150.25": 150.25, "1e2": 100, "0": 0,
	} {
		if got, _, err := parseRA(text); err != nil || math.Abs(got-want) > 1e-12 {
			t.Errorf("right ascension %q is %.15g, %v; want %.15g", text, got, err, want)
		}
	}
	for text, want := range map[string]float64{
		"-12:34:56.7": -12.58241666666667, "-12d34m56.7s": -12.58241666666667, "-0:30:00": -0.5, "-0d30m": -0.5, "+45": 45, "-90": -90,
		"90:00:00": 90, "5d": 5, "-5 30 0": -5.5,
	} {
		if got, err := parseDec(text); err != nil || math.Abs(got-want) > 1e-12 {
			t.Errorf("declination %q is %.15g, %v; want %.15g", text, got, err, want)
		}
	}
	for _, text := range []string{"", "24:00:00", "-1:00:00", "-0:00:01", "12:60:00", "12:34:60", "12:34:56:78", "12h34", "12m", "h", ":", "12:", "1.5:30", "12h34s", "12h-3m", "NaN", "0x10", "361", "-0.1", "1_0", "١٢"} {
		if got, _, err := parseRA(text); err == nil {
			t.Errorf("right ascension %q is %g; want it refused", text, got)
		}
	}
	for _, text := range []string{"", "90:00:01", "-90.001", "12h34m", "d", "--5", "+-5", "5d60m", "5d5d"} {
		if got, err := parseDec(text); err == nil {
			t.Errorf("declination %q is %g; want it refused", text, got)
		}
	}
}

// Unix seconds by date -u -d.
func TestInstants(t *testing.T) {
	for text, want := range map[string]float64{
		"2027-04-02T03:00:00Z": 1806634800, "2027-04-02T03:00Z": 1806634800, "2027-04-02T03:00:00.25Z": 1806634800.25,
		"2016-12-31T23:59:60Z": 1483228800, " 1972-01-01T00:00:00Z ": 63072000,
	} {
		if got, err := parseInstant(text); err != nil || got != want {
			t.Errorf("%q is %f, %v; want %f", text, got, err, want)
		}
	}
	for text, want := range map[string]string{
		"2027-04-02T03:00:00+02:00": "is not in UTC", "2027-04-02": "is no instant", "2027-04-02 03:00:00": "is no instant",
		"2027-02-29T00:00:00Z": "is no instant", "2027-04-02T24:00:00Z": "is no instant", "": "is no instant",
	} {
		if _, err := parseInstant(text); err == nil || err.Error() != want {
			t.Errorf("%q: %v; want %s", text, err, want)
		}
	}
}

// The distances are counted by hand.
func TestDistance(t *testing.T) {
	for _, c := range []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"a", "", 1}, {"", "abc", 3}, {"readout", "readuot", 1}, {"wide", "wdie", 1}, {"slot", "slots", 1},
		{"separation", "seperation", 1}, {"abc", "xyz", 3}, {"ca", "abc", 3}, {"é", "e", 1},
	} {
		if got := distance(c.a, c.b); got != c.want {
			t.Errorf("%q to %q is %d; want %d", c.a, c.b, got, c.want)
		}
	}
	word := rapid.StringMatching(`[a-d]{0,6}`)
	rapid.Check(t, func(t *rapid.T) {
		a, b := word.Draw(t, "a"), word.Draw(t, "b")
		if distance(a, b) != distance(b, a) || (distance(a, b) == 0) != (a == b) || distance(a, b) > max(len(a), len(b)) {
			t.Errorf("%q, %q: %d and %d", a, b, distance(a, b), distance(b, a))
		}
	})
}

func TestNearest(t *testing.T) {
	known := []string{"altitude_min_deg", "airmass_max", "g", "r", "C1", "Salt Mesa"}
	for word, want := range map[string]string{
		"altitud_min_deg": "altitude_min_deg", "AIRMASS_MAX": "airmass_max", "airmas_max": "airmass_max", "G": "g", "gg": "g", "c2": "C1",
		"Slat Mesa": "Salt Mesa", "i": "", "zzzz": "", "": "",
	} {
		if got, _ := nearest(word, known); got != want {
			t.Errorf("%q is near %q; want %q", word, got, want)
		}
	}
}
