package constraints

import (
	"math"

	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// bodyTrack is the Sun and Moon over one site's night: topocentric directions
// in the intermediate frame of date at the knots of the sky's tables, 600 s
// apart, with cubic interpolation between (error under 0.01").
type bodyTrack struct {
	t0        float64
	sun, moon []ephemeris.Vec
	lit       []float64
	minLit    float64 // of the Moon's lit fraction over the track
	maxLit    float64
}

// trackStep is the distance of the sky's own knots, s: at them its values are
// exact.
const trackStep = 600

func newBodyTrack(sky *visibility.Sky, site int, from, to float64) bodyTrack {
	first := math.Floor(from/trackStep) - 1
	n := int(math.Ceil(to/trackStep)-first) + 2
	b := bodyTrack{t0: first * trackStep, minLit: 1, sun: make([]ephemeris.Vec, n), moon: make([]ephemeris.Vec, n), lit: make([]float64, n)}
	for k := range n {
		fr := sky.Frame(site, b.t0+float64(k)*trackStep)
		b.sun[k], b.moon[k], b.lit[k] = fr.Sun, fr.Moon, fr.Illumination
		b.minLit, b.maxLit = min(b.minLit, fr.Illumination), max(b.maxLit, fr.Illumination)
	}
	return b
}

// weights returns the knot before the one at or before t, and the weights of
// the four knots from there (Lagrange).
func (b *bodyTrack) weights(t float64) (k int, w [4]float64) {
	x := (t - b.t0) / trackStep
	k = min(max(int(x)-1, 0), len(b.lit)-4)
	x -= float64(k) + 1 // within [0, 1) of the middle two
	w = [4]float64{
		-x * (x - 1) * (x - 2) / 6,
		(x + 1) * (x - 1) * (x - 2) / 2,
		-(x + 1) * x * (x - 2) / 2,
		(x + 1) * x * (x - 1) / 6,
	}
	return k, w
}

func at(v []ephemeris.Vec, k int, w *[4]float64) (o ephemeris.Vec) {
	p := v[k : k+4 : k+4]
	for i := range 3 {
		o[i] = w[0]*p[0][i] + w[1]*p[1][i] + w[2]*p[2][i] + w[3]*p[3][i]
	}
	return o
}

func (b *bodyTrack) moonAt(t float64) ephemeris.Vec {
	k, w := b.weights(t)
	return at(b.moon, k, &w)
}

func (b *bodyTrack) sunAt(t float64) ephemeris.Vec {
	k, w := b.weights(t)
	return at(b.sun, k, &w)
}

func (b *bodyTrack) litAt(t float64) float64 {
	k, w := b.weights(t)
	return w[0]*b.lit[k] + w[1]*b.lit[k+1] + w[2]*b.lit[k+2] + w[3]*b.lit[k+3]
}

// zenithAt is the site's zenith in the intermediate frame.
func (ns *nightSky) zenithAt(t float64) ephemeris.Vec {
	s, c := math.Sincos(ns.angleAt(t))
	return ephemeris.Vec{ns.plan.cosLat * c, ns.plan.cosLat * s, ns.plan.sinLat}
}

// Bounds on second derivatives, 1/s^2. A body's altitude sine z.b turns with
// the Earth, |z”| = w^2 = 5.3e-9, and moves by at most 4.5e-6 rad/s itself, which
// adds 2 w 4.5e-6 = 7e-10 and |b”|. The topocentric Moon's |b”|: parallax
// (1/55) w^2 = 1e-10, its own motion (3.3e-6)^2 = 1e-11, and cross terms under
// that; 2e-10 holds all. The lit fraction: (1 - cos i)/2 with i moving by at
// most 4.5e-6 rad/s and |i”| under 2e-10.
const (
	altitudeBend     = 6.5e-9
	moonBend         = 2e-10
	illuminationBend = 2e-10
	// moonSpeed bounds the topocentric Moon's motion, rad/s: 0.66 deg/h on its
	// orbit and 0.28 deg/h of parallax.
	moonSpeed = 0.95 * math.Pi / 180 / 3600
)

// sunBelow finds when the Sun is at most limit high, from the track, with
// bodyGuard inward: for limits that the calendar doesn't store.
func (ns *nightSky) sunBelow(limit float64, night visibility.Interval) []visibility.Interval {
	s := math.Sin(limit - bodyGuard)
	lo := max(night.From, ns.track.t0+trackStep)
	hi := min(night.To, ns.track.t0+float64(len(ns.track.lit)-2)*trackStep)
	return where(nil, lo, hi, 3600, altitudeBend, false, func(t float64) float64 {
		return s - ns.zenithAt(t).Dot(ns.track.sunAt(t))
	})
}

// moonUp fills in when the Moon is up, as the windows need it: for the inner
// side when it may be, for the outer when it surely is.
func (ns *nightSky) moonUp(from, to float64) {
	for side, sign := range sides {
		g := sign * bodyGuard
		ns.up[side] = where(nil, from, to, 1800, altitudeBend, side == inner, func(t float64) float64 {
			return ns.zenithAt(t).Dot(ns.track.moonAt(t)) + g
		})
	}
}
