package constraints

import (
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// reservedIn appends the blocks that a telescope's reserves take of a night
// whose open time, before reserves, is open (ascending).
//
// Opening blocks follow each other from the first open instant, in file order;
// closing blocks lie likewise before the last; an "every" block starts k
// times its spacing after the first open instant, k = 1, 2, ... . Blocks are
// stretches of clock time: they don't wait for a closure in the night to end.
func reservedIn(dst []visibility.Interval, reserved []survey.Reserved, open []visibility.Interval) []visibility.Interval {
	if len(open) == 0 {
		return dst
	}
	first, last := open[0].From, open[len(open)-1].To
	head, tail := first, last
	for i := range reserved {
		r := &reserved[i]
		switch r.At {
		case survey.AtOpening:
			dst = append(dst, visibility.Interval{From: head, To: head + r.Takes})
			head += r.Takes
		case survey.AtClosing:
			dst = append(dst, visibility.Interval{From: tail - r.Takes, To: tail})
			tail -= r.Takes
		case survey.AtEvery:
			if r.Every <= 0 {
				continue
			}
			for k := 1.0; first+k*r.Every < last; k++ {
				from := first + k*r.Every
				dst = append(dst, visibility.Interval{From: from, To: from + r.Takes})
			}
		}
	}
	return dst
}
