package constraints

import "math"

// pastHourAngle tells whether a field breaks hour_angle_max, rad, on either
// side of the meridian.
func pastHourAngle(s *Sight, limit float64) bool { return math.Abs(s.HourAngle) > limit }
