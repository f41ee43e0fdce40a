package constraints

import (
	"math"

	"nightwright/visibility"
)

// nearMoon tells whether a field breaks moon_separation_min, which holds while
// the Moon is up.
func nearMoon(s *Sight, limit float64) bool {
	return s.MoonAltitude > 0 && s.MoonSeparation < limit
}

// clearOfMoon takes out of the current set the time that the Moon's two rules
// forbid.
func (c *cell) clearOfMoon() bool {
	if c.unit.noMoonSep && c.unit.noIllu || len(c.sky.up[c.side]) == 0 {
		return true
	}
	var bad [8]visibility.Interval
	up := intersect(bad[:0], c.cur, c.sky.up[c.side])
	if len(up) == 0 {
		return true
	}
	if !c.unit.noIllu && !c.underIllumination(up) {
		return false
	}
	if c.unit.noMoonSep || !c.mayMeetMoon(up) {
		return true
	}
	// Time is illegal where the Moon is up and near: keep what surely isn't
	// (inner) or may not be (outer).
	sep := c.unit.cosSep[c.side]
	var hold [8]visibility.Interval
	near := hold[:0]
	for _, x := range up {
		near = where(near, x.From, x.To, 3600, 2*moonBend, c.side == inner, func(t float64) float64 {
			return c.cosMoon(t) - sep
		})
	}
	if len(near) == 0 {
		return true
	}
	c.next = subtract(c.next[:0], c.cur, near)
	return c.swap()
}

// mayMeetMoon is the quick test: it is false when the field is further from
// the Moon, in the middle of the time, than the limit and the Moon's motion.
func (c *cell) mayMeetMoon(up []visibility.Interval) bool {
	from, to := up[0].From, up[len(up)-1].To
	mid, half := (from+to)/2, (to-from)/2
	return c.cosMoon(mid)+1.1*moonSpeed*half >= c.unit.cosSep[c.side]
}

// cosMoon is the cosine of the separation from the Moon, with the diurnal
// aberration that the Moon's direction already has.
func (c *cell) cosMoon(t float64) float64 {
	m := c.sky.track.moonAt(t)
	s, k := math.Sincos(c.sky.angleAt(t))
	d := &c.place.c
	mc := m.Dot(*d)
	em := k*m[1] - s*m[0]
	ec := k*d[1] - s*d[0]
	return mc + c.sky.plan.vd*(em-ec*mc)
}
