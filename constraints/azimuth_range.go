package constraints

import (
	"math"
	"slices"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// outsideAzimuth tells whether a field lies outside an altazimuth mount's
// azimuth range. Passing the cut of a range a full turn wide is a matter of an
// exposure's track, not of an instant: see LeavesAzimuthRange.
func outsideAzimuth(s *Sight, t *survey.Telescope) bool {
	if t.Mount != survey.Altazimuth || t.AzimuthRange == nil {
		return false
	}
	_, ok := mount.Unwrap(*t.AzimuthRange, s.Azimuth)
	return !ok
}

// LeavesAzimuthRange tells whether a track from one azimuth to another, close
// enough in time that it is under half a turn, leaves an unwrapped range.
func LeavesAzimuthRange(r survey.AzimuthRange, from, to float64) bool {
	x, okFrom := mount.Unwrap(r, from)
	_, okTo := mount.Unwrap(r, to)
	if !okFrom || !okTo {
		return true
	}
	y := x + math.Remainder(to-from, 2*math.Pi)
	const rounding = 1e-12
	return y < r.From-rounding || y > r.To+rounding
}

// planeTimes appends the instants in x at which the direction's component
// across the vertical plane of an azimuth (given by its sine and cosine) is g,
// positive clockwise of it, on the plane's near half as well as on the far.
//
// With H the hour angle that component is
// rho (sinA sinLat cos H - cosA sin H) - z sinA cosLat = R cos(H + psi) - z sinA cosLat.
func (c *cell) planeTimes(dst []float64, sinA, cosA, g float64, x visibility.Interval) []float64 {
	p := c.sky.plan
	a, b := sinA*p.sinLat, cosA
	r := c.place.rho * math.Hypot(a, b)
	v := g + c.place.z*sinA*p.cosLat
	if r <= math.Abs(v) { // never, or touching: no crossing
		return dst
	}
	psi, half := math.Atan2(b, a), math.Acos(v/r)
	for _, h := range [2]float64{-psi - half, -psi + half} {
		t := c.place.transit + h/turnRate
		for t += turnTime * math.Ceil((x.From-t)/turnTime); t < x.To; t += turnTime {
			dst = append(dst, t)
		}
	}
	return dst
}

// alongTimes appends the instants in x at which the component along the
// azimuth is g.
func (c *cell) alongTimes(dst []float64, sinA, cosA, g float64, x visibility.Interval) []float64 {
	// Along A is across A - 90 deg: (sin, cos) -> (-cos, sin).
	return c.planeTimes(dst, -cosA, sinA, g, x)
}

// atEnd tells how a direction lies to one end of the range: -1 or +1 when it
// is off the guard, counter-clockwise or clockwise, 0 within it; far when it is
// on the other half of the plane.
func (c *cell) atEnd(end int, e, n float64) (sign int, far bool) {
	q := c.class.ends[end]
	across := q.cos*e - q.sin*n
	switch {
	case across >= directionGuard:
		sign = 1
	case across <= -directionGuard:
		sign = -1
	}
	return sign, q.sin*e+q.cos*n < -directionGuard
}

// inAzimuthRange keeps the time within the azimuth range, cut where the track
// would cross the range's end.
func (c *cell) inAzimuthRange() bool {
	c.next = c.next[:0]
	for _, x := range c.cur {
		var hold [48]float64
		cuts := append(hold[:0], x.From, x.To)
		for i := range c.class.ends {
			s, k := c.class.ends[i].sin, c.class.ends[i].cos
			for _, g := range [2]float64{directionGuard, -directionGuard} {
				cuts = c.planeTimes(cuts, s, k, g, x)
				cuts = c.alongTimes(cuts, s, k, g, x)
			}
		}
		slices.Sort(cuts)
		c.azimuthPieces(cuts)
	}
	return c.swap()
}

// azimuthPieces adds to next the legal pieces between cuts, joined; a piece at
// an end of the range is left out (inner), or belongs to what lies on either
// side of it (outer): to both, apart, where the track crosses the end there,
// and to one stretch where it only comes near.
func (c *cell) azimuthPieces(cuts []float64) {
	const (
		barred = iota
		legal
		atEnd
	)
	open := false // the last interval of next goes on
	entered := 0  // side of the end on which the track came to it
	began := 0.0  // of the stretch at an end
	prev := barred
	for i := 1; i < len(cuts); i++ {
		from, to := cuts[i-1], cuts[i]
		if to <= from {
			continue
		}
		e, n, _ := c.horizonVec((from + to) / 2)
		kind, sign := barred, 0
		az := math.Atan2(e, n)
		if _, ok := mount.Unwrap(c.class.azimuth, az); ok {
			kind = legal
		}
		for end := range c.class.ends {
			s, far := c.atEnd(end, e, n)
			if s == 0 && !far {
				kind = atEnd
			}
			if end == 0 {
				sign = s
			}
		}
		if kind == atEnd && c.side == inner {
			kind = barred
		}
		switch kind {
		case barred:
			open = false
		case legal:
			// Leaving an end on the other side than the track came: a crossing.
			if prev == atEnd && entered != 0 && sign != entered {
				c.next = append(c.next, visibility.Interval{From: began, To: to})
			} else {
				c.extend(open, from, to)
			}
			open, entered = true, sign
		case atEnd:
			if prev != atEnd {
				began = from
			}
			c.extend(open, from, to)
			open = true
		}
		if kind == barred {
			entered = 0
		}
		prev = kind
	}
}

func (c *cell) extend(open bool, from, to float64) {
	if n := len(c.next); open && n > 0 {
		c.next[n-1].To = to
		return
	}
	c.next = append(c.next, visibility.Interval{From: from, To: to})
}
