package ephemeris

import "math"

// MeanObliquity returns the mean obliquity of the ecliptic of date, rad; t is
// TT in Julian centuries since J2000.0. Source: IAU 2006, Hilton et al. 2006,
// Celest. Mech. Dyn. Astron. 94, 351.
func MeanObliquity(t float64) float64 {
	return (84381.406 + t*(-46.836769+t*(-0.0001831+t*(0.00200340+t*(-0.000000576-0.0000000434*t))))) * arcsec
}

// Nutation returns the nutation in longitude and obliquity, rad; t is TT in
// Julian centuries since J2000.0. Source: IAU 2000B (McCarthy & Luzum 2003,
// Celest. Mech. Dyn. Astron. 85, 37), adjusted to IAU 2006 precession (Wallace
// & Capitaine 2006, A&A 459, 981, eq. 5). Error against IAU 2000A in 1972-2060:
// dpsi rms 0.5 mas, max 2.1 mas; deps rms 0.2 mas, max 0.9 mas.
func Nutation(t float64) (dpsi, deps float64) {
	l, lp, f, d, om := moonSunArguments(t)
	for i := len(nutationTerms) - 1; i >= 0; i-- { // small ones first
		n := &nutationTerms[i]
		s, c := math.Sincos(n.l*l + n.lp*lp + n.f*f + n.d*d + n.om*om)
		dpsi += (n.sin+n.sinT*t)*s + n.outCos*c
		deps += (n.cos+n.cosT*t)*c + n.outSin*s
	}
	// Planetary terms as constants, from the same paper.
	dpsi = (dpsi*1e-7 - 0.000135) * arcsec
	deps = (deps*1e-7 + 0.000388) * arcsec
	j2 := -2.7774e-6 * t // secular change of the Earth's flattening
	return dpsi * (1 + 0.4697e-6 + j2), deps * (1 + j2)
}

// moonSunArguments returns the mean anomalies of Moon and Sun, the Moon's
// argument of latitude, its elongation and its node, rad. Source: Simon et
// al. 1994, A&A 282, 663, linear in t as IAU 2000B takes them.
func moonSunArguments(t float64) (l, lp, f, d, om float64) {
	return argument(485868.249036, 1717915923.2178, t),
		argument(1287104.79305, 129596581.0481, t),
		argument(335779.526232, 1739527262.8478, t),
		argument(1072260.70369, 1602961601.2090, t),
		argument(450160.398036, -6962890.5431, t)
}

// argument returns a + b t arcseconds as rad, brought within a turn.
func argument(a, b, t float64) float64 { return math.Mod(a+b*t, 1296000) * arcsec }
