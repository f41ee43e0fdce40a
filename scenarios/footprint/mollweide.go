package footprint

import "math"

// Mollweide projects a right ascension and declination (rad) onto an ellipse
// 4 by 2 wide, equal in area: right ascension pi in the middle, east to the
// left. Source: Snyder 1987, USGS Professional Paper 1395, p. 249.
func Mollweide(ra, dec float64) (x, y float64) {
	t := dec
	if math.Abs(dec) > math.Pi/2-1e-9 {
		t = math.Copysign(math.Pi/2, dec)
	} else {
		// Newton's steps for 2 t + sin 2 t = pi sin dec; near the poles the
		// root is double and they get slow, so there are many.
		for range 60 {
			step := (2*t + math.Sin(2*t) - math.Pi*math.Sin(dec)) / (2 + 2*math.Cos(2*t))
			t -= step
			if math.Abs(step) < 1e-12 {
				break
			}
		}
	}
	lon := math.Remainder(ra-math.Pi, 2*math.Pi)
	return -2 * lon / math.Pi * math.Cos(t), math.Sin(t)
}
