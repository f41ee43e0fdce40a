package constraints

import (
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

const arcsec = math.Pi / 648000

// How windows are found: over one night a field's apparent direction hardly
// moves in the celestial intermediate frame, so it is frozen at the middle of
// the dark time and only the Earth turns, uniformly. Limits on altitude, hour
// angle and azimuth are then crossings in closed form. What that leaves out
// (0.2" of aberration and nutation in 12 h, 0.32" of diurnal aberration, 0.05"
// of the sky tables) is covered by moving each limit by directionGuard, inward
// for windows and outward for bounds.
const (
	directionGuard = 1 * arcsec
	// moonGuard covers what is left in the separation once the diurnal
	// aberration is applied, and the interpolated Moon (0.001").
	moonGuard = 0.4 * arcsec
	// bodyGuard covers the interpolated altitude of Sun and Moon.
	bodyGuard = 0.2 * arcsec
	// illuminationGuard covers the interpolated lit fraction.
	illuminationGuard = 2e-8
	// timePad covers the root finding of twilight (1 ms) and float64 sums of
	// Unix seconds, s.
	timePad = 0.002
)

// sides are the signs of the guards: limits moved inward, then outward.
var sides = [2]float64{inner: 1, outer: -1}

const (
	inner = 0
	outer = 1
)

// turnRate is the Earth's rotation, rad/s of UT1: IAU 2000 Earth rotation
// angle, 1.00273781191135448 turns a day.
const turnRate = 2 * math.Pi * 1.00273781191135448 / 86400

// turnTime is the time of one turn of the Earth under the stars, s.
const turnTime = 2 * math.Pi / turnRate

// sitePlan is what of a site the nights have in common.
type sitePlan struct {
	site           int
	place          *survey.Site
	sinLat, cosLat float64
	vd             float64   // speed of rotation over that of light
	loosest        float64   // highest Sun limit of the units needed here
	limits         []float64 // distinct Sun limits of those units, ascending
	limitOf        []int32   // by unit; -1: not needed here
	classes        []classPlan
	mask           mask
	fields         []bool // needed here
	moon           bool   // some unit has a rule on the Moon
}

// classPlan is a class with what follows from its limits.
type classPlan struct {
	id int
	class
	sinMin, sinMax [2]float64
	ends           [2]struct{ sin, cos float64 } // of the azimuth range
}

func newSitePlan(w *Windows, site int, needed []bool) *sitePlan {
	p := &sitePlan{site: site, place: &w.sv.Sites[site], loosest: math.Inf(-1)}
	p.sinLat, p.cosLat = math.Sincos(p.place.Latitude)
	p.vd = turnRate * 6378137 * p.cosLat / 299792458
	p.mask = newMask(p.place.Horizon)
	p.limitOf = make([]int32, len(w.units))
	p.fields = make([]bool, len(w.sv.Fields))
	for k := range w.classes {
		if w.classes[k].site == site {
			p.classes = append(p.classes, newClassPlan(k, w.classes[k]))
		}
	}
	for u := range w.units {
		p.limitOf[u] = -1
		for _, c := range p.classes {
			if needed[c.id*len(w.units)+u] {
				p.limitOf[u] = 0
			}
		}
		if p.limitOf[u] == 0 {
			p.fields[w.units[u].field] = true
			p.limits = append(p.limits, w.units[u].rules.SunAltitudeMax)
			p.moon = p.moon || !w.units[u].noMoonSep || !w.units[u].noIllu
		}
	}
	slices.Sort(p.limits)
	p.limits = slices.Compact(p.limits)
	for u := range w.units {
		if p.limitOf[u] == 0 {
			k, _ := slices.BinarySearch(p.limits, w.units[u].rules.SunAltitudeMax)
			p.limitOf[u] = int32(k)
		}
	}
	if n := len(p.limits); n > 0 {
		p.loosest = p.limits[n-1]
	}
	return p
}

func newClassPlan(id int, c class) classPlan {
	p := classPlan{id: id, class: c}
	for side, sign := range sides {
		p.sinMin[side] = sinAbove(c.altMin + sign*directionGuard)
		p.sinMax[side] = 2
		if c.altMax < math.Pi/2 {
			p.sinMax[side] = sinAbove(c.altMax - sign*directionGuard)
		}
	}
	if c.hasAzimuth {
		p.ends[0].sin, p.ends[0].cos = math.Sincos(c.azimuth.From)
		p.ends[1].sin, p.ends[1].cos = math.Sincos(c.azimuth.To)
	}
	return p
}

// nightSky is what a site's night gives to all its fields.
type nightSky struct {
	plan  *sitePlan
	mid   float64 // UTC, Unix s: middle of the dark time
	angle float64 // local Earth rotation angle at mid
	pad   float64 // s, on edges: timePad, and how far the Earth's turning departs from uniform
	sun   [][]visibility.Interval
	dirs  []place // by field; of no meaning where not needed
	track bodyTrack
	up    [2][]visibility.Interval // when the Moon may be up [inner], is surely up [outer]
}

// place is a field's direction of the night.
type place struct {
	c       ephemeris.Vec
	transit float64 // UTC, Unix s, of the upper transit nearest to mid
	rho, z  float64 // cos and sin of the declination
}

// newNightSky prepares a site's night, or returns nil when it has no dark
// time; mem, of a place a field, becomes part of it.
func newNightSky(p *sitePlan, sky *visibility.Sky, cal *Calendar, night int, mem []place) *nightSky {
	if len(p.limits) == 0 {
		return nil
	}
	whole := cal.Night(p.site, night)
	ns := &nightSky{plan: p}
	loosest, stored := cal.SunBelow(p.site, night, p.loosest)
	if !stored {
		loosest = []visibility.Interval{whole}
	}
	if len(loosest) == 0 {
		return nil
	}
	from, to := loosest[0].From, loosest[len(loosest)-1].To
	ns.mid = (from + to) / 2
	ns.angle = localAngle(sky, p.site, ns.mid)
	ns.pad = timePad + max(ns.departure(sky, from), ns.departure(sky, to))
	ns.track = newBodyTrack(sky, p.site, from, to)
	for _, limit := range p.limits {
		below, ok := cal.SunBelow(p.site, night, limit)
		if !ok {
			below = ns.sunBelow(limit, whole)
		}
		ns.sun = append(ns.sun, below)
	}
	if p.moon {
		ns.moonUp(from, to)
	}
	ns.dirs = mem
	for f, needed := range p.fields {
		if needed {
			ns.dirs[f] = ns.direction(sky.Direction(f, ns.mid))
		}
	}
	return ns
}

// localAngle is the Earth rotation angle plus longitude, from the sky's frame.
func localAngle(sky *visibility.Sky, site int, t float64) float64 {
	fr := sky.Frame(site, t)
	return math.Atan2(-fr.East[0], fr.East[1])
}

// departure tells by how many seconds uniform turning from mid misses the
// Earth's angle at t: a leap second in the night, or the drift of UT1.
func (ns *nightSky) departure(sky *visibility.Sky, t float64) float64 {
	d := localAngle(sky, ns.plan.site, t) - ns.angle - turnRate*(t-ns.mid)
	return math.Abs(math.Remainder(d, 2*math.Pi)) / turnRate
}

// angleAt is the local Earth rotation angle at an instant.
func (ns *nightSky) angleAt(t float64) float64 { return ns.angle + turnRate*(t-ns.mid) }

func (ns *nightSky) direction(c ephemeris.Vec) place {
	right := math.Atan2(c[1], c[0])
	return place{
		c:       c,
		transit: ns.mid + math.Remainder(right-ns.angle, 2*math.Pi)/turnRate,
		rho:     math.Hypot(c[0], c[1]),
		z:       c[2],
	}
}

// nightBuilder makes one night's windows.
type nightBuilder struct {
	w      *Windows
	needed []bool
	sky    *visibility.Sky
	cal    *Calendar
	night  int
	*scratch
}

// scratch is a worker's memory.
type scratch struct {
	cell    cell
	windows []Window
	dirs    [][]place // by site
}

func (b *nightBuilder) build(sites []*sitePlan) nightWindows {
	units := len(b.w.units)
	out := nightWindows{at: make([]uint32, 0, len(b.w.classes)*units+1), oddAt: []uint32{0}}
	out.at = append(out.at, 0)
	skies := make([]*nightSky, len(sites))
	for i, p := range sites {
		if len(b.dirs) <= i {
			b.dirs = append(b.dirs, make([]place, len(b.w.sv.Fields)))
		}
		skies[i] = newNightSky(p, b.sky, b.cal, b.night, b.dirs[i])
	}
	cl, windows := &b.cell, b.windows[:0]
	cl.epoch = float64(b.w.epoch)
	for c := range b.w.classes {
		site := b.w.classes[c].site
		cp := sites[site].classes[slices.IndexFunc(sites[site].classes, func(x classPlan) bool { return x.id == c })]
		for u := range units {
			if k := c*units + u; skies[site] != nil && b.needed[k] {
				cl.set(skies[site], &b.w.units[u], u, &cp, b.w.sv)
				cl.windows()
				windows = append(windows, cl.in...)
				if cl.odd() {
					out.odd = append(out.odd, uint32(k))
					out.oddWindows = append(out.oddWindows, cl.out...)
					out.oddAt = append(out.oddAt, uint32(len(out.oddWindows)))
				}
			}
			out.at = append(out.at, uint32(len(windows)))
		}
	}
	b.windows = windows
	out.windows = make([]Window, len(windows)) // no spare room is kept
	copy(out.windows, windows)
	return out
}
