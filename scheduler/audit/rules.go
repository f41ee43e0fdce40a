package audit

import (
	"fmt"
	"math"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// sight is one field over one site at one instant, on the exact sky; rad.
type sight struct {
	unix       float64
	star       visibility.Horizontal
	sun, moon  float64 // altitudes
	separation float64 // field to Moon
	phase, lit float64 // of the Moon: phase angle, lit fraction
}

func (j *Judge) look(site, field int, unix float64) sight {
	at := j.exact.At(unix)
	star, sun, moon := at.Star(j.sites[site], j.places[field]), at.Sun(j.sites[site]), at.Moon(j.sites[site])
	return sight{
		unix: unix, star: star, sun: sun.Altitude, moon: moon.Altitude,
		separation: visibility.Separation(star, moon.Horizontal), phase: moon.PhaseAngle, lit: moon.Illumination,
	}
}

// fault is the worst that an exposure does to one rule.
type fault struct {
	over            float64 // by how much, in the rule's own measure
	measured, limit float64 // rad, or a pure number
	unix            float64
}

// instantRules are the rules of an instant, in the order of faults.
var instantRules = [...]struct {
	name, unit, what string
}{
	{RuleSun, "deg", "the Sun is at %.6f deg; it may be at %.6f"},
	{RuleAltitude, "deg", "the field is at %.6f deg; the least is %.6f"},
	{RuleAirmass, "", "the airmass is %.6f; the most is %.6f"},
	{RuleHourAngle, "deg", "the field is %.6f deg from the meridian; the most is %.6f"},
	{RuleHorizon, "deg", "the field is at %.6f deg; the horizon there is at %.6f"},
	{RuleMountAltitude, "deg", "the field is at %.6f deg; the mount's limit is %.6f"},
	{RuleMoonIllumination, "", "%.6f of the Moon is lit while it is up; the most is %.6f"},
	{RuleMoonSeparation, "deg", "the Moon is up and %.6f deg away; the least is %.6f"},
}

// Indices into instantRules.
const (
	atSun = iota
	atAltitude
	atAirmass
	atHourAngle
	atHorizon
	atMountAltitude
	atMoonIllumination
	atMoonSeparation
)

// faults collects the worst of each rule over an exposure.
type faults [len(instantRules)]fault

// atMost notes measured over limit; slack is forgiven.
func (f *faults) atMost(rule int, measured, limit, slack, unix float64) {
	if over := measured - limit; over > slack && over > f[rule].over {
		f[rule] = fault{over, measured, limit, unix}
	}
}

// atLeast notes measured under limit.
func (f *faults) atLeast(rule int, measured, limit, slack, unix float64) {
	if under := limit - measured; under > slack && under > f[rule].over {
		f[rule] = fault{under, measured, limit, unix}
	}
}

// highestSun is the Sun's altitude above which nothing is legal.
const highestSun = -5 * math.Pi / 180

// rules tests every rule of an instant; see the contract of each key of the
// survey's rules, the site's horizon and the telescope's altitude limits.
func (j *Judge) rules(s *shot, v *sight, f *faults) {
	r := &j.sv.Fields[s.field].Rules[s.demand]
	t := &j.sv.Telescopes[s.scope]
	h := v.star.Altitude
	f.atMost(atSun, v.sun, math.Min(r.SunAltitudeMax, highestSun), angleSlack, v.unix)
	f.atLeast(atAltitude, h, r.AltitudeMin, angleSlack, v.unix)
	if x := visibility.Airmass(math.Sin(h + angleSlack)); x > r.AirmassMax {
		f.atMost(atAirmass, visibility.Airmass(math.Sin(h)), r.AirmassMax, ratioSlack, v.unix)
	}
	f.atMost(atHourAngle, math.Abs(v.star.HourAngle), r.HourAngleMax, angleSlack, v.unix)
	if mask := j.sv.Sites[s.site].Horizon; len(mask) > 0 {
		// The azimuth's slack matters more the steeper the mask.
		line, slope := horizonAt(mask, v.star.Azimuth)
		f.atLeast(atHorizon, h, line, angleSlack*(1+slope/math.Max(math.Cos(h), 1e-6)), v.unix)
	}
	f.atLeast(atMountAltitude, h, t.AltitudeMin, angleSlack, v.unix)
	f.atMost(atMountAltitude, h, t.AltitudeMax, angleSlack, v.unix)
	if v.moon > angleSlack {
		f.atMost(atMoonIllumination, v.lit, r.MoonIlluminationMax, ratioSlack, v.unix)
		f.atLeast(atMoonSeparation, v.separation, r.MoonSeparationMin, angleSlack, v.unix)
	}
}

// horizonAt returns the mask's altitude at an azimuth, and how steep it is.
// The mask is linear between its vertices and closed round.
func horizonAt(mask []survey.HorizonPoint, azimuth float64) (altitude, slope float64) {
	n := len(mask)
	for i := range mask {
		p, q := mask[i], mask[(i+1)%n]
		width, along := turn(q.Azimuth-p.Azimuth), turn(azimuth-p.Azimuth)
		if width == 0 { // the only vertex
			return p.Altitude, 0
		}
		if along <= width {
			slope = (q.Altitude - p.Altitude) / width
			return p.Altitude + slope*along, math.Abs(slope)
		}
	}
	return mask[n-1].Altitude, 0
}

// turn brings an angle into [0, 2 pi).
func turn(a float64) float64 {
	a = math.Mod(a, 2*math.Pi)
	if a < 0 {
		a += 2 * math.Pi
	}
	return a
}

// test looks at an exposure at its start, middle and end and at least every
// 30 s between, and returns at how many instants.
func (j *Judge) test(s *shot) int64 {
	half := int(math.Ceil((s.to - s.from) / 2 / longestStep))
	steps := 2 * max(half, 1)
	track := make([]sight, steps+1)
	var f faults
	for k := range track {
		unix := s.from + (s.to-s.from)*float64(k)/float64(steps)
		if k == steps {
			unix = s.to
		}
		track[k] = j.look(s.site, s.field, unix)
		if !s.done {
			j.rules(s, &track[k], &f)
		}
	}
	s.start, s.middle, s.end = track[0], track[steps/2], track[steps]
	filter := j.sv.Filters[s.filter]
	s.quality = visibility.Quality(filter, s.middle.geometry())
	s.sky = visibility.SkyMagnitude(filter, s.middle.geometry())
	out := j.turnAlong(s, track)
	if s.done {
		return int64(len(track))
	}
	for i := range f {
		if f[i].over > 0 {
			r, m, l := &instantRules[i], f[i].measured, f[i].limit
			if r.unit == "deg" {
				m, l = degrees(m), degrees(l)
			}
			s.breach(r.name, m, l, r.unit, r.what+", %.3f s after the start", m, l, f[i].unix-s.from)
		}
	}
	if least := j.sv.Fields[s.field].Rules[s.demand].MinQuality; s.quality < least*(1-ratioSlack) {
		s.breach(RuleQuality, s.quality, least, "", "its quality is %.6f; the least is %.6f", s.quality, least)
	}
	if out != "" {
		s.breach(RuleAzimuthRange, degrees(s.endTurn), degrees(j.sv.Telescopes[s.scope].AzimuthRange.To), "deg", "%s", out)
	}
	j.meridians(s, track)
	return int64(len(track))
}

// turnAlong unwraps the azimuth along an exposure's track. With an azimuth
// range it says when the track leaves it.
func (j *Judge) turnAlong(s *shot, track []sight) (out string) {
	least, most, along := 0.0, 0.0, 0.0
	for k := 1; k < len(track); k++ {
		along += j.azimuthStep(s, &track[k-1], &track[k], 12)
		least, most = math.Min(least, along), math.Max(most, along)
	}
	s.startTurn = track[0].star.Azimuth
	s.endTurn = s.startTurn + along
	t := &j.sv.Telescopes[s.scope]
	if t.Mount != survey.Altazimuth || t.AzimuthRange == nil {
		return ""
	}
	// Any turn that holds the whole track will do.
	r := t.AzimuthRange
	slack := angleSlack / math.Max(math.Cos(s.middle.star.Altitude), 1e-6)
	first := r.From - slack + turn(s.startTurn-r.From+slack)
	for _, at := range [...]float64{first, first - 2*math.Pi} {
		if at+least >= r.From-slack && at+most <= r.To+slack {
			s.startTurn, s.endTurn = at, at+along
			return ""
		}
	}
	s.startTurn, s.endTurn = first, first+along
	return fmt.Sprintf("its azimuth goes from %.6f to %.6f deg; the mount reaches %.6f to %.6f", degrees(first), degrees(first+along), degrees(r.From), degrees(r.To))
}

// azimuthStep is how far the azimuth turns between two sights. Near the zenith
// it turns fast, and the time is halved until the way round is plain.
func (j *Judge) azimuthStep(s *shot, a, b *sight, depth int) float64 {
	d := math.Remainder(b.star.Azimuth-a.star.Azimuth, 2*math.Pi)
	if math.Abs(d) < 1 || depth == 0 {
		return d
	}
	m := j.look(s.site, s.field, (a.unix+b.unix)/2)
	return j.azimuthStep(s, a, &m, depth-1) + j.azimuthStep(s, &m, b, depth-1)
}

// meridians tests what an equatorial mount can't do: pass an hour angle of
// +-12 h, and with a flip go on past the meridian for long when the exposure
// began east of it.
func (j *Judge) meridians(s *shot, track []sight) {
	t := &j.sv.Telescopes[s.scope]
	if t.Mount != survey.Equatorial {
		return
	}
	for k := 1; k < len(track); k++ {
		if a, b := track[k-1].star.HourAngle, track[k].star.HourAngle; b < a-math.Pi {
			s.breach(RuleLowerMeridian, degrees(a), 180, "deg", "its hour angle passes 12 h")
			break
		}
	}
	if t.Flip == nil || s.start.star.HourAngle >= 0 {
		return
	}
	if past := s.end.star.HourAngle; past > t.Flip.PastMeridian+angleSlack {
		s.breach(RuleFlip, degrees(past), degrees(t.Flip.PastMeridian), "deg", "it passes the meridian by %.6f deg; past_meridian is %.6f", degrees(past), degrees(t.Flip.PastMeridian))
	}
}

func degrees(x float64) float64 { return x * 180 / math.Pi }

// airmass is Young's (1994) of the field's airless altitude.
func (v *sight) airmass() float64 { return visibility.Airmass(v.star.Direction[2]) }
