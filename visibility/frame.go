package visibility

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// Frame is one site's horizon at one instant, with the Sun and Moon, all in
// the celestial intermediate frame of date, in which field directions hardly
// move. Build it once for an instant and use it for every field.
type Frame struct {
	T                   float64 // UTC, Unix s
	Zenith, East, North ephemeris.Vec
	vd                  float64
	Sun, Moon           ephemeris.Vec // topocentric apparent unit vectors
	SinSun, SinMoon     float64       // sines of their airless altitudes
	Illumination        float64       // lit fraction of the Moon
	istar               float64       // KS91 eq. 20
}

// Frame returns the horizon of a site at an instant (UTC, Unix s).
func (s *Sky) Frame(site int, unix float64) Frame {
	fr := Frame{T: unix}
	o := &s.sites[site]
	fr.orient(o, s.clock.ERA(unix))
	x := (unix - o.t0) / bodyStep
	k := int(x)
	if k < 0 {
		k = 0
	} else if k > len(o.rows)-2 {
		k = len(o.rows) - 2
	}
	w := x - float64(k)
	a, b := &o.rows[k], &o.rows[k+1]
	for i := range 3 {
		fr.Sun[i] = a.sun[i] + w*(b.sun[i]-a.sun[i])
		fr.Moon[i] = a.moon[i] + w*(b.moon[i]-a.moon[i])
	}
	fr.istar = a.istar + w*(b.istar-a.istar)
	fr.Illumination = a.illumination + w*(b.illumination-a.illumination)
	fr.SinSun = fr.Zenith.Dot(fr.Sun)
	fr.SinMoon = fr.Zenith.Dot(fr.Moon)
	return fr
}

// orient sets the horizon's axes for an Earth rotation angle.
func (fr *Frame) orient(o *siteSky, era float64) {
	s, c := math.Sincos(era + o.lon)
	fr.Zenith = ephemeris.Vec{o.cosLat * c, o.cosLat * s, o.sinLat}
	fr.East = ephemeris.Vec{-s, c, 0}
	fr.North = ephemeris.Vec{-o.sinLat * c, -o.sinLat * s, o.cosLat}
	fr.vd = o.vd
}

// intermediate turns a direction (east, north, up) into the intermediate frame.
func (fr *Frame) intermediate(h ephemeris.Vec) ephemeris.Vec {
	return fr.East.Scale(h[0]).Add(fr.North.Scale(h[1])).Add(fr.Zenith.Scale(h[2]))
}

// SinAltitude returns the sine of the airless altitude of an apparent
// geocentric direction, diurnal aberration included to first order.
func (fr *Frame) SinAltitude(c ephemeris.Vec) float64 {
	return fr.Zenith.Dot(c) * (1 - fr.vd*(fr.East[0]*c[0]+fr.East[1]*c[1]))
}

// AltAz returns airless altitude and azimuth (north 0, east 90 deg, [0, 2 pi)), rad.
func (fr *Frame) AltAz(c ephemeris.Vec) (alt, az float64) {
	u := fr.East[0]*c[0] + fr.East[1]*c[1] + fr.vd
	n := fr.North.Dot(c)
	z := fr.Zenith.Dot(c)
	az = math.Atan2(u, n)
	if az < 0 {
		az += 2 * math.Pi
	}
	return math.Atan2(z, math.Sqrt(u*u+n*n)), az
}

// HourAngle returns the hour angle in (-pi, pi], west positive, rad; diurnal
// aberration included to first order.
func (fr *Frame) HourAngle(c ephemeris.Vec) float64 {
	// East = (-sin a, cos a, 0) with a the local Earth rotation angle.
	return math.Atan2(-fr.East[0]*c[0]-fr.East[1]*c[1]-fr.vd, fr.East[1]*c[0]-fr.East[0]*c[1])
}

// Declination returns the declination with diurnal aberration, up to 0.32"
// from that of the direction, rad.
func (fr *Frame) Declination(c ephemeris.Vec) float64 {
	return Declination(c.Add(fr.East.Scale(fr.vd)))
}

// Declination returns the apparent declination, rad.
func Declination(c ephemeris.Vec) float64 {
	return math.Atan2(c[2], math.Sqrt(c[0]*c[0]+c[1]*c[1]))
}

// Light is what the Sun and Moon add to the sky in one filter at one instant,
// in units of the filter's dark zenith sky, as far as it doesn't depend on
// the field.
type Light struct{ moon, twilight float64 }

// Light returns the filter's light terms for a frame.
func (s *Sky) Light(fr *Frame, filter int) Light {
	ft := &s.filters[filter]
	var l Light
	if fr.SinMoon > 0 {
		l.moon = ft.moonScale * fr.istar * ft.moonPath(fr.SinMoon)
	}
	if fr.SinSun > sinTwilightEnd {
		l.twilight = ft.twilight(fr.SinSun)
	}
	return l
}

// Quality returns q of the filter for a field's direction, 0 to 1.
func (s *Sky) Quality(fr *Frame, filter int, c ephemeris.Vec) float64 {
	return s.LitQuality(fr, filter, s.Light(fr, filter), c)
}

// LitQuality is Quality with the light terms already at hand.
func (s *Sky) LitQuality(fr *Frame, filter int, l Light, c ephemeris.Vec) float64 {
	ft := &s.filters[filter]
	x := fr.SinAltitude(c) * pathSteps
	if !(x > 0) {
		return 0
	}
	k := int(x)
	if k >= pathSteps {
		k = pathSteps - 1
	}
	w := x - float64(k)
	a, b := &ft.path[k], &ft.path[k+1]
	sky := a.dark + w*(b.dark-a.dark) + l.twilight
	if l.moon > 0 {
		sky += l.moon * scattering(fr.Moon.Dot(c)) * (a.loss + w*(b.loss-a.loss))
	}
	if q := (a.clear + w*(b.clear-a.clear)) / sky; q < 1 {
		return q
	}
	return 1
}

// Horizon returns the frame's axes only, without Sun and Moon: what pointing
// needs, at a fraction of the cost.
func (s *Sky) Horizon(site int, unix float64) Frame {
	fr := Frame{T: unix}
	fr.orient(&s.sites[site], s.clock.ERA(unix))
	return fr
}
