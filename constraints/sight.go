package constraints

import (
	"math"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Sight is the geometry of one field over one site at one instant: all that
// the rules need to know of the sky. Angles rad, airless and topocentric.
type Sight struct {
	Unix              float64
	Altitude, Azimuth float64 // azimuth north 0, east pi/2, [0, 2 pi)
	SinAltitude       float64
	HourAngle         float64 // (-pi, pi], west positive
	Declination       float64 // apparent
	SunAltitude       float64
	MoonAltitude      float64
	MoonSeparation    float64
	MoonIllumination  float64 // 0..1
	MoonPhaseAngle    float64 // exact path only
	Quality           float64 // of the filter asked for
}

// SightAt works out a sight by the exact path, without quality.
func SightAt(n *visibility.Instant, site visibility.Site, p visibility.Position) Sight {
	star, sun, moon := n.Star(site, p), n.Sun(site), n.Moon(site)
	return Sight{
		Unix: n.Unix, Altitude: star.Altitude, Azimuth: star.Azimuth, SinAltitude: math.Sin(star.Altitude),
		HourAngle: star.HourAngle, Declination: star.Declination,
		SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude,
		MoonSeparation:   visibility.Separation(star, moon.Horizontal),
		MoonIllumination: moon.Illumination, MoonPhaseAngle: moon.PhaseAngle,
	}
}

// ExactSight is SightAt with the quality in a filter.
func ExactSight(e *visibility.Exact, site visibility.Site, p visibility.Position, f visibility.Filter, unix float64) Sight {
	s := SightAt(e.At(unix), site, p)
	s.Quality = s.QualityIn(f)
	return s
}

// QualityIn returns q in a filter by the plain formula; it needs the phase
// angle, which only the exact path gives.
func (s *Sight) QualityIn(f visibility.Filter) float64 {
	return visibility.Quality(f, visibility.Geometry{
		SinAltitude: s.SinAltitude, SunAltitude: s.SunAltitude, MoonAltitude: s.MoonAltitude,
		MoonSeparation: s.MoonSeparation, MoonPhaseAngle: s.MoonPhaseAngle,
	})
}

// SkySight works out a sight from the sky's tables: a frame of the site and
// the field's id, with the quality in the given filter. fr must be of the
// same sky.
func SkySight(sky *visibility.Sky, fr *visibility.Frame, field, filter int) Sight {
	bodies := skyBodies(fr)
	c := sky.Direction(field, fr.T)
	s := bodies.sight(fr, c)
	s.Quality = sky.Quality(fr, filter, c)
	return s
}

// bodies is the part of a sight that all fields of a frame share.
type bodies struct{ sun, moon float64 }

func skyBodies(fr *visibility.Frame) bodies { return bodies{asin(fr.SinSun), asin(fr.SinMoon)} }

func (b bodies) sight(fr *visibility.Frame, c ephemeris.Vec) Sight {
	s := Sight{
		Unix: fr.T, SinAltitude: fr.SinAltitude(c), HourAngle: fr.HourAngle(c), Declination: visibility.Declination(c),
		SunAltitude: b.sun, MoonAltitude: b.moon, MoonIllumination: fr.Illumination,
		MoonSeparation: math.Acos(max(-1, min(1, fr.Moon.Dot(c)))),
	}
	s.Altitude, s.Azimuth = fr.AltAz(c)
	return s
}

func asin(x float64) float64 { return math.Asin(max(-1, min(1, x))) }

// Evaluate returns the rules that a field's demand breaks on a telescope at an
// instant, from geometry alone: everything but closures, losses and reserves,
// which Calendar.Reasons adds. The rules are those of an instant; what an
// exposure must keep along its way is in LeavesAzimuthRange and
// CrossesMeridian.
func Evaluate(sv *survey.Survey, field, demand, telescope int, s *Sight) Reasons {
	f := &sv.Fields[field]
	t := &sv.Telescopes[telescope]
	r := &f.Rules[demand]
	var out Reasons
	if outsideDates(s, f) {
		out |= Dates
	}
	if sunTooHigh(s, r.SunAltitudeMax) {
		out |= Sun
	}
	if tooLow(s, r.AltitudeMin) {
		out |= Altitude
	}
	if overAirmass(s, r.AirmassMax) {
		out |= Airmass
	}
	if pastHourAngle(s, r.HourAngleMax) {
		out |= HourAngle
	}
	if belowHorizon(s, sv.Sites[t.Site].Horizon) {
		out |= Horizon
	}
	if outsideMountAltitude(s, t) {
		out |= MountAltitude
	}
	if outsideAzimuth(s, t) {
		out |= AzimuthRange
	}
	if brightMoon(s, r.MoonIlluminationMax) {
		out |= MoonIllumination
	}
	if nearMoon(s, r.MoonSeparationMin) {
		out |= MoonSeparation
	}
	if poorQuality(s, r.MinQuality) {
		out |= Quality
	}
	return out
}

// Reasons returns what the calendar has against observing with a telescope at
// an instant: closures, losses, reserved blocks. Outside the period it is
// Closed.
func (c *Calendar) Reasons(telescope int, unix float64) Reasons {
	o := &c.telescopes[telescope]
	n, ok := c.NightAt(o.site, unix)
	if !ok {
		return Closed
	}
	var out Reasons
	if holds(o.closed[n], unix) {
		out |= Closed
	}
	if holds(o.lost[n], unix) {
		out |= Lost
	}
	if holds(o.reserved[n], unix) {
		out |= Reserved
	}
	return out
}

// holds tells whether an instant lies in one of a few intervals, [From, To).
func holds(a []visibility.Interval, t float64) bool {
	for _, x := range a {
		if x.From <= t && t < x.To {
			return true
		}
	}
	return false
}

// Blocked returns why a field can't be observed from a site at an instant, for
// any demand on any telescope that may serve it: none when one of them can.
// Otherwise the rules that all of them break, or, when there is no such, all
// rules that any of them breaks. sightOf gives the sight for a filter.
func Blocked(sv *survey.Survey, cal *Calendar, field, site int, unix float64, sightOf func(filter int) Sight) (Reasons, bool) {
	f := &sv.Fields[field]
	demands := sv.Programs[f.Program].Demands
	common, any := ^Reasons(0), Reasons(0)
	served := false
	for d := range demands {
		for _, t := range sv.Sites[site].Telescopes {
			if !sv.Qualifies(f, &demands[d], t) {
				continue
			}
			served = true
			base := cal.Reasons(t, unix)
			var why Reasons
			for _, x := range demands[d].Exposures {
				s := sightOf(x.Filter)
				why |= base | Evaluate(sv, field, d, t, &s)
			}
			if why == 0 {
				return 0, true
			}
			common &= why
			any |= why
		}
	}
	switch {
	case !served:
		return 0, false
	case common != 0:
		return common, false
	}
	return any, false
}
