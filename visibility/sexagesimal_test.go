package visibility

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestParseHours(t *testing.T) {
	for text, want := range map[string]float64{ // hours
		"00:00:00":        0,
		"12:34:56.7":      12 + 34./60 + 56.7/3600,
		" 12 34 56.7 ":    12 + 34./60 + 56.7/3600,
		"12h34m56.7s":     12 + 34./60 + 56.7/3600,
		"12h 34m 56.7s":   12 + 34./60 + 56.7/3600,
		"23:59:59.999999": 23 + 59./60 + 59.999999/3600,
		"5:6:7":           5 + 6./60 + 7./3600,
		"06:45:08.9173":   6.7524770, // Sirius, J2000: value from memory
	} {
		got, err := ParseHours(text)
		if err != nil || math.Abs(got/degree/15-want) > 1e-7 {
			t.Errorf("%q: %v h, %v; want %v", text, got/degree/15, err, want)
		}
	}
	for text, part := range map[string]string{
		"":              "want hours",
		"12":            "want hours",
		"12:34":         "want hours",
		"12:60:00":      "60 minutes",
		"12:34:60":      "less than 60",
		"24:00:00":      "outside the day",
		"-1:00:00":      "outside the day",
		"-0:00:00":      "outside the day",
		"12:34 56":      "want hours",
		"12d34m56s":     "want hours",
		"12.5:30:00":    "want hours",
		"12:34:56.7x":   "want hours",
		"12:34:5.6.7":   "want hours",
		"١٢:34:56":      "want hours",
		"12:34:56\x00":  "want hours",
		"1234:00:00":    "want hours",
		"12:34:56.7 pm": "want hours",
	} {
		if got, err := ParseHours(text); err == nil || !strings.Contains(err.Error(), part) {
			t.Errorf("%q: %v, %v; want an error with %q", text, got, err, part)
		}
	}
}

func TestParseDegrees(t *testing.T) {
	for text, want := range map[string]float64{
		"-05:06:07.8":   -(5 + 6./60 + 7.8/3600),
		"−05:06:07.8":   -(5 + 6./60 + 7.8/3600), // the typographic minus
		"+5 6 7.8":      5 + 6./60 + 7.8/3600,
		"-0:30:00":      -0.5,
		`-5°06'07.8"`:   -(5 + 6./60 + 7.8/3600),
		"5d06m07.8s":    5 + 6./60 + 7.8/3600,
		"359:59:59":     359 + 59./60 + 59./3600,
		"-16:42:58.017": -16.7161158, // Sirius, J2000: value from memory
	} {
		got, err := ParseDegrees(text)
		if err != nil || math.Abs(got/degree-want) > 1e-7 {
			t.Errorf("%q: %v deg, %v; want %v", text, got/degree, err, want)
		}
	}
	for _, text := range []string{"", "+", "5", "5:6", "361:00:00", "5h06m07s", "- 5:06:07", "5:-6:7", "5::7"} {
		if got, err := ParseDegrees(text); err == nil {
			t.Errorf("%q read as %v", text, got)
		}
	}
}

func TestParsePosition(t *testing.T) {
	for _, c := range []struct {
		text string
		want float64 // deg
		ok   bool
	}{
		{"187.5", 187.5, true}, {"12:30:00", 187.5, true}, {"1.875e2", 187.5, true},
		{"0", 0, true}, {"359.999999", 359.999999, true},
		{"360", 0, false}, {"361", 0, false}, {"-1", 0, false}, {"NaN", 0, false}, {"Inf", 0, false}, {"1e999", 0, false}, {"RA", 0, false},
	} {
		got, err := ParseRightAscension(c.text)
		if (err == nil) != c.ok || c.ok && math.Abs(got/degree-c.want) > 1e-12 {
			t.Errorf("right ascension %q: %v, %v", c.text, got/degree, err)
		}
	}
	for _, c := range []struct {
		text string
		want float64
		ok   bool
	}{
		{"-30.25", -30.25, true}, {"-30:15:00", -30.25, true}, {"90", 90, true}, {"-90:00:00", -90, true}, {"−0:15:00", -0.25, true},
		{"-95", 0, false}, {"90:00:01", 0, false}, {"nan", 0, false}, {"", 0, false}, {"5h00m00s", 0, false},
	} {
		got, err := ParseDeclination(c.text)
		if (err == nil) != c.ok || c.ok && math.Abs(got/degree-c.want) > 1e-12 {
			t.Errorf("declination %q: %v, %v", c.text, got/degree, err)
		}
	}
}

func TestFormat(t *testing.T) {
	for _, c := range []struct {
		got, want string
	}{
		{FormatHours(187.5*degree, 1), "12:30:00.0"},
		{FormatHours(-15*degree, 0), "23:00:00"},
		{FormatHours(2*math.Pi-1e-9, 2), "00:00:00.00"}, // rounds up to the full turn
		{FormatHours((11+59./60+59.96/3600)*15*degree, 1), "12:00:00.0"},
		{FormatDegrees(-30.25*degree, 0), "-30:15:00"},
		{FormatDegrees(-0.25*degree, 2), "-00:15:00.00"},
		{FormatDegrees(89.99999999*degree, 2), "+90:00:00.00"},
		{FormatDegrees(5.5*degree/3600, 3), "+00:00:05.500"},
		{FormatDegrees(123.5*degree, 0), "+123:30:00"},
	} {
		if c.got != c.want {
			t.Errorf("got %s, want %s", c.got, c.want)
		}
	}
}

// TestSexagesimalRoundTrip writes and reads any angle back to half a unit of
// the last decimal.
func TestSexagesimalRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		decimals := rapid.IntRange(0, 6).Draw(t, "decimals")
		half := 0.5 * math.Pow(10, -float64(decimals)) * degree / 3600 * 1.0001
		ra := rapid.Float64Range(0, 6.28).Draw(t, "ra")
		back, err := ParseHours(FormatHours(ra, decimals))
		if err != nil || math.Abs(turnDiff(back, ra)) > 15*half+1e-14 {
			t.Fatalf("%v h -> %s -> %v, %v", ra, FormatHours(ra, decimals), back, err)
		}
		dec := rapid.Float64Range(-math.Pi/2, math.Pi/2).Draw(t, "dec")
		back, err = ParseDegrees(FormatDegrees(dec, decimals))
		if err != nil || math.Abs(back-dec) > half+1e-14 {
			t.Fatalf("%v -> %s -> %v, %v", dec, FormatDegrees(dec, decimals), back, err)
		}
	})
}

// FuzzParseRightAscension: no text panics, and what is read is in range.
func FuzzParseRightAscension(f *testing.F) {
	for _, s := range []string{"12:34:56.7", "187.5", "12h34m56.7s", "-", "1e9", "−1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		if x, err := ParseRightAscension(s); err == nil && !(x >= 0 && x < 2*math.Pi) {
			t.Errorf("%q read as %v", s, x)
		}
		if x, err := ParseDeclination(s); err == nil && !(math.Abs(x) <= math.Pi/2) {
			t.Errorf("%q read as %v", s, x)
		}
	})
}
