package audit

import (
	"context"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// span is a stretch of time [from, to), UTC, Unix s.
type span struct{ from, to float64 }

// night is one label at one site, with the Sun's way through it.
type night struct {
	span
	times, heights []float64 // samples of the Sun's altitude (rad), turning points among them
	dark           float64   // s with the Sun at -18 deg or lower
}

// openNight is when a telescope may expose in a night.
type openNight struct {
	closed, lost, reserved []span
	open                   []span // Sun below the loosest limit, less all of the above
	seconds                float64
}

// sunSpacing is the time between samples of the Sun's altitude, s. Between
// two of them it has one turning point at most.
const sunSpacing = 300.0

// darkLimit is the Sun's altitude below which an hour counts as dark.
const darkLimit = -18 * math.Pi / 180

// transit is the Sun's upper transit nearest to 12:00 local mean time of a
// day (longitude as written): where its apparent hour angle goes through 0.
func (j *Judge) transit(site int, day survey.Day) float64 {
	s := j.sites[site]
	noon := float64(day)*86400 + 43200 - s.Longitude/(2*math.Pi)*86400
	// The equation of time stays under 17 minutes.
	return bisect(noon-3000, noon+3000, func(t float64) float64 { return j.exact.Sun(s, t).HourAngle })
}

// bisect returns where an increasing f goes through 0.
func bisect(a, b float64, f func(float64) float64) float64 {
	for range 60 {
		m := a + (b-a)/2
		if m <= a || m >= b {
			break
		}
		if f(m) < 0 {
			a = m
		} else {
			b = m
		}
	}
	return b
}

// newNight samples one night.
func (j *Judge) newNight(site int, from, to float64) night {
	n := night{span: span{from, to}}
	height := func(t float64) float64 { return j.exact.Sun(j.sites[site], t).Altitude }
	steps := int(math.Ceil((to - from) / sunSpacing))
	step := (to - from) / float64(steps)
	add := func(t float64) {
		n.times = append(n.times, t)
		n.heights = append(n.heights, height(t))
	}
	before, here := height(from-step), height(from)
	for k := range steps + 1 {
		t := from + float64(k)*step
		after := height(t + step)
		n.times, n.heights = append(n.times, t), append(n.heights, here)
		// A turning point is about here: find it on either side.
		if (here-before)*(after-here) <= 0 {
			sign := 1.0 // of a valley
			if here > before || here > after {
				sign = -1
			}
			if turn := valley(t-step, t+step, func(x float64) float64 { return sign * height(x) }); turn > from && turn < to {
				add(turn)
			}
		}
		before, here = here, after
	}
	n.sort()
	for _, s := range n.below(j, site, darkLimit) {
		n.dark += s.to - s.from
	}
	return n
}

func (n *night) sort() {
	type sample struct{ t, h float64 }
	all := make([]sample, len(n.times))
	for i := range all {
		all[i] = sample{n.times[i], n.heights[i]}
	}
	slices.SortFunc(all, func(a, b sample) int {
		switch {
		case a.t < b.t:
			return -1
		case a.t > b.t:
			return 1
		}
		return 0
	})
	for i, s := range all {
		n.times[i], n.heights[i] = s.t, s.h
	}
}

// valley returns where f is least in an interval with one valley (golden
// section would save calls; thirds are plainer).
func valley(a, b float64, f func(float64) float64) float64 {
	for range 60 {
		x, y := a+(b-a)/3, b-(b-a)/3
		if f(x) < f(y) {
			b = y
		} else {
			a = x
		}
		if b-a < 1e-3 {
			break
		}
	}
	return (a + b) / 2
}

// below returns when the Sun is at most limit (rad) high.
func (n *night) below(j *Judge, site int, limit float64) []span {
	over := func(t float64) float64 { return j.exact.Sun(j.sites[site], t).Altitude - limit }
	var out []span
	open := n.heights[0] <= limit
	start := n.from
	for i := 1; i < len(n.times); i++ {
		up := n.heights[i] <= limit
		if up == open {
			continue
		}
		a, b := n.times[i-1], n.times[i]
		if open {
			out = append(out, span{start, bisect(a, b, over)})
		} else {
			start = bisect(a, b, func(t float64) float64 { return -over(t) })
		}
		open = up
	}
	if open {
		out = append(out, span{start, n.to})
	}
	return out
}

// openNights works out all nights of the period and each telescope's open
// time in them.
func (j *Judge) openNights(ctx context.Context, losses [][]visibility.Interval) error {
	sites, count := len(j.sv.Sites), j.sv.Nights()
	j.nights = make([][]night, sites)
	for i := range j.nights {
		j.nights[i] = make([]night, count)
	}
	j.open = make([][]openNight, len(j.sv.Telescopes))
	for t := range j.open {
		j.open[t] = make([]openNight, count)
	}
	return j.share(ctx, sites*count, func(k int) {
		site, n := k/count, k%count
		day := j.sv.FirstNight + survey.Day(n)
		j.nights[site][n] = j.newNight(site, j.transit(site, day), j.transit(site, day+1))
		for t := range j.sv.Telescopes {
			if j.sv.Telescopes[t].Site == site {
				var lost []visibility.Interval
				if t < len(losses) {
					lost = losses[t]
				}
				j.open[t][n] = j.openNight(t, n, lost)
			}
		}
	})
}

func (j *Judge) openNight(t, n int, lost []visibility.Interval) openNight {
	tel := &j.sv.Telescopes[t]
	in := &j.nights[tel.Site][n]
	day := j.sv.FirstNight + survey.Day(n)
	var o openNight
	for _, list := range [][]survey.Closure{j.sv.Sites[tel.Site].Closures, tel.Closures} {
		for _, c := range list {
			switch {
			case !c.ByNight:
				o.closed = append(o.closed, span{c.From, c.To})
			case c.FirstNight <= day && day <= c.LastNight:
				o.closed = append(o.closed, in.span)
			}
		}
	}
	for _, l := range lost {
		o.lost = append(o.lost, span{l.From, l.To})
	}
	if !j.served[t] {
		return o
	}
	left := cut(cut(in.below(j, tel.Site, j.loosest[t]), o.closed), o.lost)
	o.reserved = reservedBlocks(tel.Reserved, left)
	o.open = cut(left, o.reserved)
	for _, s := range o.open {
		o.seconds += s.to - s.from
	}
	return o
}

// reservedBlocks lays a telescope's reserved blocks into a night that is open
// as given: opening blocks one after another from the first open instant,
// closing ones before the last, and the others at each whole multiple of
// their spacing after the first open instant.
func reservedBlocks(reserved []survey.Reserved, open []span) []span {
	if len(open) == 0 {
		return nil
	}
	first, last := open[0].from, open[len(open)-1].to
	var out []span
	opening, closing := 0.0, 0.0
	for _, r := range reserved {
		switch r.At {
		case survey.AtOpening:
			out = append(out, span{first + opening, first + opening + r.Takes})
			opening += r.Takes
		case survey.AtClosing:
			out = append(out, span{last - closing - r.Takes, last - closing})
			closing += r.Takes
		case survey.AtEvery:
			for at := first + r.Every; r.Every > 0 && at < last; at += r.Every {
				out = append(out, span{at, at + r.Takes})
			}
		}
	}
	return out
}

// cut takes spans away from ascending, disjoint ones.
func cut(from []span, away []span) []span {
	for _, x := range away {
		if x.to <= x.from {
			continue
		}
		var left []span
		for _, s := range from {
			if a := (span{s.from, math.Min(s.to, x.from)}); a.from < a.to {
				left = append(left, a)
			}
			if b := (span{math.Max(s.from, x.to), s.to}); b.from < b.to {
				left = append(left, b)
			}
		}
		from = left
	}
	return from
}

// overlap is how long [from, to) and a span have in common, s.
func (s span) overlap(from, to float64) float64 {
	return math.Max(0, math.Min(s.to, to)-math.Max(s.from, from))
}
