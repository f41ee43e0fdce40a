package ephemeris

import "math"

// auKm is the astronomical unit in km (IAU 2012 B2).
const auKm = 149597870.7

// lightAuYear is the speed of light in au per Julian year.
const lightAuYear = 299792.458 * 86400 * 365.25 / auKm

// j2000Ecliptic turns the axes of the series (ecliptic of J2000.0 of the
// theory they come from) to GCRS, as ERFA's epv00 has them.
var j2000Ecliptic = Mat{
	{1, 0.000000211284, -0.000000091603},
	{-0.000000230286, 0.917482137087, -0.397776982902},
	{0, 0.397776982902, 0.917482137087},
}

// EarthVelocity returns the Earth's velocity about the barycentre of the
// solar system, in units of the speed of light, GCRS axes; t is TT (for TDB) in
// Julian centuries since J2000.0. Error against JPL DE405 in 2015-2045 as the
// aberration it would cause: rms 0.000012", max 0.00004" (9 mm/s); the same from
// 1972 to 2060.
func EarthVelocity(t float64) Vec {
	y := 100 * t
	var v Vec
	planeRate(earthPlane0[:], y, &v, 1, 0)
	planeRate(earthPlane1[:], y, &v, y, 1)
	planeRate(earthPlane2[:], y, &v, y*y, 2*y)
	heightRate(earthHeight0[:], y, &v, 1, 0)
	heightRate(earthHeight1[:], y, &v, y, 1)
	heightRate(earthHeight2[:], y, &v, y*y, 2*y)
	planeRate(sunPlane0[:], y, &v, 1, 0)
	heightRate(sunHeight0[:], y, &v, 1, 0)
	return j2000Ecliptic.Apply(v).Scale(1 / lightAuYear)
}

// SunGeocentric returns the geometric place of the Sun seen from the Earth's
// centre (no light time, no aberration), au, GCRS axes; t is TT (for TDB) in
// Julian centuries since J2000.0. Error against JPL DE405 in 2015-2045: rms
// 0.027", max 0.09", distance max 3e-7 au; 1972-2060: max 0.1".
func SunGeocentric(t float64) Vec {
	y := 100 * t
	var p Vec
	planeSum(earthPlane0[:], y, &p, 1)
	planeSum(earthPlane1[:], y, &p, y)
	planeSum(earthPlane2[:], y, &p, y*y)
	heightSum(earthHeight0[:], y, &p, 1)
	heightSum(earthHeight1[:], y, &p, y)
	heightSum(earthHeight2[:], y, &p, y*y)
	return j2000Ecliptic.Apply(p).Scale(-1)
}

// planeSum adds factor times the series to x and y.
func planeSum(terms []orbitPlane, y float64, p *Vec, factor float64) {
	var sx, sy float64
	for i := len(terms) - 1; i >= 0; i-- {
		n := &terms[i]
		s, c := math.Sincos(n.freq * y)
		sx += n.xc*c + n.xs*s
		sy += n.yc*c + n.ys*s
	}
	p[0] += factor * sx
	p[1] += factor * sy
}

// heightSum adds factor times the series to z.
func heightSum(terms []orbitHeight, y float64, p *Vec, factor float64) {
	var sz float64
	for i := len(terms) - 1; i >= 0; i-- {
		n := &terms[i]
		s, c := math.Sincos(n.freq * y)
		sz += n.zc*c + n.zs*s
	}
	p[2] += factor * sz
}

// planeRate adds the rate of change per Julian year of factor times the
// series, where the factor itself changes at the rate given.
func planeRate(terms []orbitPlane, y float64, v *Vec, factor, rate float64) {
	for i := len(terms) - 1; i >= 0; i-- {
		n := &terms[i]
		s, c := math.Sincos(n.freq * y)
		v[0] += factor*n.freq*(n.xs*c-n.xc*s) + rate*(n.xc*c+n.xs*s)
		v[1] += factor*n.freq*(n.ys*c-n.yc*s) + rate*(n.yc*c+n.ys*s)
	}
}

// heightRate is the same for z.
func heightRate(terms []orbitHeight, y float64, v *Vec, factor, rate float64) {
	for i := len(terms) - 1; i >= 0; i-- {
		n := &terms[i]
		s, c := math.Sincos(n.freq * y)
		v[2] += factor*n.freq*(n.zs*c-n.zc*s) + rate*(n.zc*c+n.zs*s)
	}
}
