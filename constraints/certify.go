package constraints

import (
	"math"

	"nightwright/visibility"
)

// undecided is the length of time, s, under which a stretch that can't be
// decided isn't cut further.
const undecided = 0.2

// where appends to dst the parts of [from, to] in which f >= 0, given that
// |f”| <= bend throughout. Nothing is missed between samples:
//
//   - where both ends of a piece of length h are above bend h^2/8, all of it is
//     above 0 (the chord's error bound), and likewise below;
//   - where the ends differ in sign and the chord is steeper than bend h, f is
//     monotone and has one root, which is found to 1 ms;
//   - any other piece is halved. Pieces under 0.2 s that still can't be decided
//     (f grazes 0) count as keep says.
func where(dst []visibility.Interval, from, to, step, bend float64, keep bool, f func(t float64) float64) []visibility.Interval {
	if to <= from {
		return dst
	}
	pieces := max(1, int(math.Ceil((to-from)/step)))
	t0, f0 := from, f(from)
	for k := 1; k <= pieces; k++ {
		t1 := from + (to-from)*float64(k)/float64(pieces)
		f1 := f(t1)
		dst = whereIn(dst, t0, f0, t1, f1, bend, keep, f)
		t0, f0 = t1, f1
	}
	return dst
}

func whereIn(dst []visibility.Interval, t0, f0, t1, f1, bend float64, keep bool, f func(t float64) float64) []visibility.Interval {
	h := t1 - t0
	curve := bend * h * h / 8
	switch {
	case f0 > curve && f1 > curve:
		return join(dst, t0, t1)
	case f0 < -curve && f1 < -curve:
		return dst
	case f0 < 0 != (f1 < 0) && math.Abs(f1-f0) > bend*h*h:
		t := root(t0, f0, t1, f1, f)
		if f0 < 0 {
			return join(dst, t, t1)
		}
		return join(dst, t0, t)
	case h <= undecided:
		if keep {
			return join(dst, t0, t1)
		}
		return dst
	}
	tm := (t0 + t1) / 2
	fm := f(tm)
	dst = whereIn(dst, t0, f0, tm, fm, bend, keep, f)
	return whereIn(dst, tm, fm, t1, f1, bend, keep, f)
}

// join appends [from, to] to dst, or lengthens its last interval when they
// touch.
func join(dst []visibility.Interval, from, to float64) []visibility.Interval {
	if to <= from {
		return dst
	}
	if n := len(dst); n > 0 && dst[n-1].To >= from {
		dst[n-1].To = max(dst[n-1].To, to)
		return dst
	}
	return append(dst, visibility.Interval{From: from, To: to})
}

// root finds the zero of a monotone f between t0 and t1, of different signs,
// to 1 ms: regula falsi with the Illinois rule (Dowell and Jarratt 1971).
func root(t0, f0, t1, f1 float64, f func(t float64) float64) float64 {
	last := 0
	for range 60 {
		if t1-t0 < 1e-3 {
			break
		}
		t := t0 + (t1-t0)*f0/(f0-f1)
		if !(t > t0 && t < t1) {
			t = (t0 + t1) / 2
		}
		ft := f(t)
		if ft == 0 {
			return t
		}
		if ft < 0 == (f0 < 0) {
			if t0, f0 = t, ft; last == -1 {
				f1 /= 2
			}
			last = -1
		} else {
			if t1, f1 = t, ft; last == 1 {
				f0 /= 2
			}
			last = 1
		}
		if math.Abs(ft) < 1e-12 {
			return t
		}
	}
	return (t0 + t1) / 2
}
