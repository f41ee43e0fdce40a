package ephemeris

import "math"

// arcsec is one arcsecond in rad.
const arcsec = math.Pi / 180 / 3600

// EarthRotationAngle returns ERA for a UT1, rad in [0, 2 pi). Source: Capitaine,
// Guinot & McCarthy 2000, A&A 355, 398; IERS Conventions 2010, eq. 5.15.
func EarthRotationAngle(ut1 DayFraction) float64 {
	return earthRotation(float64(ut1.Day-51544)-0.5, ut1.Fraction)
}

// earthRotation takes UT1 days since J2000.0 in two parts, so that the whole
// days cost no precision of the angle.
func earthRotation(days, fraction float64) float64 {
	_, part := math.Modf(days)
	turns := part + fraction + 0.7790572732640 + 0.00273781191135448*(days+fraction)
	return turn * (turns - math.Floor(turns))
}

// GMST returns Greenwich mean sidereal time, rad in [0, 2 pi), from the Earth
// rotation angle and t (TT, Julian centuries since J2000.0). Source: IAU 2006,
// Capitaine, Wallace & Chapront 2003, A&A 412, 567.
func GMST(era, t float64) float64 {
	p := 0.014506 + t*(4612.156534+t*(1.3915817+t*(-0.00000044+t*(-0.000029956-3.68e-8*t))))
	return positive(era + p*arcsec)
}

// GAST returns Greenwich apparent sidereal time, rad in [0, 2 pi), from the
// Earth rotation angle and t (TT, Julian centuries since J2000.0): the angle
// less the equation of the origins. Error rms 0.5 mas, max 1.9 mas in
// 1972-2060, that of Nutation.
func GAST(era, t float64) float64 { return positive(era - EquationOfOrigins(t)) }

// positive brings an angle into [0, 2 pi).
func positive(a float64) float64 {
	a = math.Mod(a, turn)
	if a < 0 {
		a += turn
	}
	if a >= turn { // a tiny negative number, rounded up
		a = 0
	}
	return a
}
