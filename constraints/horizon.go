package constraints

import (
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// mask is a site's horizon, altitude by azimuth, linear between vertices.
type mask struct {
	az, alt []float64 // vertices, az ascending in [0, 2 pi)
	slope   []float64 // of the piece that begins at the vertex
	sin     []float64 // of az
	cos     []float64
	max     float64 // highest altitude; -pi when there is no mask
}

func newMask(points []survey.HorizonPoint) mask {
	m := mask{max: -math.Pi}
	n := len(points)
	for i, p := range points {
		next := points[(i+1)%n]
		width := next.Azimuth - p.Azimuth
		if width <= 0 {
			width += 2 * math.Pi
		}
		slope := (next.Altitude - p.Altitude) / width
		s, c := math.Sincos(p.Azimuth)
		m.az, m.alt = append(m.az, p.Azimuth), append(m.alt, p.Altitude)
		m.slope, m.sin, m.cos = append(m.slope, slope), append(m.sin, s), append(m.cos, c)
		m.max = math.Max(m.max, p.Altitude)
	}
	return m
}

// piece returns the index of the vertex at or before an azimuth in [0, 2 pi);
// before the first vertex that is the last.
func (m *mask) piece(az float64) int {
	k := len(m.az) - 1
	for i, a := range m.az {
		if a > az {
			if i > 0 {
				return i - 1
			}
			return k
		}
	}
	return k
}

// along is the altitude of piece k's line at an azimuth of that piece.
func (m *mask) along(k int, az float64) float64 {
	d := az - m.az[k]
	if d < 0 { // the last piece, past north
		d += 2 * math.Pi
	}
	return m.alt[k] + m.slope[k]*d
}

// HorizonAltitude returns the altitude of a site's horizon mask at an azimuth
// in [0, 2 pi), rad; -pi/2 without a mask.
func HorizonAltitude(points []survey.HorizonPoint, azimuth float64) float64 {
	n := len(points)
	if n == 0 {
		return -math.Pi / 2
	}
	i := n - 1 // the vertex at or before: the last one when all are after
	for k := range points {
		if points[k].Azimuth <= azimuth {
			i = k
		}
	}
	p, q := points[i], points[(i+1)%n]
	width, along := q.Azimuth-p.Azimuth, azimuth-p.Azimuth
	if width <= 0 {
		width += 2 * math.Pi
	}
	if along < 0 {
		along += 2 * math.Pi
	}
	return p.Altitude + (q.Altitude-p.Altitude)*along/width
}

// belowHorizon tells whether a field stands below the site's mask.
func belowHorizon(s *Sight, points []survey.HorizonPoint) bool {
	return len(points) > 0 && s.Altitude < HorizonAltitude(points, s.Azimuth)
}

// aboveMask takes out of the current set the time below the horizon mask.
// Where the field stands above the mask's highest point there is nothing to
// do; the rest is cut where its azimuth passes a vertex, and between those the
// altitude above the line of the mask is smooth.
func (c *cell) aboveMask() bool {
	m := &c.sky.plan.mask
	high := c.threshold(sinAbove(m.max + 2*directionGuard))
	var hold, low [16]visibility.Interval
	bad := hold[:0]
	for _, x := range c.lowTime(low[:0], high) {
		var cuts [32]float64
		ends := append(cuts[:0], x.From, x.To)
		for v := range m.az {
			ends = c.planeTimes(ends, m.sin[v], m.cos[v], 0, x) // the azimuth of a vertex
		}
		slices.Sort(ends)
		for i := 1; i < len(ends); i++ {
			bad = c.underLine(bad, m, ends[i-1], ends[i])
		}
	}
	if len(bad) == 0 {
		return true
	}
	c.next = subtract(c.next[:0], c.cur, bad)
	return c.swap()
}

// lowTime appends the parts of the current set outside the arcs within high
// (s) of the transits.
func (c *cell) lowTime(dst []visibility.Interval, high float64) []visibility.Interval {
	if high >= turnTime/2 {
		return dst
	}
	center, half := c.place.transit+turnTime/2, turnTime/2-high
	for _, x := range c.cur {
		for k := math.Ceil((x.From - half - center) / turnTime); ; k++ {
			m := center + k*turnTime
			if m-half >= x.To {
				break
			}
			dst = join(dst, max(x.From, m-half), min(x.To, m+half))
		}
	}
	return dst
}

// underLine appends the part of [from, to], within one piece of the mask, in
// which the field may be (inner) or surely is (outer) below it.
func (c *cell) underLine(dst []visibility.Interval, m *mask, from, to float64) []visibility.Interval {
	_, mid := c.altAz((from + to) / 2)
	k := m.piece(mid)
	// The altitude is under the mask's highest point here: with H that height,
	// |h''| <= w^2 (sec H + tan H) and |A''| <= 2 w^2 sec^2 H.
	sec := 1 / math.Max(math.Cos(math.Max(m.max, 0)+2*directionGuard), 0.01)
	bend := turnRate * turnRate * (2*sec + 2*sec*sec*math.Abs(m.slope[k]))
	guard := sides[c.side] * directionGuard * (1 + sec*math.Abs(m.slope[k]))
	return where(dst, from, to, 1800, bend, c.side == inner, func(t float64) float64 {
		alt, az := c.altAz(t)
		// The azimuth next to mid, so that the line goes on past north.
		az = mid + math.Remainder(az-mid, 2*math.Pi)
		return m.along(k, mid) + m.slope[k]*(az-mid) - alt + guard
	})
}

// altAz is the field's altitude and azimuth from the frozen direction.
func (c *cell) altAz(t float64) (alt, az float64) {
	e, n, z := c.horizonVec(t)
	az = math.Atan2(e, n)
	if az < 0 {
		az += 2 * math.Pi
	}
	return math.Atan2(z, math.Hypot(e, n)), az
}

// horizonVec is the field's direction in the horizon frame: east, north, up.
func (c *cell) horizonVec(t float64) (e, n, z float64) {
	p := c.sky.plan
	s, k := math.Sincos(turnRate * (t - c.place.transit))
	e = -c.place.rho * s
	n = p.cosLat*c.place.z - p.sinLat*c.place.rho*k
	z = p.sinLat*c.place.z + p.cosLat*c.place.rho*k
	return e, n, z
}
