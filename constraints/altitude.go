package constraints

// tooLow tells whether a field breaks altitude_min, rad.
func tooLow(s *Sight, limit float64) bool { return s.Altitude < limit }
