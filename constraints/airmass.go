package constraints

import (
	"math"

	"nightwright/visibility"
)

// overAirmass tells whether a field breaks airmass_max.
func overAirmass(s *Sight, limit float64) bool {
	return s.SinAltitude <= 0 || visibility.Airmass(s.SinAltitude) > limit
}

// AltitudeOfAirmass returns the least airless altitude (rad) at which Young's
// airmass is at most x, by bisection to the last bit; Pi when no altitude is
// high enough, 0 when every one above the horizon is.
func AltitudeOfAirmass(x float64) float64 {
	if !(visibility.Airmass(1) <= x) {
		return math.Pi
	}
	lo, hi := 0.0, math.Pi/2 // airmass above x at lo, at most x at hi
	if visibility.Airmass(math.Sin(1e-9)) <= x {
		return 0
	}
	for range 60 {
		mid := (lo + hi) / 2
		if visibility.Airmass(math.Sin(mid)) <= x {
			hi = mid
		} else {
			lo = mid
		}
	}
	return hi
}
