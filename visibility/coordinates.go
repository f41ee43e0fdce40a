package visibility

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// Coordinates is a system in which a position on the sky can be given.
type Coordinates uint8

// The systems that fields can be read and written in. Each is a fixed
// rotation of the ICRS.
const (
	Equatorial Coordinates = iota // ICRS right ascension and declination
	Ecliptic                      // mean ecliptic and equinox of J2000.0, IAU 2006
	Galactic                      // IAU 1958, as tied to the ICRS by the Hipparcos catalogue
)

// axes[c] takes an ICRS vector into system c.
var axes = [...]ephemeris.Mat{
	Equatorial: {{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
	Ecliptic:   eclipticAxes(),
	Galactic:   galacticAxes(),
}

// eclipticAxes are the Fukushima-Williams angles at J2000.0 (IAU 2006;
// Wallace & Capitaine 2006, A&A 459, 981): frame bias and the obliquity in one.
func eclipticAxes() ephemeris.Mat {
	const arcsec = math.Pi / 180 / 3600
	return turnZ(0.041775 * arcsec).Mul(turnX(84381.412819 * arcsec)).Mul(turnZ(-0.052928 * arcsec))
}

// galacticAxes follow from the galactic pole and the position angle of the
// galactic centre: ESA (1997), The Hipparcos and Tycho Catalogues, vol. 1, 1.5.3.
func galacticAxes() ephemeris.Mat {
	const poleRA, poleDec, node = 192.85948 * degree, 27.12825 * degree, 32.93192 * degree
	return turnZ(-node).Mul(turnX(math.Pi/2 - poleDec)).Mul(turnZ(poleRA + math.Pi/2))
}

// turnX and turnZ turn the axes by an angle about x or z.
func turnX(a float64) ephemeris.Mat {
	s, c := math.Sincos(a)
	return ephemeris.Mat{{1, 0, 0}, {0, c, s}, {0, -s, c}}
}

func turnZ(a float64) ephemeris.Mat {
	s, c := math.Sincos(a)
	return ephemeris.Mat{{c, s, 0}, {-s, c, 0}, {0, 0, 1}}
}

// FromICRS returns longitude [0, 2 pi) and latitude in the system of an ICRS
// position, all rad.
func (c Coordinates) FromICRS(ra, dec float64) (lon, lat float64) {
	return toAngles(axes[c].Apply(fromAngles(ra, dec)))
}

// ToICRS returns the ICRS right ascension [0, 2 pi) and declination of a
// position in the system, all rad.
func (c Coordinates) ToICRS(lon, lat float64) (ra, dec float64) {
	return toAngles(axes[c].Transpose().Apply(fromAngles(lon, lat)))
}

func fromAngles(lon, lat float64) ephemeris.Vec {
	sl, cl := math.Sincos(lon)
	sb, cb := math.Sincos(lat)
	return ephemeris.Vec{cb * cl, cb * sl, sb}
}

func toAngles(v ephemeris.Vec) (lon, lat float64) {
	return wrapTurn(math.Atan2(v[1], v[0])), math.Atan2(v[2], math.Hypot(v[0], v[1]))
}
