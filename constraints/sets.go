package constraints

import (
	"math"

	"nightwright/constraints/survey"
)

// WrongAfter tells whether exposure step of a set starts outside its tolerance
// about "after", counted from the start of the exposure before; s.
func WrongAfter(d *survey.Demand, step int, before, start float64) bool {
	x := &d.Exposures[step]
	return math.Abs(start-before-x.After) > x.Tolerance
}

// SetSpan returns the shortest and longest time, in s, from the start of a
// demand's first exposure to the end of its last on a telescope, by "after" and
// tolerance alone: the exposures' own lengths may ask for more than the least.
func SetSpan(d *survey.Demand, t *survey.Telescope) (least, most float64) {
	for i := range d.Exposures {
		x := &d.Exposures[i]
		if i > 0 {
			least += math.Max(0, x.After-x.Tolerance)
			most += x.After + x.Tolerance
		}
	}
	last := d.Exposures[len(d.Exposures)-1].Duration * t.ExposureScale
	return least + last, most + last
}

// SetsOverlap tells whether two sets of one demand on one field, each from its
// first start to its last end, overlap.
func SetsOverlap(fromA, toA, fromB, toB float64) bool { return fromA < toB && fromB < toA }
