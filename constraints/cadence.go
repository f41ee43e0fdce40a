package constraints

import "nightwright/constraints/survey"

// Cadence binds the visits of one demand of one field, over all telescopes, by
// the start of each one's first exposure.

// TooClose tells whether two visits, by their starts (same unit as minGap),
// break gap.min.
func TooClose[T int64 | float64](a, b, minGap T) bool {
	if a > b {
		a, b = b, a
	}
	return b-a < minGap
}

// TooManyPerNight tells whether a number of visits with one night label, over
// the whole network, breaks per_night; 0 sets no limit.
func TooManyPerNight(visits, perNight int) bool { return perNight > 0 && visits > perNight }

// GapWishBroken tells whether two consecutive visits are further apart, in s,
// than gap.max, which is a wish and only counted.
func GapWishBroken(a, b float64, d *survey.Demand) bool { return b-a > d.GapMax }
