package constraints

import "nightwright/visibility"

// brightMoon tells whether a field breaks moon_illumination_max, which holds
// while the Moon is up.
func brightMoon(s *Sight, limit float64) bool {
	return s.MoonAltitude > 0 && s.MoonIllumination > limit
}

// underIllumination takes out of the current set the parts of up, when the
// Moon is up, in which more of it is lit than the rule allows.
func (c *cell) underIllumination(up []visibility.Interval) bool {
	track := &c.sky.track
	limit := c.unit.rules.MoonIlluminationMax - sides[c.side]*illuminationGuard
	const margin = 1e-4 // the fraction between knots differs by less from them
	switch {
	case track.maxLit+margin <= limit:
		return true
	case track.minLit-margin > limit:
		c.next = subtract(c.next[:0], c.cur, up)
		return c.swap()
	}
	var hold [8]visibility.Interval
	over := hold[:0]
	for _, x := range up {
		over = where(over, x.From, x.To, 3600, illuminationBend, c.side == inner, func(t float64) float64 {
			return track.litAt(t) - limit
		})
	}
	c.next = subtract(c.next[:0], c.cur, over)
	return c.swap()
}
