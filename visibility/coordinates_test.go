package visibility

import (
	"math"
	"strconv"
	"testing"

	"pgregory.net/rapid"
)

func parse(t testing.TB, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// latDec reads "lat=30 dec=10".
func latDec(t testing.TB, s string) (lat, dec float64) {
	t.Helper()
	var a, b string
	for i := 4; i < len(s); i++ {
		if s[i] == ' ' {
			a, b = s[4:i], s[i+5:]
			break
		}
	}
	return parse(t, a), parse(t, b)
}

// TestKnownPlaces: the poles and centres of the systems.
func TestKnownPlaces(t *testing.T) {
	for _, c := range []struct {
		what             string
		system           Coordinates
		ra, dec          float64 // deg
		lon, lat, within float64
	}{
		// Hipparcos catalogue vol. 1, 1.5.3: pole 192.85948 +27.12825.
		{"galactic pole", Galactic, 192.85948, 27.12825, math.NaN(), 90, 1e-9},
		{"galactic centre", Galactic, 266.40499, -28.93617, 0, 0, 1e-4}, // from memory
		{"north celestial pole", Galactic, 0, 90, 122.93192, 27.12825, 1e-9},
		// Obliquity of J2000.0: 84381.406", IAU 2006; frame bias under 0.06".
		{"ecliptic pole", Ecliptic, 270, 90 - 84381.406/3600, math.NaN(), 90, 2e-5},
		{"equinox", Ecliptic, 0, 0, 0, 0, 2e-5},
		// Pollux: 116.328958 +28.026183 -> 113.215629 +6.684170; Meeus (1998), ch. 13, example 13.a.
		{"Pollux", Ecliptic, 116.328942, 28.026183, 113.215629, 6.684170, 3e-5},
		{"itself", Equatorial, 123, -45, 123, -45, 1e-12},
	} {
		lon, lat := c.system.FromICRS(c.ra*degree, c.dec*degree)
		if math.Abs(lat/degree-c.lat) > c.within*1.5 {
			t.Errorf("%s: latitude %v, want %v", c.what, lat/degree, c.lat)
		}
		if !math.IsNaN(c.lon) && math.Abs(turnDiff(lon, c.lon*degree))/degree > c.within*1.5 {
			t.Errorf("%s: longitude %v, want %v", c.what, lon/degree, c.lon)
		}
	}
}

// TestCoordinatesRoundTrip: out and back in is the same place.
func TestCoordinatesRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := Coordinates(rapid.IntRange(0, 2).Draw(t, "system"))
		ra := rapid.Float64Range(0, 6.2831853).Draw(t, "ra")
		dec := rapid.Float64Range(-math.Pi/2, math.Pi/2).Draw(t, "dec")
		lon, lat := c.FromICRS(ra, dec)
		if !(lon >= 0 && lon < 2*math.Pi && math.Abs(lat) <= math.Pi/2) {
			t.Fatalf("%v %v", lon, lat)
		}
		r, d := c.ToICRS(lon, lat)
		if off := angle(fromAngles(r, d), fromAngles(ra, dec)); off > 1e-14 {
			t.Fatalf("%v %v comes back %g rad away", ra, dec, off)
		}
	})
}
