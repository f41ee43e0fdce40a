package footprint

import (
	"fmt"
	"math"

	"nightwright/visibility/ephemeris"
)

// MaxVertices bounds a polygon: its check for crossings takes the square.
const MaxVertices = 2000

// Polygon is the smaller of the two parts into which a closed line of
// great-circle arcs cuts the sky.
type Polygon struct {
	at     []ephemeris.Vec
	edge   []ephemeris.Vec // pole of the arc from at[i] to at[i+1], unit
	area   float64
	hull   Circle // around all of it, when all is within a half sky of it
	bound  bool
	refs   [6]ephemeris.Vec // directions whose side is known
	inside [6]bool
}

// touching is how near two parts of a polygon's line may not come, rad
// (0.0002").
const touching = 1e-9

// NewPolygon makes a polygon from its corners (unit vectors) in either
// sense. What is wrong with them comes back in plain words.
func NewPolygon(at []ephemeris.Vec) (Polygon, error) {
	n := len(at)
	p := Polygon{at: at}
	if n < 3 {
		return p, fmt.Errorf("the polygon has %d corners; want 3 or more", n)
	}
	if n > MaxVertices {
		return p, fmt.Errorf("the polygon has %d corners; want at most %d", n, MaxVertices)
	}
	for i, a := range at {
		b := at[(i+1)%n]
		switch d := separation(a, b); {
		case d < touching:
			return p, fmt.Errorf("corners %d and %d of the polygon are the same; want each corner once", i+1, (i+1)%n+1)
		case d > math.Pi-1e-6:
			return p, fmt.Errorf("corners %d and %d of the polygon are opposite each other, so that no arc joins them; want a corner in between", i+1, (i+1)%n+1)
		}
		p.edge = append(p.edge, a.Cross(b).Unit())
	}
	if i, j := p.crossing(); i >= 0 {
		return p, fmt.Errorf("the polygon crosses or touches itself: its sides from corner %d and from corner %d meet; want corners in order round the edge", i+1, j+1)
	}
	left := p.leftArea()
	p.area = min(left, 4*math.Pi-left)
	p.anchor(left <= 2*math.Pi)
	p.enclose()
	return p, nil
}

// crossing finds two sides that meet where they should not, or -1.
func (p *Polygon) crossing() (int, int) {
	n := len(p.at)
	for i := range n {
		for j := i + 1; j < n; j++ {
			a, b, c, d := p.at[i], p.at[(i+1)%n], p.at[j], p.at[(j+1)%n]
			if j == i+1 || (j+1)%n == i {
				// Neighbours share a corner; the far ends must keep off.
				far, end := d, b
				if (j+1)%n == i {
					far, end = c, a
				}
				if n == 3 {
					continue
				}
				other := a
				if end == a {
					other = b
				}
				if p.toEdge(far, i) < touching || p.toEdge(other, j) < touching {
					return i, j
				}
				continue
			}
			if arcsCross(a, b, c, d) || p.toEdge(c, i) < touching || p.toEdge(d, i) < touching || p.toEdge(a, j) < touching || p.toEdge(b, j) < touching {
				return i, j
			}
		}
	}
	if n == 3 && math.Abs(p.at[0].Cross(p.at[1]).Dot(p.at[2])) < 1e-15 {
		return 0, 1
	}
	return -1, -1
}

// arcsCross reports whether two arcs cross at a point inside both.
func arcsCross(a, b, c, d ephemeris.Vec) bool {
	ab, cd := a.Cross(b), c.Cross(d)
	sc, sd, sa, sb := ab.Dot(c), ab.Dot(d), cd.Dot(a), cd.Dot(b)
	// c and d on either side of ab, a and b on either side of cd, and the
	// crossing in front of both, not one behind the other.
	return sc*sd < 0 && sa*sb < 0 && sc*sb > 0
}

// toEdge is the angle from v to the nearest point of side i.
func (p *Polygon) toEdge(v ephemeris.Vec, i int) float64 {
	a, b, pole := p.at[i], p.at[(i+1)%len(p.at)], p.edge[i]
	if pole.Cross(a).Dot(v) > 0 && b.Cross(pole).Dot(v) > 0 {
		return math.Abs(math.Asin(max(-1, min(1, pole.Dot(v)))))
	}
	return min(separation(v, a), separation(v, b))
}

// leftArea is the area on the left of the line, sr: signed triangles from a
// point near its middle, modulo the whole sky.
//
// Source of the triangle's area: Van Oosterom & Strackee 1983, IEEE Trans.
// Biomed. Eng. 30, 125.
func (p *Polygon) leftArea() float64 {
	var sum ephemeris.Vec
	for _, a := range p.at {
		sum = sum.Add(a)
	}
	// Off the corners by a little, so that no triangle is half the sky.
	o := sum.Add(ephemeris.Vec{1.7e-3, -2.3e-3, 0.9e-3}).Unit()
	area := 0.0
	for i, a := range p.at {
		b := p.at[(i+1)%len(p.at)]
		area += 2 * math.Atan2(o.Dot(a.Cross(b)), 1+o.Dot(a)+a.Dot(b)+b.Dot(o))
	}
	area = math.Mod(area, 4*math.Pi)
	if area < 0 {
		area += 4 * math.Pi
	}
	return area
}

// anchor finds on which side of the line six directions lie, spread over the
// sky, so that any other is near one of them.
func (p *Polygon) anchor(left bool) {
	// A point just left of the middle of the longest side is inside when the
	// left part is the smaller one.
	long := 0
	for i := range p.at {
		if separation(p.at[i], p.at[(i+1)%len(p.at)]) > separation(p.at[long], p.at[(long+1)%len(p.at)]) {
			long = i
		}
	}
	middle := p.at[long].Add(p.at[(long+1)%len(p.at)]).Unit()
	off := 0.1
	for i := range p.at {
		if i != long {
			off = min(off, p.toEdge(middle, i)/3)
		}
	}
	start := middle.Scale(math.Cos(off)).Add(p.edge[long].Scale(math.Sin(off))).Unit()
	// Three axes turned by angles that no corner of anybody's box has.
	u := ephemeris.Vec{0.36, 0.48, 0.8}.Add(ephemeris.Vec{0.0137, -0.0071, 0.0031}).Unit()
	v := u.Cross(ephemeris.Vec{0.2917, -0.7331, 0.613}).Unit()
	w := u.Cross(v)
	p.refs = [6]ephemeris.Vec{u, v, w, u.Scale(-1), v.Scale(-1), w.Scale(-1)}
	best := 0
	for k := range p.refs {
		if p.refs[k].Dot(start) > p.refs[best].Dot(start) {
			best = k
		}
	}
	p.inside[best] = left != p.odd(start, p.refs[best])
	side := (best + 1) % 6 // a right angle from best
	for k := 1; k < 6; k++ {
		if k != 3 {
			r := (best + k) % 6
			p.inside[r] = p.inside[best] != p.odd(p.refs[best], p.refs[r])
		}
	}
	far := (best + 3) % 6
	p.inside[far] = p.inside[side] != p.odd(p.refs[side], p.refs[far])
}

// odd reports whether the arc from one direction to another (less than half
// a turn away) crosses the line an odd number of times.
func (p *Polygon) odd(from, to ephemeris.Vec) bool {
	pole := from.Cross(to)
	n, odd := len(p.at), false
	// A corner that stands on the arc counts as on its left, for both its sides.
	before := pole.Dot(p.at[n-1]) >= 0
	for i := range n {
		now := pole.Dot(p.at[i]) >= 0
		if now != before {
			e := (i + n - 1) % n
			f, t := p.edge[e].Dot(from) >= 0, p.edge[e].Dot(to) >= 0
			// The side rises through the arc's circle where the arc falls
			// through the side's, and the other way round; else they cross
			// behind.
			if f != t && now == f {
				odd = !odd
			}
		}
		before = now
	}
	return odd
}

// enclose finds a circle around the polygon.
func (p *Polygon) enclose() {
	var sum ephemeris.Vec
	for _, a := range p.at {
		sum = sum.Add(a)
	}
	if sum.Norm() < 1e-3 {
		return
	}
	c := sum.Unit()
	far := 0.0
	for _, a := range p.at {
		far = max(far, separation(c, a))
	}
	// Within a quarter turn caps are convex, so they hold the sides too, and
	// the part that holds the opposite point is the larger one.
	if far < math.Pi/2-0.01 {
		p.hull, p.bound = Circle{c, far}, true
	}
}

// Holds is a Shape's.
func (p Polygon) Holds(v ephemeris.Vec) bool {
	if p.bound && separation(v, p.hull.Centre) > p.hull.Radius+1e-12 {
		return false
	}
	near := 0
	for k := range p.refs {
		if p.refs[k].Dot(v) > p.refs[near].Dot(v) {
			near = k
		}
	}
	return p.inside[near] != p.odd(p.refs[near], v)
}

// Place is a Shape's.
func (p Polygon) Place(v ephemeris.Vec, radius float64) Place {
	if p.bound {
		if out := separation(v, p.hull.Centre) - p.hull.Radius; out > radius+1e-12 {
			return Apart
		}
	}
	depth := math.Inf(1)
	for i := range p.at {
		depth = min(depth, p.toEdge(v, i))
	}
	if !p.Holds(v) {
		depth = -depth
	}
	return placed(depth, radius)
}

// Area is the polygon's area, sr.
func (p Polygon) Area() float64 { return p.area }
