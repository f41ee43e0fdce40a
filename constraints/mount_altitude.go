package constraints

import "nightwright/constraints/survey"

// outsideMountAltitude tells whether a field lies outside the altitudes that a
// mount reaches: an altazimuth mount can't follow through the zenith, others
// stop above the horizon.
func outsideMountAltitude(s *Sight, t *survey.Telescope) bool {
	return s.Altitude < t.AltitudeMin || s.Altitude > t.AltitudeMax
}
