package constraints

import (
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// closedIn appends the parts of a night that closures take away; label is the
// night's. A closure by night takes the whole night from transit to transit,
// one by instants takes [From, To).
func closedIn(dst []visibility.Interval, closures []survey.Closure, label survey.Day, night visibility.Interval) []visibility.Interval {
	for i := range closures {
		c := &closures[i]
		switch {
		case c.ByNight && c.FirstNight <= label && label <= c.LastNight:
			dst = append(dst, night)
		case !c.ByNight && c.From < night.To && c.To > night.From:
			dst = append(dst, visibility.Interval{From: c.From, To: c.To})
		}
	}
	return dst
}
