package visibility

import (
	"fmt"
	"math"
)

// Sky brightness and the quality of an exposure, written plainly and slowly:
// the oracle of the tables that windows and search run on.
//
// Fluxes are 10^(-0.4 m), m in mag/arcsec^2, so that dark sky, moonlight and
// twilight add.

// Geometry is what the sky's brightness at a field depends on; altitudes are
// airless and topocentric.
type Geometry struct {
	SinAltitude    float64 // sine of the field's altitude
	SunAltitude    float64 // rad
	MoonAltitude   float64 // rad; the Moon gives light while it is above 0
	MoonSeparation float64 // field to Moon, rad
	MoonPhaseAngle float64 // Sun-Moon-observer angle at the Moon, rad; 0 at full Moon
}

const degree = math.Pi / 180

// Krisciunas & Schaefer (1991), PASP 103, 1033, eq. 1: nanolamberts from a V
// surface brightness, B = 34.08 exp(20.7233 - 0.92104 V).
const (
	nanolambertScale = 34.08
	nanolambertZero  = 20.7233
	nanolambertSlope = 0.92104
)

// nanolamberts turns a V surface brightness (mag/arcsec^2) into nanolamberts.
func nanolamberts(v float64) float64 {
	return nanolambertScale * math.Exp(nanolambertZero-nanolambertSlope*v)
}

// nanolambertFlux is the flux of one nanolambert. The published slope is
// 0.4 ln 10 rounded to five digits; the conversion is tied at V = 20, in the
// middle of the skies it is used for, and is within 2e-5 mag over V 17 to 23.
var nanolambertFlux = math.Pow(10, -0.4*20) / nanolamberts(20)

// scatterPath is the path through the scattering layer in units of the
// zenith's, Krisciunas & Schaefer eq. 3: 1 at the zenith, 5 at the horizon.
func scatterPath(sinAltitude float64) float64 {
	c := math.Max(sinAltitude, 0)
	return 1 / math.Sqrt(1-0.96*(1-c*c))
}

// scatterFunction is f(rho) of Krisciunas & Schaefer, eq. 21, and within 10
// deg of the Moon their eq. 19 for the second term; rho in rad. Within 0.25
// deg (the Moon's own disc) it keeps its value there.
func scatterFunction(rho float64) float64 {
	c := math.Cos(rho)
	d := math.Max(rho/degree, 0.25)
	f := math.Pow(10, 5.36) * (1.06 + c*c)
	if d < 10 {
		return f + 6.2e7/(d*d)
	}
	return f + math.Pow(10, 6.15-d/40)
}

// moonBrightness is I* of Krisciunas & Schaefer, eq. 20, for a phase angle in rad.
func moonBrightness(phaseAngle float64) float64 {
	a := math.Abs(phaseAngle) / degree
	return math.Pow(10, -0.4*(3.84+0.026*a+4e-9*a*a*a*a))
}

// moonlight is the moonlit sky in nanolamberts, eq. 15, with k in mag per
// airmass; 0 while the Moon is not above the horizon.
func moonlight(k float64, g Geometry) float64 {
	if !(g.MoonAltitude > 0) {
		return 0
	}
	moonPath := scatterPath(math.Sin(g.MoonAltitude))
	loss := 1 - math.Pow(10, -0.4*k*scatterPath(g.SinAltitude))
	return scatterFunction(g.MoonSeparation) * moonBrightness(g.MoonPhaseAngle) *
		math.Pow(10, -0.4*k*moonPath) * loss
}

// darkSkyFactor is the dark sky's flux at an altitude over that at the zenith:
// a fraction 0.6 from the airglow layer, growing with the path, all of it
// dimmed by the extinction beyond the zenith's. Garstang (1989) as in Patat
// (2003), A&A 400, 1183, Appendix C.
func darkSkyFactor(k, sinAltitude float64) float64 {
	const airglow = 0.6
	x := scatterPath(sinAltitude)
	return ((1 - airglow) + airglow*x) * math.Pow(10, -0.4*k*(x-1))
}

// bandSky is the published sky of one band.
type bandSky struct {
	a0, a1, a2 float64 // twilight at the zenith, mag/arcsec^2, per deg of zeta-95
	dark       float64 // dark zenith, mag/arcsec^2
}

// Twilight: Patat, Ugolnikov & Postylyakov (2006), A&A 455, 385, table 1.
// Dark zenith sky of the same site: Patat (2003), A&A 400, 1183, table 4.
var bandSkies = [...]bandSky{
	BandU: {11.78, 1.376, -0.039, 22.3},
	BandB: {11.84, 1.411, -0.041, 22.6},
	BandV: {11.84, 1.518, -0.057, 21.6},
	BandR: {11.40, 1.567, -0.064, 20.9},
	BandI: {10.93, 1.470, -0.062, 19.7},
}

// twilightMagnitude is the published fit for the whole zenith sky, for a
// Sun's zenith distance of 95 to 105 deg (given in deg and held there).
func twilightMagnitude(b Band, zeta float64) float64 {
	if b < BandU || b > BandI {
		panic(fmt.Sprintf("visibility: filter without a band (%d)", b))
	}
	p := &bandSkies[b]
	x := math.Min(math.Max(zeta, 95), 105) - 95
	return p.a0 + x*(p.a1+x*p.a2)
}

// twilightFlux is what twilight adds to the sky at a Sun altitude (rad): the
// published fit less the band's published dark sky, at least 0; beyond a
// zenith distance of 105 deg it fades linearly to nothing at 106.
func twilightFlux(b Band, sunAltitude float64) float64 {
	zeta := 90 - sunAltitude/degree
	if zeta >= 106 {
		return 0
	}
	f := math.Pow(10, -0.4*twilightMagnitude(b, zeta)) - math.Pow(10, -0.4*bandSkies[b].dark)
	if f < 0 {
		return 0
	}
	if zeta > 105 {
		f *= 106 - zeta
	}
	return f
}

// SkyFlux returns the sky's flux at the field, 10^(-0.4 mag/arcsec^2): dark
// sky by zenith distance, moonlight while the Moon is up, twilight.
func SkyFlux(f Filter, g Geometry) float64 {
	flux := math.Pow(10, -0.4*f.DarkSky) * darkSkyFactor(f.Extinction, g.SinAltitude)
	flux += f.Moonlight * moonlight(f.Extinction, g) * nanolambertFlux
	return flux + twilightFlux(f.Band, g.SunAltitude)
}

// SkyMagnitude returns the sky's brightness at the field, mag/arcsec^2.
func SkyMagnitude(f Filter, g Geometry) float64 {
	return -2.5 * math.Log10(SkyFlux(f, g))
}

// Quality returns how much an exposure is worth beside one at the zenith of a
// dark night, 0 to 1: the inverse ratio of background-limited exposure times
// for equal signal to noise, with seeing growing as the airmass to the 0.6
// (Fried 1966). It is 0 at and below the horizon.
func Quality(f Filter, g Geometry) float64 {
	if !(g.SinAltitude > 0) {
		return 0
	}
	x := Airmass(g.SinAltitude)
	clear := math.Pow(10, -0.8*f.Extinction*(x-1)) * math.Pow(x, -1.2)
	return math.Min(1, clear*math.Pow(10, -0.4*f.DarkSky)/SkyFlux(f, g))
}
