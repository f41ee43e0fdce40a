package visibility

import "math"

const (
	sunStep  = 1800.0 // s between samples of the Sun's altitude
	moonStep = 1800.0
)

// transitWithin is where the iteration for the Sun's transit stops, s.
const transitWithin = 1e-6

// Night returns night day (days since 1970-01-01) at a site: from the Sun's
// upper transit nearest to 12:00 local mean time of that date, longitude as
// written, to the same of the next date. The transit is where the Sun's
// apparent hour angle is 0, so that it exists at the poles. Good to 1 ms.
func (e *Exact) Night(s Site, day int32) Interval {
	return Interval{e.transit(s, day), e.transit(s, day+1)}
}

// transit returns the Sun's upper transit of a date.
func (e *Exact) transit(s Site, day int32) float64 {
	t := float64(day)*86400 + 43200 - s.Longitude/(2*math.Pi)*86400
	for range 8 {
		step := e.Sun(s, t).HourAngle / (2 * math.Pi) * 86400
		t -= step
		if math.Abs(step) < transitWithin {
			break
		}
	}
	return t
}

// sunCurve samples the sine of the Sun's airless topocentric altitude.
func (e *Exact) sunCurve(s Site, iv Interval) curve {
	return sample(func(t float64) float64 { return e.Sun(s, t).Direction[2] }, iv.From, iv.To, sunStep)
}

// SunBelow returns the stretches of a night in which the Sun's centre is at
// or under an airless topocentric altitude (rad); edges good to 1 ms.
func (e *Exact) SunBelow(s Site, night Interval, limit float64) []Interval {
	c := e.sunCurve(s, night)
	return c.below(math.Sin(limit))
}

// MoonAbove returns the stretches of an interval in which the Moon's centre
// is above airless topocentric altitude 0: while it counts as up. Edges are
// good to 1 ms of the ephemeris used.
func (e *Exact) MoonAbove(s Site, iv Interval) []Interval {
	c := sample(func(t float64) float64 { return -e.Moon(s, t).Direction[2] }, iv.From, iv.To, moonStep)
	return c.below(0)
}

// Standard altitudes of rise and set, common practice: refraction of 34' at
// the horizon, and 16' for the Sun's semidiameter; twilights by the Sun's centre.
const (
	horizonRefraction = 34.0 / 60 * degree
	sunRiseAltitude   = -50.0 / 60 * degree
	civilAltitude     = -6 * degree
	nauticalAltitude  = -12 * degree
	darkAltitude      = -18 * degree
	moonRadiusKm      = 1737.4 // IAU
)

// Crossing tells how the Sun goes about an altitude within a night.
type Crossing uint8

// What the Sun can do between two transits.
const (
	Crosses     Crossing = iota // it goes under and comes back
	AlwaysAbove                 // polar day, or a night without that twilight
	AlwaysBelow                 // polar night
	SetsOnly                    // it goes under and stays there
	RisesOnly                   // it comes up and stays there
)

var crossingNames = [...]string{"crosses", "always above", "always below", "sets only", "rises only"}

// String returns the crossing in words.
func (c Crossing) String() string { return crossingNames[c] }

// Passage is when the Sun goes under an altitude and comes back, UTC Unix s;
// NaN where it doesn't.
type Passage struct {
	Down, Up float64
	State    Crossing
}

// AlmanacRow is one night at one site; instants are UTC Unix seconds.
type AlmanacRow struct {
	Night Interval
	// Horizon is sunset and sunrise (centre at -50'), Civil -6 deg, Nautical
	// -12 deg, Dark -18 deg.
	Horizon, Civil, Nautical, Dark Passage
	// Moonrise and Moonset are when the upper limb passes the horizon, with
	// refraction of 34'; none, one or two in a night.
	Moonrise, Moonset []float64
	Illumination      float64 // lit fraction of the Moon, topocentric, mid-night
	DarkHours         float64 // Sun below -18 deg, h
	MoonlessHours     float64 // of these, with the Moon's centre not above 0, h
}

// Almanac returns the almanac of night day (days since 1970-01-01) at a site.
// No dip for the site's elevation; airless altitudes but for the standard 34'.
func (e *Exact) Almanac(s Site, day int32) AlmanacRow {
	row := AlmanacRow{Night: e.Night(s, day)}
	sun := e.sunCurve(s, row.Night)
	row.Horizon = passage(sun.below(math.Sin(sunRiseAltitude)), row.Night)
	row.Civil = passage(sun.below(math.Sin(civilAltitude)), row.Night)
	row.Nautical = passage(sun.below(math.Sin(nauticalAltitude)), row.Night)
	dark := sun.below(math.Sin(darkAltitude))
	row.Dark = passage(dark, row.Night)
	row.Moonrise, row.Moonset = e.moonLimb(s, row.Night)
	row.Illumination = e.Moon(s, (row.Night.From+row.Night.To)/2).Illumination
	for _, iv := range dark {
		row.DarkHours += (iv.To - iv.From) / 3600
		row.MoonlessHours += (iv.To - iv.From) / 3600
		for _, up := range e.MoonAbove(s, iv) {
			row.MoonlessHours -= (up.To - up.From) / 3600
		}
	}
	row.MoonlessHours = math.Max(0, row.MoonlessHours)
	return row
}

// passage reads the first way down and the last way up from the intervals below.
func passage(below []Interval, night Interval) Passage {
	p := Passage{Down: math.NaN(), Up: math.NaN()}
	if len(below) == 0 {
		p.State = AlwaysAbove
		return p
	}
	first, last := below[0], below[len(below)-1]
	if first.From > night.From {
		p.Down = first.From
	} else if len(below) > 1 {
		p.Down = below[1].From
	}
	if last.To < night.To {
		p.Up = last.To
	} else if len(below) > 1 {
		p.Up = below[len(below)-2].To
	}
	switch down, up := !math.IsNaN(p.Down), !math.IsNaN(p.Up); {
	case down && up:
		p.State = Crosses
	case down:
		p.State = SetsOnly
	case up:
		p.State = RisesOnly
	default:
		p.State = AlwaysBelow
	}
	return p
}

// moonLimb returns when the Moon's upper limb passes the refracted horizon.
func (e *Exact) moonLimb(s Site, iv Interval) (rise, set []float64) {
	return e.moonPasses(s, iv, func(distance float64) float64 {
		return -(horizonRefraction + math.Asin(moonRadiusKm/distance))
	})
}

// moonPasses returns when the Moon's centre passes an altitude (rad) that may
// depend on its topocentric distance (km).
func (e *Exact) moonPasses(s Site, iv Interval, altitude func(distance float64) float64) (rise, set []float64) {
	c := sample(func(t float64) float64 {
		m := e.Moon(s, t)
		return math.Sin(altitude(m.DistanceKm)) - m.Direction[2]
	}, iv.From, iv.To, moonStep)
	for _, up := range c.below(0) {
		if up.From > iv.From {
			rise = append(rise, up.From)
		}
		if up.To < iv.To {
			set = append(set, up.To)
		}
	}
	return rise, set
}
