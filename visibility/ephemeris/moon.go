package ephemeris

import "math"

// MoonGeocentric returns the geometric place of the Moon seen from the
// Earth's centre (no light time), km, GCRS axes; t is TT (for TDB) in Julian
// centuries since J2000.0. Source: Meeus 1998, Astronomical Algorithms, ch. 47.
// Error against JPL DE405 over 60,000 instants: 2015-2045 direction rms 3.0",
// max 14.9", distance rms 3 km, max 12 km; 1972-2060 max 17.4" and 13 km.
func MoonGeocentric(t float64) Vec {
	lon, lat, dist := MoonEcliptic(t)
	sl, cl := math.Sincos(lon)
	sb, cb := math.Sincos(lat)
	ecl := Vec{cl * cb, sl * cb, sb}.Scale(dist)
	return MeanEcliptic(t).Transpose().Apply(ecl)
}

// MoonEcliptic returns the Moon's geometric longitude and latitude, rad, on
// the mean ecliptic and equinox of date, and its distance, km.
func MoonEcliptic(t float64) (lon, lat, dist float64) {
	const degree = math.Pi / 180
	angle := func(deg float64) float64 { return math.Mod(deg, 360) * degree }
	// The book's 218.3164477 has the mean light time in it; this one, of Simon et
	// al. 1994, A&A 282, 663, is geometric.
	lp := angle(218.31665436 + t*(481267.88123421+t*(-0.0015786+t*(1/538841.0-t/65194000))))
	d := angle(297.8501921 + t*(445267.1114034+t*(-0.0018819+t*(1/545868.0-t/113065000))))
	m := angle(357.5291092 + t*(35999.0502909+t*(-0.0001536+t/24490000)))
	mp := angle(134.9633964 + t*(477198.8675055+t*(0.0087414+t*(1/69699.0-t/14712000))))
	f := angle(93.2720950 + t*(483202.0175233+t*(-0.0036539+t*(-1/3526000.0+t/863310000))))
	a1 := angle(119.75 + 131.849*t)
	a2 := angle(53.09 + 479264.290*t)
	a3 := angle(313.45 + 481266.484*t)
	e := 1 - t*(0.002516+0.0000074*t) // the Earth's orbit gets rounder
	ecc := [3]float64{1, e, e * e}

	var sl, sb, sr float64
	for i := len(moonLongitudeTerms) - 1; i >= 0; i-- {
		n := &moonLongitudeTerms[i]
		s, c := math.Sincos(float64(n.d)*d + float64(n.m)*m + float64(n.mp)*mp + float64(n.f)*f)
		k := ecc[max(n.m, -n.m)]
		sl += k * n.sin * s
		sr += k * n.cos * c
	}
	for i := len(moonLatitudeTerms) - 1; i >= 0; i-- {
		n := &moonLatitudeTerms[i]
		s := math.Sin(float64(n.d)*d + float64(n.m)*m + float64(n.mp)*mp + float64(n.f)*f)
		sb += ecc[max(n.m, -n.m)] * n.sin * s
	}
	sl += 3958*math.Sin(a1) + 1962*math.Sin(lp-f) + 318*math.Sin(a2)
	sb += -2235*math.Sin(lp) + 382*math.Sin(a3) + 175*(math.Sin(a1-f)+math.Sin(a1+f)) +
		127*math.Sin(lp-mp) - 115*math.Sin(lp+mp)
	return positive(lp + sl*1e-6*degree), sb * 1e-6 * degree, 385000.56 + sr/1000
}
