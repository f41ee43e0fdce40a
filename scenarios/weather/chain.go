package weather

import (
	"math"

	"nightwright/constraints/survey"
)

// hour is the chain's step, s.
const hour = 3600

// Climate is a site's weather.
type Climate struct {
	Site        string
	Clear       [12]float64 // open share of the hours of each month, January first
	Persistence float64     // s; 0 or less forgets at once
	Region      string      // sites that share weather; "" for none
	Correlation float64     // with an equal site of the region, 0 to 1
	Levels      []survey.SkyLevel
	// LevelPersistence is the time scale of the levels, s.
	LevelPersistence float64
}

// Of returns a site's weather, and false when the survey gives none: such a
// sky is always open and at its best.
func Of(site *survey.Site) (Climate, bool) {
	c := Climate{
		Site: site.Name, Persistence: site.Persistence, Region: site.Region, Correlation: site.Correlation,
		Levels: site.Levels, LevelPersistence: site.LevelPersistence,
	}
	if len(site.Clear) != 12 {
		for m := range c.Clear {
			c.Clear[m] = 1
		}
		c.Levels, c.Region = nil, ""
		return c, false
	}
	copy(c.Clear[:], site.Clear)
	return c, true
}

// Keep returns r, the probability that an hour keeps the state of the hour
// before: exp(-1 h / persistence), which is also the correlation of the two.
func (c *Climate) Keep() float64 { return Keep(c.Persistence, hour) }

// Keep returns exp(-step / persistence), both in s; 0 without persistence.
func Keep(persistence, step float64) float64 {
	if !(persistence > 0) {
		return 0
	}
	return math.Exp(-step / persistence)
}

// Persistence is the inverse of Keep: the time scale in s of a chain whose
// states one step (s) apart have correlation r; 0 for r <= 0, +Inf for 1.
func Persistence(r, step float64) float64 {
	switch {
	case !(r > 0):
		return 0
	case r >= 1:
		return math.Inf(1)
	}
	return -step / math.Log(r)
}

// MeanRuns returns the mean lengths, in steps, of runs of open and of closed
// states of a chain with open share p and correlation r:
// 1/((1-r)(1-p)) and 1/((1-r) p).
func MeanRuns(p, r float64) (open, closed float64) {
	return 1 / ((1 - r) * (1 - p)), 1 / ((1 - r) * p)
}

// follow is the probability that a site takes the region's draws in an hour.
// For two sites with the same r and p that follow with probability f each, the
// stationary correlation rho of their states is f^2 / (1 + r - f^2 r): both
// follow with f^2, and then they keep or renew together; else they move apart
// independently. Solved for f.
func (c *Climate) follow() float64 {
	if c.Region == "" {
		return 0
	}
	r := c.Keep()
	return math.Sqrt(c.Correlation * (1 + r) / (1 + c.Correlation*r))
}

// Factor is what a level makes of quality: flux falls by 10^(-0.4 A), and with
// the sky as the noise the worth of an exposure goes with the flux squared and
// with the inverse square of the seeing, as in the survey's own quality
// (extinction 10^(-0.8 k X), seeing X^0.6 to X^-1.2).
func Factor(v survey.SkyLevel) float64 {
	s := math.Max(1, v.Seeing)
	return math.Pow(10, -0.8*v.Extinction) / (s * s)
}

// MeanFactor is the mean over the open hours of what levels make of quality.
func (c *Climate) MeanFactor() float64 {
	rest, sum := 1.0, 0.0
	for _, v := range c.Levels {
		rest -= v.Share
		sum += v.Share * Factor(v)
	}
	return sum + math.Max(0, rest)
}

// Month returns the month, 0 to 11, of an hour number (hours since 1970, UTC).
func Month(h int64) int { return survey.Day(floorDiv(h, 24)).Month() }

func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b != 0 && (a < 0) != (b < 0) {
		q--
	}
	return q
}

// Forecast fills p with the probability that each of the hours first,
// first+1, ... is open, when the hour before first was open (state 1), closed
// (0), or is not known (any other value). It is the chain's own conditional
// mean, p' = r p + (1 - r) x month's clear fraction.
func (c *Climate) Forecast(p []float64, first int64, state int) {
	r := c.Keep()
	now := 0.0
	switch state {
	case 0:
	case 1:
		now = 1
	default:
		now = c.Clear[Month(first)]
	}
	month, until := 0, int64(math.MinInt64)
	for i := range p {
		h := first + int64(i)
		if h >= until {
			month, until = Month(h), (floorDiv(h, 24)+1)*24
		}
		now = r*now + (1-r)*c.Clear[month]
		p[i] = now
	}
}
