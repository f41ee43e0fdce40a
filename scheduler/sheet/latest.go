package sheet

import (
	"math"

	"nightwright/constraints"
	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// latest returns the latest start of an exposure, a whole second of UTC or
// its planned start, at which everything after it can still be done as
// planned: no rule is broken, the exposure ends within its open time, the
// telescope reaches the next one in time, the set and the later visits of the
// field keep their times.
func (b *builder) latest(i int) (float64, Bound) {
	s := &b.shots[i]
	limit, by := math.Inf(1), ByOpen
	bound := func(x float64, why Bound) {
		if x < limit {
			limit, by = x, why
		}
	}
	for _, o := range b.cal.Open(b.telescope, b.night) {
		if s.start < o.To {
			bound(o.To-s.length, ByOpen)
			break
		}
	}
	if i+1 < len(b.shots) {
		bound(b.reach(i), ByNext)
	}
	b.setBounds(i, bound)
	if s.step == 0 {
		if next, ok := b.rivalAfter(s); ok {
			bound(next-b.demand(s).GapMin, ByCadence)
		}
	}
	if math.IsInf(limit, 1) || limit <= s.start { // outside open time, or no slack at all
		return s.start, by
	}
	if x, ok := b.legalUntil(s, limit); !ok {
		limit, by = x, ByRules
	}
	return max(s.start, math.Floor(limit)), by
}

// reach returns the latest start from which the next exposure is reached in
// time. The slew from the later end may be longer than the planned one.
func (b *builder) reach(i int) float64 {
	s, n := &b.shots[i], &b.shots[i+1]
	t := &b.sv.Telescopes[b.telescope]
	gap := n.row.GapBefore
	to := b.point(n, n.start)
	for range 2 {
		start := n.start - gap - s.length
		if start <= s.start {
			break
		}
		from := b.point(s, start+s.length)
		east := mount.East(b.point(s, start))
		gap = max(gap, mount.Gap(t, from, to, b.filter(s), b.filter(n), east, mount.East(to)))
	}
	return n.start - gap - s.length
}

func (b *builder) filter(s *shot) int { return b.demand(s).Exposures[s.step].Filter }

func (b *builder) position(s *shot) visibility.Position {
	f := &b.sv.Fields[s.field]
	return visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec}
}

func (b *builder) point(s *shot, unix float64) mount.Pointing {
	h := b.exact.Star(b.place, b.position(s), unix)
	return mount.Pointing{Altitude: h.Altitude, Azimuth: h.Azimuth, HourAngle: h.HourAngle, Declination: h.Declination}
}

// setBounds bounds the start by the tolerances of its set, to the exposure
// before it and to the one after it.
func (b *builder) setBounds(i int, bound func(float64, Bound)) {
	s := &b.shots[i]
	if s.row.Set == 0 {
		return
	}
	d := b.demand(s)
	for k := range b.shots {
		o := &b.shots[k]
		if o.row.Set != s.row.Set {
			continue
		}
		switch x := &d.Exposures[max(o.step, s.step)]; o.step {
		case s.step - 1:
			bound(o.start+x.After+x.Tolerance, BySet)
		case s.step + 1:
			bound(o.start-(x.After-x.Tolerance), BySet)
		}
	}
}

// rivalAfter returns the start of the next visit of the same field and demand.
func (b *builder) rivalAfter(s *shot) (float64, bool) {
	for _, r := range b.rivals {
		if r.field == s.field && r.demand == s.demand && r.start > s.start {
			return r.start, true
		}
	}
	return 0, false
}

// legalStep is how densely a slipped exposure is tried, s: the 30 s at which
// an audit looks.
const legalStep = 30

// legalUntil looks for the first start after the planned one, up to limit, at
// which the exposure breaks a rule; ok is true when there is none. Else it
// returns the last start that breaks none, to a second.
func (b *builder) legalUntil(s *shot, limit float64) (start float64, ok bool) {
	before := b.sight(s, s.start+s.length)
	for x := s.start; x < limit; {
		next := min(x+legalStep, limit)
		after := b.sight(s, next+s.length)
		if b.legal(s, next, &before, &after) {
			x, before = next, after
			continue
		}
		for next-x > 0.5 {
			middle := (x + next) / 2
			if sight := b.sight(s, middle+s.length); b.legal(s, middle, &before, &sight) {
				x = middle
			} else {
				next = middle
			}
		}
		return x, false
	}
	return limit, true
}

func (b *builder) sight(s *shot, unix float64) constraints.Sight {
	return constraints.ExactSight(b.exact, b.place, b.position(s), b.sv.Filters[b.filter(s)], unix)
}

// legal reports whether an exposure may start at an instant, when all before
// the sight end is legal and before is a sight shortly before its end.
func (b *builder) legal(s *shot, start float64, before, end *constraints.Sight) bool {
	t := &b.sv.Telescopes[b.telescope]
	if constraints.Evaluate(b.sv, s.field, s.demand, b.telescope, end)&^constraints.Quality != 0 {
		return false
	}
	if t.Mount == survey.Equatorial {
		first := b.point(s, start)
		if constraints.PassesLowerMeridian(first.HourAngle, end.HourAngle) {
			return false
		}
		if t.Flip != nil && constraints.CrossesMeridian(t.Flip, first.HourAngle, end.HourAngle) {
			return false
		}
		// A start on the other side would want a flip first.
		if t.Flip != nil && mount.East(first) != mount.East(b.point(s, s.start)) {
			return false
		}
	} else if t.AzimuthRange != nil && constraints.LeavesAzimuthRange(*t.AzimuthRange, before.Azimuth, end.Azimuth) {
		return false
	}
	middle := b.sight(s, start+s.length/2)
	return middle.Quality >= b.sv.Fields[s.field].Rules[s.demand].MinQuality
}
