package draw

import (
	"cmp"
	"math"
	"slices"

	"nightwright/scenarios/footprint"
	"nightwright/visibility"
)

// spot is a place on the sky as the map sees it: longitude from the middle
// meridian, growing eastwards (to the left), and latitude, rad.
type spot struct{ lon, lat float64 }

// skyFrame maps the whole sky onto an ellipse, equal in area (Mollweide's
// projection), right ascension 180 deg in the middle.
type skyFrame struct{ cx, cy, scale float64 } // the ellipse is 4 by 2 scales wide

func (f skyFrame) at(s spot) Point {
	x, y := footprint.Mollweide(math.Pi, s.lat)
	if s.lon != 0 {
		// The projection is linear in longitude; asking it at the middle and
		// stretching keeps +-180 deg apart.
		quarter, _ := footprint.Mollweide(math.Pi+math.Pi/2, s.lat)
		x = quarter * s.lon / (math.Pi / 2)
	}
	return Point{f.cx + f.scale*x, f.cy - f.scale*y}
}

func (f skyFrame) points(spots []spot) []Point {
	out := make([]Point, len(spots))
	for i, s := range spots {
		out[i] = f.at(s)
	}
	return out
}

func lonOf(ra float64) float64 { return math.Remainder(ra-math.Pi, 2*math.Pi) }

// capOutlines returns the outline of a circle on the sky as closed shapes
// that lie within the map: two where the circle crosses the map's edge, and
// one that runs along the edge to the pole where it holds a pole.
func capOutlines(ra, dec, radius float64, n int) [][]spot {
	radius = min(radius, math.Pi/3)
	pole := math.Abs(dec)+radius >= math.Pi/2
	if pole {
		n *= 3
	}
	at := make([]spot, n)
	for k := range at {
		at[k].lon, at[k].lat = offset(ra, dec, radius, 2*math.Pi*float64(k)/float64(n))
	}
	return outlines(ra, dec, at, pole)
}

// boxOutlines does the same for a field with great circles for edges, north
// up, width and height wide.
func boxOutlines(ra, dec, width, height float64, n int) [][]spot {
	x, y := math.Tan(width/2), math.Tan(height/2)
	corners := []Point{{-x, -y}, {x, -y}, {x, y}, {-x, y}}
	var at []spot
	sd, cd := math.Sincos(dec)
	for k, a := range corners {
		b := corners[(k+1)%4]
		for j := range n {
			f := float64(j) / float64(n)
			e, u := a.X+(b.X-a.X)*f, a.Y+(b.Y-a.Y)*f
			// Gnomonic: the direction 1 + e east + u north (common practice).
			r, z := cd-u*sd, sd+u*cd
			at = append(at, spot{ra + math.Atan2(e, r), math.Atan2(z, math.Hypot(r, e))})
		}
	}
	// The pole's place on the tangent plane: north of a northern centre.
	pole := math.Abs(dec) > 1e-9 && cd/math.Abs(sd) <= y
	return outlines(ra, dec, at, pole)
}

// outlines turns an outline of right ascensions and declinations into closed
// shapes within the map.
func outlines(ra, dec float64, at []spot, pole bool) [][]spot {
	lon0 := lonOf(ra)
	ring := make([]spot, len(at))
	inside := true
	for k, p := range at {
		ring[k] = spot{lon0 + math.Remainder(p.lon-ra, 2*math.Pi), p.lat}
		inside = inside && math.Abs(ring[k].lon) <= math.Pi
	}
	if pole {
		return poleOutline(ring, dec)
	}
	if inside {
		return [][]spot{ring}
	}
	edge := math.Copysign(math.Pi, lon0)
	var out [][]spot
	if near := clipLon(ring, edge, edge > 0); len(near) > 2 {
		out = append(out, near)
	}
	if far := clipLon(ring, edge, edge < 0); len(far) > 2 {
		for i := range far {
			far[i].lon -= 2 * edge
		}
		out = append(out, far)
	}
	return out
}

// poleOutline closes the outline of what holds a pole along the map's edge.
func poleOutline(ring []spot, dec float64) [][]spot {
	for k := range ring {
		ring[k].lon = math.Remainder(ring[k].lon, 2*math.Pi)
	}
	slices.SortFunc(ring, func(a, b spot) int { return cmp.Compare(a.lon, b.lon) })
	first, last := ring[0], ring[len(ring)-1]
	// The latitude where the outline crosses the edge, between its neighbours.
	gap := first.lon + 2*math.Pi - last.lon
	lat := last.lat
	if gap > 0 {
		lat += (first.lat - last.lat) * (math.Pi - last.lon) / gap
	}
	pole := math.Copysign(math.Pi/2, dec)
	out := append([]spot{{-math.Pi, lat}}, ring...)
	out = append(out, spot{math.Pi, lat})
	steps := alongEdge(lat, pole)
	for k := 1; k <= steps; k++ {
		out = append(out, spot{math.Pi, lat + (pole-lat)*float64(k)/float64(steps)})
	}
	for k := steps - 1; k >= 1; k-- {
		out = append(out, spot{-math.Pi, lat + (pole-lat)*float64(k)/float64(steps)})
	}
	return [][]spot{out}
}

// alongEdge is into how many steps a way along the map's edge is cut, to
// follow its curve.
func alongEdge(from, to float64) int { return 2 + int(math.Abs(to-from)/(0.3*math.Pi/180)) }

// clipLon keeps the part of a closed outline on one side of a meridian, and
// lets it follow the meridian in small steps where it was cut.
func clipLon(ring []spot, edge float64, below bool) []spot {
	in := func(s spot) bool { return (s.lon <= edge) == below }
	var out []spot
	for k, b := range ring {
		a := ring[(k+len(ring)-1)%len(ring)]
		if in(a) != in(b) {
			t := (edge - a.lon) / (b.lon - a.lon)
			out = append(out, spot{edge, a.lat + (b.lat-a.lat)*t})
		}
		if in(b) {
			out = append(out, b)
		}
	}
	var full []spot
	for k, s := range out {
		full = append(full, s)
		next := out[(k+1)%len(out)]
		if s.lon == edge && next.lon == edge {
			steps := alongEdge(s.lat, next.lat)
			for j := 1; j < steps; j++ {
				full = append(full, spot{edge, s.lat + (next.lat-s.lat)*float64(j)/float64(steps)})
			}
		}
	}
	return full
}

// offset goes a distance from a place in a direction (from north, eastwards).
func offset(ra, dec, distance, bearing float64) (float64, float64) {
	sd, cd := math.Sincos(dec)
	sr, cr := math.Sincos(distance)
	sb, cb := math.Sincos(bearing)
	sin := sd*cr + cd*sr*cb
	return ra + math.Atan2(sb*sr*cd, cr-sd*sin), math.Asin(min(1, max(-1, sin)))
}

// curve draws a line through the sky, cut where it leaves the map's edge.
func (c *Canvas) curve(f skyFrame, s Style, n int, at func(k int) (ra, dec float64)) {
	var part []Point
	var last spot
	for k := range n {
		ra, dec := at(k)
		now := spot{lonOf(ra), dec}
		if k > 0 && math.Abs(now.lon-last.lon) > math.Pi {
			edge := math.Copysign(math.Pi, last.lon)
			t := (edge - last.lon) / (now.lon + 2*edge - last.lon)
			lat := last.lat + (now.lat-last.lat)*t
			c.Line(s, append(part, f.at(spot{edge, lat}))...)
			part = []Point{f.at(spot{-edge, lat})}
		}
		part = append(part, f.at(now))
		last = now
	}
	c.Line(s, part...)
}

// skyGround draws the empty map with its grid.
func (c *Canvas) skyGround(f skyFrame) {
	const degree = math.Pi / 180
	var rim []spot
	for k := range 181 {
		rim = append(rim, spot{-math.Pi, (float64(k) - 90) * degree})
	}
	for k := range 181 {
		rim = append(rim, spot{math.Pi, (90 - float64(k)) * degree})
	}
	c.Polygon(f.points(rim), Style{Fill: Panel, Stroke: Axis, Width: 1})
	guide := Style{Stroke: Grid, Width: 0.8}
	for dec := -60; dec <= 60; dec += 30 {
		c.Line(guide, f.at(spot{-math.Pi, float64(dec) * degree}), f.at(spot{math.Pi, float64(dec) * degree}))
	}
	for lon := -150; lon <= 150; lon += 30 {
		line := make([]spot, 37)
		for k := range line {
			line[k] = spot{float64(lon) * degree, float64(5*k-90) * degree}
		}
		c.Line(guide, f.points(line)...)
	}
}

// skyLines draws the ecliptic and the galactic plane, and writes the grid's
// numbers.
func (c *Canvas) skyLines(f skyFrame) {
	const degree = math.Pi / 180
	c.curve(f, Style{Stroke: Text, Width: 1.3, Dash: "7 4"}, 361, func(k int) (float64, float64) {
		return visibility.Ecliptic.ToICRS(float64(k)*degree, 0)
	})
	c.curve(f, Style{Stroke: Text, Width: 1.5, Dash: "0.1 4"}, 361, func(k int) (float64, float64) {
		return visibility.Galactic.ToICRS(float64(k)*degree, 0)
	})
	for ra := 30; ra < 360; ra += 30 {
		p := f.at(spot{lonOf(float64(ra) * degree), 0})
		text := Number(float64(ra), 0) + "°"
		c.Rect(p.X+2, p.Y-13, textWidth(text, 10)+2, 12, Style{Fill: Panel, Opacity: 0.8})
		c.Text(p.X+3, p.Y-3, text, Type{Size: 10})
	}
	for dec := -60; dec <= 60; dec += 30 {
		p := f.at(spot{math.Pi, float64(dec) * degree})
		sign := ""
		if dec > 0 {
			sign = "+"
		}
		c.Text(p.X-6, p.Y+4, sign+Number(float64(dec), 0)+"°", Type{Size: 11, Ink: Soft, Anchor: End})
	}
}
