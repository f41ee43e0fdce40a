package ephemeris

import "math"

// All matrices here turn GCRS vectors into the frame they name; t is TT in
// Julian centuries since J2000.0. Precession and frame bias are IAU 2006 as
// Fukushima-Williams angles (Hilton et al. 2006, Celest. Mech. Dyn. Astron.
// 94, 351; Wallace & Capitaine 2006, A&A 459, 981).

// precessionAngles returns gamma-bar, phi-bar and psi-bar, rad.
func precessionAngles(t float64) (gamma, phi, psi float64) {
	gamma = -0.052928 + t*(10.556378+t*(0.4932044+t*(-0.00031238+t*(-0.000002788+0.0000000260*t))))
	phi = 84381.412819 + t*(-46.811016+t*(0.0511268+t*(0.00053289+t*(-0.000000440-0.0000000176*t))))
	psi = -0.041775 + t*(5038.481484+t*(1.5584175+t*(-0.00018522+t*(-0.000026452-0.0000000148*t))))
	return gamma * arcsec, phi * arcsec, psi * arcsec
}

// MeanEcliptic turns to the mean ecliptic and equinox of date.
func MeanEcliptic(t float64) Mat {
	gamma, phi, psi := precessionAngles(t)
	return turnZ(-psi).Mul(turnX(phi)).Mul(turnZ(gamma))
}

// MeanEquator turns to the mean equator and equinox of date.
func MeanEquator(t float64) Mat { return turnX(-MeanObliquity(t)).Mul(MeanEcliptic(t)) }

// TrueEquator turns to the true equator and equinox of date.
func TrueEquator(t float64) Mat {
	dpsi, deps := Nutation(t)
	gamma, phi, psi := precessionAngles(t)
	return turnX(-(MeanObliquity(t) + deps)).Mul(turnZ(-(psi + dpsi))).Mul(turnX(phi)).Mul(turnZ(gamma))
}

// TrueEcliptic turns to the ecliptic of date with the true equinox, in which
// apparent ecliptic longitudes are counted.
func TrueEcliptic(t float64) Mat {
	dpsi, _ := Nutation(t)
	return turnZ(-dpsi).Mul(MeanEcliptic(t))
}

// CelestialToIntermediate turns to the celestial intermediate frame: true
// equator, right ascension from the celestial intermediate origin. Error
// against IAU 2006/2000A in 1972-2060: rms 0.4 mas, max 1 mas an element, that
// of Nutation.
func CelestialToIntermediate(t float64) Mat {
	m := TrueEquator(t)
	return intermediate(m[2], locator(t, m[2]))
}

// intermediate builds the frame from its pole and the locator of its origin.
func intermediate(pole Vec, s float64) Mat {
	r2 := pole[0]*pole[0] + pole[1]*pole[1]
	e := 0.0
	if r2 > 0 {
		e = math.Atan2(pole[1], pole[0])
	}
	return turnZ(-(e + s)).Mul(turnY(math.Atan(math.Sqrt(r2 / (1 - r2))))).Mul(turnZ(e))
}

// EquationOfOrigins returns ERA - GAST, rad: the right ascension of the
// celestial intermediate origin, sign changed. Source: Wallace & Capitaine
// 2006, A&A 459, 981, eq. 16.
func EquationOfOrigins(t float64) float64 {
	m := TrueEquator(t)
	return equationOfOrigins(m, locator(t, m[2]))
}

func equationOfOrigins(m Mat, s float64) float64 {
	x, y, z := m[2][0], m[2][1], m[2][2]
	a := x / (1 + z)
	sigma := Vec{1 - a*x, -a * y, -x}
	return s - math.Atan2(m[1].Dot(sigma), m[0].Dot(sigma))
}

// locatorTerm is one term of s + XY/2: power of t, multiples of l', F, D and
// Omega, sine and cosine amplitude in microarcseconds.
type locatorTerm struct {
	power        int
	l, lp        float64
	f, d, om     float64
	sine, cosine float64
}

// locatorTerms are those above 0.9 microarcseconds of IAU 2006's series for
// the locator (Capitaine et al. 2003, A&A 400, 1145, adjusted 2006; figures
// checked against ERFA's s06).
var locatorTerms = [...]locatorTerm{
	{0, 0, 0, 0, 0, 1, -2640.73, 0.39},
	{0, 0, 0, 0, 0, 2, -63.53, 0.02},
	{0, 0, 0, 2, -2, 3, -11.75, -0.01},
	{0, 0, 0, 2, -2, 1, -11.21, -0.01},
	{0, 0, 0, 2, -2, 2, 4.57, 0},
	{0, 0, 0, 2, 0, 3, -2.02, 0},
	{0, 0, 0, 2, 0, 1, -1.98, 0},
	{0, 0, 0, 0, 0, 3, 1.72, 0},
	{0, 0, 1, 0, 0, 1, 1.41, 0.01},
	{0, 0, 1, 0, 0, -1, 1.26, 0.01},
	{1, 0, 0, 0, 0, 2, -0.07, 3.57},
	{1, 0, 0, 0, 0, 1, 1.73, -0.03},
	{2, 0, 0, 0, 0, 1, 743.52, -0.17},
	{2, 0, 0, 2, -2, 2, 56.91, 0.06},
	{2, 0, 0, 2, 0, 2, 9.84, -0.01},
	{2, 0, 0, 0, 0, 2, -8.85, 0.01},
	{2, 0, 1, 0, 0, 0, -6.38, -0.05},
	{2, 1, 0, 0, 0, 0, -3.07, 0},
	{2, 0, 1, 2, -2, 2, 2.23, 0},
	{2, 0, 0, 2, 0, 1, 1.67, 0},
	{2, 1, 0, 2, 0, 2, 1.30, 0},
	{3, 0, 0, 0, 0, 1, 0.30, -23.42},
	{3, 0, 0, 2, -2, 2, -0.03, -1.46},
}

// locator returns the position s of the celestial intermediate origin on the
// equator whose pole is given, rad; error under 5 microarcseconds.
func locator(t float64, pole Vec) float64 {
	l, lp, f, d, om := moonSunArguments(t)
	w := [...]float64{94.00, 3808.65, -122.68, -72574.11, 27.98, 15.62}
	for i := range locatorTerms {
		n := &locatorTerms[i]
		s, c := math.Sincos(n.l*l + n.lp*lp + n.f*f + n.d*d + n.om*om)
		w[n.power] += n.sine*s + n.cosine*c
	}
	p := w[0] + t*(w[1]+t*(w[2]+t*(w[3]+t*(w[4]+t*w[5]))))
	return p*1e-6*arcsec - pole[0]*pole[1]/2
}

// turnX, turnY and turnZ turn the axes by an angle about one of them.
func turnX(a float64) Mat {
	s, c := math.Sincos(a)
	return Mat{{1, 0, 0}, {0, c, s}, {0, -s, c}}
}

func turnY(a float64) Mat {
	s, c := math.Sincos(a)
	return Mat{{c, 0, -s}, {0, 1, 0}, {s, 0, c}}
}

func turnZ(a float64) Mat {
	s, c := math.Sincos(a)
	return Mat{{c, s, 0}, {-s, c, 0}, {0, 0, 1}}
}
