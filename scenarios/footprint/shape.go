package footprint

import (
	"math"

	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Place says how a small cap of the sky stands to a region.
type Place uint8

// The places of a cap. Apart and Within are proven; Across is all else.
const (
	Apart  Place = iota // no point of the cap is in the region
	Across              // some may be, some may not
	Within              // every point of the cap is in the region
)

// Shape is a part of the sky.
type Shape interface {
	// Holds reports whether a direction (unit vector) is in the shape.
	Holds(v ephemeris.Vec) bool
	// Place says how the cap around v of a radius (rad) stands to the shape.
	Place(v ephemeris.Vec, radius float64) Place
	// Area is the shape's area, sr, by a closed form.
	Area() float64
}

// placed turns a depth (how far, rad, v is inside the edge; negative outside;
// never more in size than the true distance) into a Place.
func placed(depth, radius float64) Place {
	const guard = 1e-12 // rounding of the depth, rad
	switch {
	case depth >= radius+guard:
		return Within
	case depth < -radius-guard:
		return Apart
	}
	return Across
}

// Cap is the circle of a radius (rad, up to pi) around a centre.
type Cap Circle

// Holds is a Shape's.
func (c Cap) Holds(v ephemeris.Vec) bool { return separation(c.Centre, v) <= c.Radius }

// Place is a Shape's.
func (c Cap) Place(v ephemeris.Vec, radius float64) Place {
	return placed(c.Radius-separation(c.Centre, v), radius)
}

// Area is 2 pi (1 - cos r).
func (c Cap) Area() float64 {
	s := math.Sin(c.Radius / 2)
	return 4 * math.Pi * s * s
}

// Zone is the part of the sky between two latitudes of a coordinate system,
// and between two longitudes going east unless it goes all the way round.
// Angles are rad.
type Zone struct {
	axes             ephemeris.Mat // from ICRS
	south, north     float64
	round            bool
	width            float64       // of longitude, (0, 2 pi)
	westEdge, east   ephemeris.Vec // poles of the meridian planes; the zone is on their positive side
	from             float64
	floor, roof      float64 // sines of the latitudes
	hasSouth, hasNor bool    // the edge is not a pole
}

// NewZone makes a zone. Longitudes run east from west to east edge; a width
// of 2 pi or more is the whole way round.
func NewZone(system visibility.Coordinates, south, north, west, width float64) Zone {
	z := Zone{
		axes: systemAxes(system), south: south, north: north, width: width, from: west, round: width >= 2*math.Pi,
		floor: math.Sin(south), roof: math.Sin(north),
		hasSouth: south > -math.Pi/2, hasNor: north < math.Pi/2,
	}
	s, c := math.Sincos(west)
	z.westEdge = ephemeris.Vec{-s, c, 0}
	s, c = math.Sincos(west + width)
	z.east = ephemeris.Vec{s, -c, 0}
	return z
}

// systemAxes is the rotation from ICRS, found from where three ICRS axes go.
func systemAxes(system visibility.Coordinates) ephemeris.Mat {
	var m ephemeris.Mat
	for k := range 3 {
		var e ephemeris.Vec
		e[k] = 1
		lon, lat := system.FromICRS(Angles(e))
		v := Direction(lon, lat)
		for row := range 3 {
			m[row][k] = v[row]
		}
	}
	return m
}

// depth is how far v is inside; see placed.
func (z *Zone) depth(v ephemeris.Vec) float64 {
	u := z.axes.Apply(v)
	lat := math.Atan2(u[2], math.Hypot(u[0], u[1]))
	d := math.Inf(1)
	if z.hasSouth {
		d = lat - z.south
	}
	if z.hasNor {
		d = min(d, z.north-lat)
	}
	if z.round {
		return d
	}
	// The lune between two meridians is both half skies, or either of them.
	w, e := math.Asin(max(-1, min(1, z.westEdge.Dot(u)))), math.Asin(max(-1, min(1, z.east.Dot(u))))
	if z.width <= math.Pi {
		return min(d, min(w, e))
	}
	return min(d, max(w, e))
}

// Holds is a Shape's.
func (z Zone) Holds(v ephemeris.Vec) bool { return z.depth(v) >= 0 }

// Place is a Shape's.
func (z Zone) Place(v ephemeris.Vec, radius float64) Place {
	return placed(z.depth(v), radius)
}

// Area is width (sin north - sin south).
func (z Zone) Area() float64 { return min(z.width, 2*math.Pi) * (z.roof - z.floor) }

// Map is a MOC as a shape.
type Map struct{ MOC }

// Place is a Shape's.
func (m Map) Place(v ephemeris.Vec, radius float64) Place {
	var in, out bool
	for face := range int64(12) {
		m.visit(Cell{0, face}, v, radius, &in, &out)
		if in && out {
			return Across
		}
	}
	if in {
		return Within
	}
	return Apart
}

// visit notes whether cells that the cap may meet are in the map, or out of
// it. A cell all of one kind is looked at in parts until they are small beside
// the cap: whether it really meets the cap is seen no better than that.
func (m Map) visit(at Cell, v ephemeris.Vec, radius float64, in, out *bool) {
	d, reach := separation(at.Centre(), v), cellReach[at.Order]
	if *in && *out || d > radius+reach {
		return
	}
	b := below(at.Order)
	kind := m.covers(at.Index*b, (at.Index+1)*b)
	if kind == 0 && *out || kind == 2 && *in {
		return
	}
	if kind == 1 || d > radius && reach > radius/4 && at.Order < MaxOrder {
		for k := range int64(4) {
			m.visit(Cell{at.Order + 1, at.Index*4 + k}, v, radius, in, out)
		}
		return
	}
	if kind == 0 {
		*out = true
	} else {
		*in = true
	}
}
