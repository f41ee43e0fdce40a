package visibility

import "math"

// rootWithin is the accuracy of a crossing, s. Unix seconds in float64 carry
// 2.4e-7 s, so there is room below.
const rootWithin = 1e-5

// root returns where a continuous f crosses zero between a and b, given its
// values there (of unlike sign or zero), to within rootWithin: Brent's method
// (1973, Algorithms for Minimization without Derivatives, ch. 4).
func root(f func(float64) float64, a, b, fa, fb float64) float64 {
	c, fc := a, fa // b is the best estimate, the root lies between b and c
	d := b - a     // the last step, and the one before
	last := d
	for range 200 {
		if math.Abs(fc) < math.Abs(fb) {
			a, b, c = b, c, b
			fa, fb, fc = fb, fc, fb
		}
		half := (c - b) / 2
		if fb == 0 || math.Abs(half) <= rootWithin/2 {
			return b
		}
		before := last
		last = d
		if math.Abs(before) < rootWithin/2 || math.Abs(fa) <= math.Abs(fb) {
			d, last = half, half
		} else if step := interpolate(a, b, c, fa, fb, fc); step*half > 0 &&
			math.Abs(step) < math.Min(1.5*math.Abs(half), math.Abs(before)/2) {
			d = step
		} else {
			d, last = half, half
		}
		a, fa = b, fb
		b += math.Copysign(math.Max(math.Abs(d), rootWithin/4), half)
		fb = f(b)
		if (fb > 0) == (fc > 0) {
			c, fc = a, fa
			d = b - a
			last = d
		}
	}
	return b
}

// interpolate returns the step from b to the zero of the inverse parabola
// through three points, or of the secant when two coincide.
func interpolate(a, b, c, fa, fb, fc float64) float64 {
	s := fb / fa
	if a == c {
		return (c - b) * s / (s - 1)
	}
	q, r := fa/fc, fb/fc
	p := s * ((c-b)*q*(q-r) - (b-a)*(r-1))
	return -p / ((q - 1) * (r - 1) * (s - 1))
}

// curve is a continuous function sampled so densely that it is monotone
// between neighbours: equal steps, with its turning points added.
type curve struct {
	f func(float64) float64
	t []float64
	v []float64
}

// sample samples f over [from, to] in steps of at most step seconds, in which
// f must have at most one turning point.
func sample(f func(float64) float64, from, to, step float64) curve {
	c := curve{f: f}
	n := int(math.Ceil((to - from) / step))
	if n < 1 {
		n = 1
	}
	h := (to - from) / float64(n)
	// One step beyond each end, to see turning points next to them.
	at := func(k int) float64 {
		if k == n {
			return to
		}
		return from + float64(k)*h
	}
	before, here := f(at(-1)), f(from)
	for k := 0; k <= n; k++ {
		after := f(at(k + 1))
		turn, ok := 0.0, false
		if (here-before)*(after-here) <= 0 && here != before {
			turn, ok = turning(f, at(k), h, before, here, after), true
		}
		if ok && turn < at(k) && turn > from {
			c.add(turn, f(turn))
		}
		c.add(at(k), here)
		if ok && turn > at(k) && turn < to {
			c.add(turn, f(turn))
		}
		before, here = here, after
	}
	return c
}

// add appends a sample; a turning point found from both sides of a step comes
// out of order by rounding and is dropped.
func (c *curve) add(t, v float64) {
	if n := len(c.t); n > 0 && t <= c.t[n-1] {
		return
	}
	c.t = append(c.t, t)
	c.v = append(c.v, v)
}

// turning finds the extremum near m by parabolas through ever closer points.
func turning(f func(float64) float64, m, h, before, here, after float64) float64 {
	for range 4 {
		bend := before - 2*here + after
		if bend == 0 {
			return m
		}
		m += h * (before - after) / (2 * bend)
		if h /= 16; h < 1 {
			return m
		}
		before, here, after = f(m-h), f(m), f(m+h)
	}
	return m
}

// below returns the intervals in which the curve is at or under a limit.
func (c *curve) below(limit float64) []Interval {
	var out []Interval
	start, open := 0.0, false
	if c.v[0] <= limit {
		start, open = c.t[0], true
	}
	for i := 1; i < len(c.t); i++ {
		in := c.v[i] <= limit
		if in == open {
			continue
		}
		x := root(func(t float64) float64 { return c.f(t) - limit }, c.t[i-1], c.t[i], c.v[i-1]-limit, c.v[i]-limit)
		if open {
			out = append(out, Interval{start, x})
		}
		start, open = x, in
	}
	if open {
		out = append(out, Interval{start, c.t[len(c.t)-1]})
	}
	return out
}
