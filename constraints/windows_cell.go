package constraints

import (
	"math"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// cell works out one unit's windows in one class and night. It is scratch
// space, used again for the next.
type cell struct {
	sky   *nightSky
	unit  *unit
	class *classPlan
	place *place
	dates visibility.Interval
	epoch float64
	limit int // which of the night's Sun limits

	side      int // inner or outer
	cur, next []visibility.Interval
	segs      []visibility.Interval
	in, out   []Window
}

func (c *cell) set(ns *nightSky, u *unit, id int, cp *classPlan, sv *survey.Survey) {
	c.limit = int(ns.plan.limitOf[id])
	c.sky, c.unit, c.class, c.place = ns, u, cp, &ns.dirs[u.field]
	f := &sv.Fields[u.field]
	c.dates = visibility.Interval{From: f.NotBefore, To: f.NotAfter}
}

// windows fills in and out. The outer pass goes first: most cells that it
// finds empty need no other.
func (c *cell) windows() {
	c.in, c.out = c.in[:0], c.out[:0]
	c.side = outer
	if !c.legal() {
		return
	}
	c.out = c.round(c.out)
	c.side = inner
	if c.legal() {
		c.in = c.round(c.in)
	}
}

// legal leaves in segs the stretches in which every instant is legal on this
// side of the guards, and reports whether there are any.
func (c *cell) legal() bool {
	c.cur = append(c.cur[:0], c.sky.sun[c.limit]...)
	if !c.within(c.dates) {
		return false
	}
	if !c.aboveAltitude() || !c.belowMountMax() || !c.belowHourAngle() {
		return false
	}
	if c.class.kind == survey.Altazimuth && c.class.hasAzimuth && !c.inAzimuthRange() {
		return false
	}
	if c.sky.plan.mask.max > c.lowest()-2*directionGuard && !c.aboveMask() {
		return false
	}
	if !c.clearOfMoon() {
		return false
	}
	c.bySide()
	return len(c.segs) > 0
}

// lowest is the altitude limit of unit and mount, rad.
func (c *cell) lowest() float64 { return math.Max(c.unit.altMin, c.class.altMin) }

// swap makes next the current set and reports whether it holds anything.
func (c *cell) swap() bool {
	c.cur, c.next = c.next, c.cur
	return len(c.cur) > 0
}

func (c *cell) within(d visibility.Interval) bool {
	c.next = c.next[:0]
	for _, x := range c.cur {
		if from, to := max(x.From, d.From), min(x.To, d.To); to > from {
			c.next = append(c.next, visibility.Interval{From: from, To: to})
		}
	}
	return c.swap()
}

// threshold returns the half width in s, about transit, of the time in which
// the field stands higher than asin(sin): 0 for never, +Inf for always.
func (c *cell) threshold(sin float64) float64 {
	p := c.sky.plan
	num, den := sin-p.sinLat*c.place.z, p.cosLat*c.place.rho
	switch {
	case num >= den:
		return 0
	case num <= -den:
		return math.Inf(1)
	}
	return math.Acos(num/den) / turnRate
}

// aboveAltitude keeps what satisfies altitude_min, airmass_max and the mount's
// lower limit.
func (c *cell) aboveAltitude() bool {
	half := c.threshold(math.Max(c.unit.sinMin[c.side], c.class.sinMin[c.side]))
	return c.keepAbout(half)
}

// belowMountMax takes out the passage above the mount's upper limit.
func (c *cell) belowMountMax() bool {
	if c.class.sinMax[c.side] > 1 {
		return true
	}
	half := c.threshold(c.class.sinMax[c.side])
	switch {
	case half == 0:
		return true
	case math.IsInf(half, 1):
		return false
	}
	// Time without the arcs about the transits = arcs about the lower ones.
	return c.keepArcs(c.place.transit+turnTime/2, turnTime/2-half)
}

// belowHourAngle keeps what satisfies hour_angle_max. The guard is on the
// direction: near the pole a small error is a large hour angle.
func (c *cell) belowHourAngle() bool {
	return c.keepAbout((c.unit.hourMax - sides[c.side]*c.hourGuard()) / turnRate)
}

func (c *cell) hourGuard() float64 { return directionGuard / math.Max(c.place.rho, 1e-9) }

func (c *cell) keepAbout(half float64) bool {
	if half >= turnTime/2 {
		return true
	}
	return c.keepArcs(c.place.transit, half)
}

// keepArcs keeps the time within half (s) of center and its repeats.
func (c *cell) keepArcs(center, half float64) bool {
	c.next = c.next[:0]
	if half <= 0 {
		return c.swap()
	}
	for _, x := range c.cur {
		for k := math.Ceil((x.From - half - center) / turnTime); ; k++ {
			m := center + k*turnTime
			if m-half >= x.To {
				break
			}
			if from, to := max(x.From, m-half), min(x.To, m+half); to > from {
				c.next = append(c.next, visibility.Interval{From: from, To: to})
			}
		}
	}
	return c.swap()
}

// bySide cuts the current set into segs: at +-12 h of hour angle on an
// equatorial mount, and into the overlapping stretches before and after the
// meridian when it flips.
func (c *cell) bySide() {
	c.segs = c.segs[:0]
	if c.class.kind != survey.Equatorial {
		c.segs = append(c.segs, c.cur...)
		return
	}
	g := sides[c.side] * c.hourGuard() / turnRate
	for _, x := range c.cur {
		for k := math.Floor((x.From-c.place.transit)/turnTime - 0.5); ; k++ {
			m := c.place.transit + k*turnTime
			if m-turnTime/2+g >= x.To {
				break
			}
			lo, hi := m-turnTime/2+g, m+turnTime/2-g
			if c.class.hasFlip {
				c.cut(x, lo, min(hi, m+c.class.flip.PastMeridian/turnRate-g))
				lo = m + g
			}
			c.cut(x, lo, hi)
		}
	}
}

func (c *cell) cut(x visibility.Interval, lo, hi float64) {
	if from, to := max(x.From, lo), min(x.To, hi); to > from {
		c.segs = append(c.segs, visibility.Interval{From: from, To: to})
	}
}

// round appends segs as whole seconds, rounded by side.
func (c *cell) round(dst []Window) []Window {
	pad := sides[c.side] * c.sky.pad
	for _, x := range c.segs {
		from, to := x.From-c.epoch+pad, x.To-c.epoch-pad
		var w Window
		if c.side == inner {
			w = Window{int32(math.Ceil(from)), int32(math.Floor(to))}
		} else {
			w = Window{int32(math.Floor(from)), int32(math.Ceil(to))}
		}
		if w.To > w.From {
			dst = append(dst, w)
		}
	}
	return dst
}

// odd reports whether some outer window is not within an inner one widened by
// EdgeSlack.
func (c *cell) odd() bool {
	i := 0
	for _, o := range c.out {
		for i < len(c.in) && c.in[i].To+EdgeSlack < o.To {
			i++
		}
		if i == len(c.in) || c.in[i].From-EdgeSlack > o.From {
			return true
		}
	}
	return false
}
