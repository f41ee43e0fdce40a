package audit

import (
	"cmp"
	"math"
	"slices"

	"nightwright/constraints/survey"
)

// axisSeconds is the least time for an axis to turn by d (rad) from rest to
// rest: it speeds up to peak = min(rate, sqrt(d x acceleration)), goes on at
// it, and slows down again (elementary kinematics).
func axisSeconds(d float64, slew survey.Slew) float64 {
	if d = math.Abs(d); d == 0 {
		return 0
	}
	peak := math.Min(slew.Rate, math.Sqrt(d*slew.Acceleration))
	return d/peak + peak/slew.Acceleration
}

// between is the least time from the end of a to the start of b on one
// telescope, s, as the contract has it: max(readout, slew + settle), the
// filter change on top or inside, and a flip's time on top.
func (j *Judge) between(a, b *shot) float64 {
	t := &j.sv.Telescopes[b.scope]
	from, to := &a.end.star, &b.start.star
	var one, two float64
	switch {
	case t.Mount == survey.Equatorial:
		one, two = to.HourAngle-from.HourAngle, to.Declination-from.Declination
	case t.AzimuthRange != nil:
		one, two = b.startTurn-a.endTurn, to.Altitude-from.Altitude
	default:
		one = turn(to.Azimuth - from.Azimuth)
		one, two = math.Min(one, 2*math.Pi-one), to.Altitude-from.Altitude
	}
	move := math.Max(axisSeconds(one, t.Slew), axisSeconds(two, t.Slew))
	flips := t.Mount == survey.Equatorial && t.Flip != nil && (a.start.star.HourAngle < 0) != (b.start.star.HourAngle < 0)
	if move > 0 || flips {
		move += t.Slew.Settle
	}
	need := math.Max(t.Readout, move)
	if a.filter != b.filter {
		if t.DuringSlew {
			need = math.Max(need, t.FilterChange)
		} else {
			need += t.FilterChange
		}
	}
	if flips {
		need += t.Flip.Time
	}
	return need
}

// joined tells whether two exposures of a telescope belong to one sequence: of
// one night, or of two between which it is dark at the transit, that is, the
// Sun within the telescope's loosest limit.
func (j *Judge) joined(a, b *shot) bool {
	if a.day == b.day {
		return true
	}
	if b.day != a.day+1 || !j.served[b.scope] {
		return false
	}
	noon := j.transit(b.site, b.day)
	return j.exact.Sun(j.sites[b.site], noon).Altitude <= j.loosest[b.scope]+angleSlack
}

// sequences walks each telescope's exposures in time: the gaps between them,
// and what keep_free leaves of each night.
func (c *trial) sequences() {
	order := make([]int, 0, len(c.shots))
	for i := range c.shots {
		if c.shots[i].known {
			order = append(order, i)
		}
	}
	slices.SortStableFunc(order, func(x, y int) int {
		a, b := &c.shots[x], &c.shots[y]
		return cmp.Or(cmp.Compare(a.scope, b.scope), cmp.Compare(a.Start, b.Start))
	})
	var last *shot // of this telescope, the one that ends last
	used, begun := 0.0, 0
	for k, i := range order {
		s := &c.shots[i]
		if last != nil && last.scope != s.scope {
			last = nil
		}
		if last == nil || last.day != s.day {
			c.budget(order[begun:k], used)
			used, begun = 0, k
		}
		used += s.to - s.from
		if last != nil && c.j.joined(last, s) {
			s.gap = c.j.between(last, s)
			if last.day == s.day {
				used += s.gap
			}
		}
		if last != nil && !(last.done && s.done) {
			if is := float64(s.Start-last.End) / 1e6; is < s.gap-timeSlack*1e-6 {
				s.breach(RuleGap, is, s.gap, "s", "it starts %.6f s after the end of visit %d; %.6f s are needed", is, last.Visit.Visit, s.gap)
			}
		}
		if last == nil || s.End >= last.End {
			last = s
		}
	}
	c.budget(order[begun:], used)
}

// budget holds what a telescope uses of a night against keep_free.
func (c *trial) budget(list []int, used float64) {
	if len(list) == 0 {
		return
	}
	s := &c.shots[list[len(list)-1]]
	free := c.j.sv.Telescopes[s.scope].KeepFree
	if free == 0 || s.night < 0 || s.done {
		return
	}
	if most := (1 - free) * c.j.open[s.scope][s.night].seconds; used > most+rootSlack {
		s.breach(RuleKeepFree, used, most, "s", "exposures and gaps take %.3f s of the night; keep_free leaves %.3f s", used, most)
	}
}
