package constraints

import "nightwright/constraints/survey"

// CrossesMeridian tells whether an exposure breaks the flip rule: begun east
// of the meridian (hour angle below 0) it may pass it by past_meridian at
// most. startHA and endHA are its hour angles in (-pi, pi], rad.
func CrossesMeridian(f *survey.Flip, startHA, endHA float64) bool {
	return startHA < 0 && endHA > f.PastMeridian
}

// PassesLowerMeridian tells whether a track, under half a turn long, passes an
// hour angle of +-12 h, which an equatorial mount can't.
func PassesLowerMeridian(startHA, endHA float64) bool { return endHA < startHA }
