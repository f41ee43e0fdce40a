package constraints

import (
	"slices"

	"nightwright/visibility"
)

// Sets of time are slices of visibility.Interval, ascending and disjoint.

// intersect appends the common time of a and b to dst.
func intersect(dst, a, b []visibility.Interval) []visibility.Interval {
	for i, j := 0, 0; i < len(a) && j < len(b); {
		from, to := max(a[i].From, b[j].From), min(a[i].To, b[j].To)
		if to > from {
			dst = append(dst, visibility.Interval{From: from, To: to})
		}
		if a[i].To < b[j].To {
			i++
		} else {
			j++
		}
	}
	return dst
}

// subtract appends the time of a that is not in b to dst.
func subtract(dst, a, b []visibility.Interval) []visibility.Interval {
	j := 0
	for _, x := range a {
		for j < len(b) && b[j].To <= x.From {
			j++
		}
		from := x.From
		for k := j; k < len(b) && b[k].From < x.To; k++ {
			if b[k].From > from {
				dst = append(dst, visibility.Interval{From: from, To: b[k].From})
			}
			from = max(from, b[k].To)
		}
		if x.To > from {
			dst = append(dst, visibility.Interval{From: from, To: x.To})
		}
	}
	return dst
}

// union sorts the intervals in place, drops empty ones and joins those that
// touch or overlap.
func union(a []visibility.Interval) []visibility.Interval {
	slices.SortFunc(a, func(x, y visibility.Interval) int {
		switch {
		case x.From < y.From:
			return -1
		case x.From > y.From:
			return 1
		}
		return 0
	})
	out := a[:0]
	for _, x := range a {
		if x.To <= x.From {
			continue
		}
		if n := len(out); n > 0 && x.From <= out[n-1].To {
			out[n-1].To = max(out[n-1].To, x.To)
			continue
		}
		out = append(out, x)
	}
	return out
}

// seconds returns the total length of disjoint intervals.
func seconds(a []visibility.Interval) float64 {
	sum := 0.0
	for _, x := range a {
		sum += x.To - x.From
	}
	return sum
}
