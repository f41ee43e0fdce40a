package visibility

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// Exact answers where a star, the Sun and the Moon stand, one instant at a
// time and with everything in it: proper motion, deflection by the Sun,
// aberration, precession-nutation, Earth rotation with UT1, the observer's
// own motion and place. It is the oracle of the fast path, and what audits
// and almanacs use. Polar motion and refraction are left out.
//
// Errors: stars 0.01" (TestExactStars), Sun 1", Moon 20" against a JPL
// ephemeris; valid as far as the ephemeris package is. Safe for concurrent
// use; the same arguments give the same bits, whatever was asked before.
type Exact struct {
	clock *ephemeris.Clock
	days  *dayCache
}

// NewExact returns the exact path for a clock.
func NewExact(c *ephemeris.Clock) *Exact { return &Exact{clock: c, days: new(dayCache)} }

// Horizontal is an airless topocentric apparent place.
type Horizontal struct {
	Altitude    float64 // rad
	Azimuth     float64 // north 0, east 90 deg, [0, 2 pi), rad
	HourAngle   float64 // from the true equator's meridian, west positive, (-pi, pi], rad
	Declination float64 // true equator of date, rad
	// Direction is the unit vector in the horizon frame: east, north, up.
	Direction ephemeris.Vec
}

// Body is the place of a body with its distance from the observer.
type Body struct {
	Horizontal
	DistanceKm float64
}

// MoonBody is the Moon's place and phase, as seen by the observer.
type MoonBody struct {
	Body
	PhaseAngle   float64 // observer-Moon-Sun at the Moon, rad; 0 at full Moon
	Illumination float64 // lit fraction of the disc, 0 to 1
}

// Separation returns the angle between two directions at one place, rad.
func Separation(a, b Horizontal) float64 { return angle(a.Direction, b.Direction) }

// angle returns the angle between two vectors, accurate at any size, rad.
func angle(a, b ephemeris.Vec) float64 { return math.Atan2(a.Cross(b).Norm(), a.Dot(b)) }

// Star returns the apparent place of a position at an instant (UTC, Unix s).
func (e *Exact) Star(s Site, p Position, unix float64) Horizontal { return e.At(unix).Star(s, p) }

// Sun returns the apparent place of the Sun's centre at an instant (UTC, Unix s).
func (e *Exact) Sun(s Site, unix float64) Body { return e.At(unix).Sun(s) }

// Moon returns the apparent place of the Moon's centre at an instant (UTC, Unix s).
func (e *Exact) Moon(s Site, unix float64) MoonBody { return e.At(unix).Moon(s) }

// Instant is the slow part of the sky at one instant. Make it once where many
// places are wanted at the same time; results are the same bits either way.
type Instant struct {
	slow
	Unix     float64 // UTC, Unix s
	Rotation float64 // Earth rotation angle, rad
	t        float64 // TT centuries since J2000.0
	day      *dayTable
	x        float64 // fraction of the day
}

// At prepares an instant (UTC, Unix s).
func (e *Exact) At(unix float64) *Instant {
	t := e.clock.Centuries(unix)
	day, x := e.days.table(t)
	return &Instant{slow: day.at(x), Unix: unix, Rotation: e.clock.ERA(unix), t: t, day: day, x: x}
}

// Centuries returns the instant as TT Julian centuries since J2000.0.
func (n *Instant) Centuries() float64 { return n.t }

// SiderealTime returns the local apparent sidereal time at an east longitude,
// [0, 2 pi), rad.
func (n *Instant) SiderealTime(longitude float64) float64 {
	return wrapTurn(n.Rotation - ephemeris.EquationOfOrigins(n.t) + longitude)
}

const (
	auKm       = 149597870.7 // IAU 2012 Resolution B2
	lightKmS   = 299792.458  // defined
	earthSpin  = 7.292115e-5 // rad/s, IERS Conventions 2010
	wgs84Km    = 6378.137    // equatorial radius
	flattening = 1 / 298.257223563
)

// stand is an observer at an instant: the horizon's axes in the intermediate
// frame, and place and velocity about the geocentre in GCRS axes.
type stand struct {
	east, north, zenith ephemeris.Vec
	place               ephemeris.Vec // km
	velocity            ephemeris.Vec // barycentric, units of c
	turn                float64       // local Earth rotation angle, rad
}

// stand puts an observer on the turning Earth.
func (n *Instant) stand(s Site) stand {
	o := stand{turn: n.Rotation + s.Longitude}
	sinLat, cosLat := math.Sincos(s.Latitude)
	si, co := math.Sincos(o.turn)
	o.zenith = ephemeris.Vec{cosLat * co, cosLat * si, sinLat}
	o.east = ephemeris.Vec{-si, co, 0}
	o.north = ephemeris.Vec{-sinLat * co, -sinLat * si, cosLat}
	const e2 = flattening * (2 - flattening)
	h := s.Elevation / 1000
	curve := wgs84Km / math.Sqrt(1-e2*sinLat*sinLat)
	across := (curve + h) * cosLat
	back := n.matrix.Transpose()
	o.place = back.Apply(ephemeris.Vec{across * co, across * si, (curve*(1-e2) + h) * sinLat})
	o.velocity = n.velocity.Add(back.Apply(o.east.Scale(across * earthSpin / lightKmS)))
	return o
}

// Star returns the apparent place of a position for an observer.
func (n *Instant) Star(s Site, p Position) Horizontal {
	o := n.stand(s)
	toSun := n.sun.Sub(o.place.Scale(1 / auKm))
	d := toSun.Norm()
	v := deflect(p.at(n.t), toSun.Scale(-1/d), d)
	return o.horizontal(n.matrix.Apply(aberrate(v, o.velocity, d)))
}

// Sun returns the apparent place of the Sun's centre for an observer.
func (n *Instant) Sun(s Site) Body {
	// The Sun's own motion about the barycentre in the light time, 0.01", is
	// left out: geometric place plus aberration by the barycentric velocity.
	o := n.stand(s)
	toSun := n.sun.Sub(o.place.Scale(1 / auKm))
	d := toSun.Norm()
	return Body{o.horizontal(n.matrix.Apply(aberrate(toSun.Scale(1/d), o.velocity, d))), d * auKm}
}

// Moon returns the apparent place and phase of the Moon for an observer.
func (n *Instant) Moon(s Site) MoonBody {
	o := n.stand(s)
	// Where the Moon was when the light left, seen from where the observer is
	// now: in the light time the Earth has carried the geocentre on.
	away := n.moon.Sub(o.place)
	for range 2 {
		tau := away.Norm() / lightKmS // s
		away = n.day.moonAt(n.x - tau/86400).Sub(n.velocity.Scale(tau * lightKmS)).Sub(o.place)
	}
	d := away.Norm()
	toSun := n.sun.Scale(auKm).Sub(o.place)
	dir := n.matrix.Apply(aberrate(away.Scale(1/d), o.velocity, toSun.Norm()/auKm))
	phase := angle(away.Scale(-1), toSun.Sub(away))
	return MoonBody{
		Body:         Body{o.horizontal(dir), d},
		PhaseAngle:   phase,
		Illumination: (1 + math.Cos(phase)) / 2,
	}
}

// deflect bends a direction by the Sun's gravity: e is the unit vector Sun to
// observer, d their distance in au. First-order relativity for a source at
// infinity (IERS Conventions 2010; Klioner 2003), held back within the disc.
func deflect(p, e ephemeris.Vec, d float64) ephemeris.Vec {
	limit := 1e-6 / math.Max(d*d, 1)
	w := schwarzschildAU / d / math.Max(1+p.Dot(e), limit)
	return p.Add(p.Cross(e.Cross(p)).Scale(w))
}

// aberrate turns a natural direction into the proper one of an observer with
// velocity v (units of c), d au from the Sun: exact Lorentz form with the
// leading term of the Sun's potential (Klioner 2003, AJ 125, 1580, eq. 7).
func aberrate(p, v ephemeris.Vec, d float64) ephemeris.Vec {
	pv := p.Dot(v)
	inverse := math.Sqrt(1 - v.Dot(v))
	w1 := 1 + pv/(1+inverse)
	w2 := schwarzschildAU / d
	q := p.Scale(inverse).Add(v.Scale(w1)).Add(v.Sub(p.Scale(pv)).Scale(w2))
	return q.Unit()
}

// horizontal takes an apparent unit vector in the intermediate frame to the horizon.
func (o *stand) horizontal(c ephemeris.Vec) Horizontal {
	e, n, z := o.east.Dot(c), o.north.Dot(c), o.zenith.Dot(c)
	// East = (-sin a, cos a, 0), a the local Earth rotation angle.
	ha := math.Atan2(-e, o.east[1]*c[0]-o.east[0]*c[1])
	if ha == -math.Pi {
		ha = math.Pi
	}
	return Horizontal{
		Altitude:    math.Atan2(z, math.Hypot(e, n)),
		Azimuth:     wrapTurn(math.Atan2(e, n)),
		HourAngle:   ha,
		Declination: Declination(c),
		Direction:   ephemeris.Vec{e, n, z},
	}
}

// wrapTurn brings an angle into [0, 2 pi).
func wrapTurn(a float64) float64 {
	a = math.Mod(a, 2*math.Pi)
	if a < 0 {
		a += 2 * math.Pi
	}
	if a >= 2*math.Pi { // a tiny negative angle rounds up
		return 0
	}
	return a
}
