// Package mount works out how long a telescope needs between two exposures:
// slews, settling, readout, filter changes, flips and cable wraps. It knows
// directions only, no sky and no dates.
//
// Angles are radians, times seconds, rates rad/s and rad/s^2.
package mount

import (
	"math"

	"nightwright/constraints/survey"
)

// Pointing is where a telescope looks at an instant, airless: altitude and
// azimuth for an altazimuth mount, hour angle and declination for an
// equatorial one. A mount reads only its own two.
type Pointing struct {
	Altitude    float64
	Azimuth     float64 // north 0, east pi/2; any turn
	HourAngle   float64 // west positive, within [-pi, pi]
	Declination float64
}

// AxisTime returns the least time in s for one axis to move by delta at no
// more than rate and acceleration, at rest at both ends: a trapezoid in
// speed, or a triangle when delta is too short to reach the rate.
//
// With s = |delta|: 2 sqrt(s/a) while s <= v^2/a, and s/v + v/a beyond
// (elementary kinematics; common practice for telescope drives).
func AxisTime(delta, rate, acceleration float64) float64 {
	s := math.Abs(delta)
	if s == 0 {
		return 0
	}
	if s*acceleration <= rate*rate {
		return 2 * math.Sqrt(s/acceleration)
	}
	return s/rate + rate/acceleration
}

// Unwrap returns the place of an azimuth in the range of a mount, and false
// when it has none there. A range is at most a full turn wide, so there is one
// place only, save at the ends of a full turn, where From is taken.
func Unwrap(r survey.AzimuthRange, azimuth float64) (float64, bool) {
	turn := 2 * math.Pi
	x := azimuth - turn*math.Floor((azimuth-r.From)/turn)
	if x-r.From >= turn { // rounding of an azimuth a hair below From
		x = r.From
	}
	if x <= r.To {
		return x, true
	}
	return x, false
}

// SlewTime returns the time in s the slower axis takes between two pointings;
// settling and flips are apart. An azimuth outside the mount's range (which no
// legal exposure has) counts from its next place above the range's start.
func SlewTime(t *survey.Telescope, from, to Pointing) float64 {
	a, b := deltas(t, from, to)
	v, acc := t.Slew.Rate, t.Slew.Acceleration
	return math.Max(AxisTime(a, v, acc), AxisTime(b, v, acc))
}

// deltas returns how far each of the mount's two axes has to move.
func deltas(t *survey.Telescope, from, to Pointing) (a, b float64) {
	if t.Mount == survey.Equatorial {
		// Hour angle never passes +-12 h: always the way through the meridian.
		return to.HourAngle - from.HourAngle, to.Declination - from.Declination
	}
	b = to.Altitude - from.Altitude
	if t.AzimuthRange != nil {
		x, _ := Unwrap(*t.AzimuthRange, from.Azimuth)
		y, _ := Unwrap(*t.AzimuthRange, to.Azimuth)
		return y - x, b
	}
	return math.Remainder(to.Azimuth-from.Azimuth, 2*math.Pi), b
}

// Gap returns the least time in s between the end of one exposure, at from,
// and the start of the next on the same telescope, at to:
//
//	max(readout, slew + settle) + filter_change + flip
//
// settle only when the mount moves; filter_change only when the filters
// differ, and inside the maximum when the telescope changes during the slew;
// the flip's time only on an equatorial mount that flips and only between
// exposures on different sides. A side is that of the exposure's start: east
// is a negative hour angle. A flip is a movement and wants the settle too.
func Gap(t *survey.Telescope, from, to Pointing, filterFrom, filterTo int, fromEast, toEast bool) float64 {
	flip := 0.0
	flipped := t.Mount == survey.Equatorial && t.Flip != nil && fromEast != toEast
	if flipped {
		flip = t.Flip.Time
	}
	slew := SlewTime(t, from, to)
	if slew > 0 || flipped {
		slew += t.Slew.Settle
	}
	gap := math.Max(t.Readout, slew)
	if filterFrom != filterTo {
		if t.DuringSlew {
			gap = math.Max(gap, t.FilterChange)
		} else {
			gap += t.FilterChange
		}
	}
	return gap + flip
}

// LeastGap returns the least time in s that can follow any exposure: the
// readout, for the next exposure may be of the same place and filter.
func LeastGap(t *survey.Telescope) float64 { return t.Readout }

// East reports whether an exposure that starts at this pointing is on the
// east side of the meridian.
func East(p Pointing) bool { return p.HourAngle < 0 }
