package visibility

import "math"

// Airmass returns the relative optical airmass of the airless altitude whose
// sine is given: 1 at the zenith, 31.73 at the horizon, +Inf below it.
//
// Young (1994), Appl. Opt. 33, 1108: a rational fit in the cosine of the true
// zenith distance, within 0.0037 airmass of the standard atmosphere down to
// the horizon.
func Airmass(sinAltitude float64) float64 {
	c := sinAltitude
	if c < 0 {
		return math.Inf(1)
	}
	num := (1.002432*c+0.148386)*c + 0.0096467
	den := ((c+0.149864)*c+0.0102963)*c + 0.000303978
	return num / den
}
