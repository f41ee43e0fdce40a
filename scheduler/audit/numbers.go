package audit

import (
	"math"
)

// How far a number of a row may be from the recomputed one; see the package's
// comment.
const (
	angleNear    = 0.1 / 3600 // deg
	ratioNear    = 1e-6       // relative
	skyNear      = 1e-5       // mag/arcsec2
	gapNear      = 1e-3       // s
	positionNear = 1e-9       // deg, of what only passes through
)

// numbers holds the numbers of each row against the exact sky at the
// exposure's middle.
func (c *trial) numbers() {
	for i := range c.shots {
		s := &c.shots[i]
		if !s.known {
			continue
		}
		c.geometry(s)
		credit := 0.0
		if s.counts {
			credit = s.unit * s.quality
		}
		s.number("credit", s.Credit, credit, ratioNear*math.Abs(credit)+1e-15, "")
		s.number("gap_before_s", s.GapBefore, s.gap, gapNear, "s")
		s.number("exposure_s", s.Exposure, s.to-s.from, timeSlack*1e-6, "s")
	}
}

// geometry holds direction, Sun, Moon and sky.
func (c *trial) geometry(s *shot) {
	f := &c.j.sv.Fields[s.field]
	v := &s.middle
	s.number("ra_deg", s.RA, degrees(f.RA), positionNear, "deg")
	s.number("dec_deg", s.Dec, degrees(f.Dec), positionNear, "deg")
	s.number("altitude_deg", s.Altitude, degrees(v.star.Altitude), angleNear, "deg")
	// On the sky: an azimuth means little next to the zenith.
	azimuth := degrees(v.star.Azimuth)
	off := math.Remainder(s.Azimuth-azimuth, 360) * math.Cos(v.star.Altitude)
	if !(math.Abs(off) <= angleNear) || !(s.Azimuth >= 0 && s.Azimuth <= 360) {
		s.breach(RuleNumber, s.Azimuth, azimuth, "deg", "azimuth_deg is %v; it is %v", s.Azimuth, azimuth)
	}
	airmass := v.airmass()
	s.number("airmass", s.Airmass, airmass, ratioNear*airmass, "")
	s.number("sun_altitude_deg", s.SunAltitude, degrees(v.sun), angleNear, "deg")
	s.number("moon_altitude_deg", s.MoonAltitude, degrees(v.moon), angleNear, "deg")
	s.number("moon_separation_deg", s.MoonSeparation, degrees(v.separation), angleNear, "deg")
	s.number("sky_mag_arcsec2", s.SkyMagnitude, s.sky, skyNear, "mag/arcsec2")
	s.number("quality", s.Quality, s.quality, ratioNear*s.quality, "")
}

// number notes a column whose value isn't near what it should be; NaN never is.
func (s *shot) number(column string, is, want, near float64, unit string) {
	if math.Abs(is-want) <= near || is == want {
		return
	}
	s.breach(RuleNumber, is, want, unit, "%s is %v; it is %v", column, is, want)
}
