package constraints

// sunTooHigh tells whether the Sun's centre breaks sun_altitude_max, rad.
func sunTooHigh(s *Sight, limit float64) bool { return s.SunAltitude > limit }
