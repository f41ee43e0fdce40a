package constraints

import (
	"math"
	"runtime"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// darkLimit is the Sun's altitude under which an hour counts as dark.
const darkLimit = -18 * math.Pi / 180

// Calendar holds when the nights of a survey are and when each telescope is
// open in them. It is immutable and safe for concurrent use.
type Calendar struct {
	first      survey.Day
	nights     int
	sites      []siteCalendar
	telescopes []scopeCalendar
}

// siteCalendar is what a site's Sun alone says.
type siteCalendar struct {
	nights []visibility.Interval // transit to transit
	limits []float64             // Sun altitudes with stored intervals, ascending
	below  [][][]visibility.Interval
}

// scopeCalendar is one telescope's nights.
type scopeCalendar struct {
	site     int
	keepFree float64
	limit    float64                 // the loosest Sun limit
	served   bool                    // some demand may use it
	open     [][]visibility.Interval // by night; after reserves
	before   [][]visibility.Interval // by night; before closures, losses and reserves
	closed   [][]visibility.Interval // by night
	lost     [][]visibility.Interval // by night
	reserved [][]visibility.Interval // by night
}

// maxStoredLimits bounds the distinct Sun limits that a calendar stores; a
// survey that sets a limit for each field has more, and they are found anew
// where they are needed.
const maxStoredLimits = 8

// NewCalendar works out the nights of the survey's period. losses holds, for
// each telescope, lost time (UTC, Unix s); nil means none.
//
// A telescope is open while the Sun is below the loosest Sun limit of any
// demand it may serve, less the closures of its site and its own, losses, and
// reserved blocks. A telescope that serves no demand is never open.
func NewCalendar(sv *survey.Survey, e *visibility.Exact, losses [][]visibility.Interval) *Calendar {
	c := &Calendar{
		first: sv.FirstNight, nights: sv.Nights(),
		sites: make([]siteCalendar, len(sv.Sites)), telescopes: make([]scopeCalendar, len(sv.Telescopes)),
	}
	loosest, served := make([]float64, len(sv.Telescopes)), make([]bool, len(sv.Telescopes))
	for t := range sv.Telescopes {
		loosest[t], served[t] = sv.LoosestSun(t)
	}
	limits := sunLimits(sv)
	// A site and a run of nights a piece of work; the pieces are independent.
	const run = 16
	pieces := (c.nights + run - 1) / run
	for i := range c.sites {
		s := &c.sites[i]
		s.nights = make([]visibility.Interval, c.nights)
		s.limits = siteLimits(sv, i, limits, loosest, served)
		s.below = make([][][]visibility.Interval, c.nights)
	}
	parallel(runtime.GOMAXPROCS(0), len(c.sites)*pieces, func(k int) {
		i, n0 := k/pieces, k%pieces*run
		place := Place(&sv.Sites[i])
		for n := n0; n < min(n0+run, c.nights); n++ {
			c.sites[i].fill(e, place, sv.FirstNight, n)
		}
	})
	for t := range sv.Telescopes {
		o := &c.telescopes[t]
		o.site, o.keepFree = sv.Telescopes[t].Site, sv.Telescopes[t].KeepFree
		o.limit, o.served = loosest[t], served[t]
		var lost []visibility.Interval
		if t < len(losses) {
			lost = union(slices.Clone(losses[t]))
		}
		o.fill(sv, c, t, lost)
	}
	return c
}

// sunLimits returns the distinct Sun limits of all fields' rules, ascending,
// or nil when there are more than a calendar stores.
func sunLimits(sv *survey.Survey) []float64 {
	var limits []float64
	for i := range sv.Fields {
		for j := range sv.Fields[i].Rules {
			x := sv.Fields[i].Rules[j].SunAltitudeMax
			if !slices.Contains(limits, x) {
				if len(limits) == maxStoredLimits {
					return nil
				}
				limits = append(limits, x)
			}
		}
	}
	slices.Sort(limits)
	return limits
}

// siteLimits is what one site stores: the survey's limits, those of its
// telescopes, and the dark one.
func siteLimits(sv *survey.Survey, site int, limits, loosest []float64, served []bool) []float64 {
	out := append(slices.Clone(limits), darkLimit)
	for t := range sv.Telescopes {
		if sv.Telescopes[t].Site == site && served[t] {
			out = append(out, loosest[t])
		}
	}
	slices.Sort(out)
	return slices.Compact(out)
}

func (s *siteCalendar) fill(e *visibility.Exact, place visibility.Site, first survey.Day, n int) {
	s.nights[n] = e.Night(place, int32(first)+int32(n))
	s.below[n] = make([][]visibility.Interval, len(s.limits))
	for k, limit := range s.limits {
		s.below[n][k] = e.SunBelow(place, s.nights[n], limit)
	}
}

func (s *siteCalendar) stored(n int, limit float64) ([]visibility.Interval, bool) {
	k, ok := slices.BinarySearch(s.limits, limit)
	if !ok {
		return nil, false
	}
	return s.below[n][k], true
}

func (o *scopeCalendar) fill(sv *survey.Survey, c *Calendar, t int, lost []visibility.Interval) {
	o.open = make([][]visibility.Interval, c.nights)
	o.before = make([][]visibility.Interval, c.nights)
	o.closed = make([][]visibility.Interval, c.nights)
	o.lost = make([][]visibility.Interval, c.nights)
	o.reserved = make([][]visibility.Interval, c.nights)
	tel := &sv.Telescopes[t]
	for n := range c.nights {
		night := c.sites[o.site].nights[n]
		label := sv.FirstNight + survey.Day(n)
		o.closed[n] = union(closedIn(closedIn(nil, sv.Sites[o.site].Closures, label, night), tel.Closures, label, night))
		o.lost[n] = intersect(nil, lost, []visibility.Interval{night})
		if !o.served {
			continue
		}
		o.before[n], _ = c.sites[o.site].stored(n, o.limit)
		left := subtract(nil, subtract(nil, o.before[n], o.closed[n]), o.lost[n])
		o.reserved[n] = union(reservedIn(nil, tel.Reserved, left))
		o.open[n] = subtract(nil, left, o.reserved[n])
	}
}

// Nights returns the number of night labels.
func (c *Calendar) Nights() int { return c.nights }

// Night returns the night of a label (index from the first) at a site: from
// one upper transit of the Sun to the next.
func (c *Calendar) Night(site, night int) visibility.Interval { return c.sites[site].nights[night] }

// NightAt returns the label (index from the first night) of the night in which
// an instant lies at a site, and false when it is outside the period.
func (c *Calendar) NightAt(site int, unix float64) (int, bool) {
	ns := c.sites[site].nights
	k, _ := slices.BinarySearchFunc(ns, unix, func(n visibility.Interval, t float64) int {
		if n.To <= t {
			return -1
		}
		return 1
	})
	return k, k < len(ns) && ns[k].From <= unix
}

// Open returns when a telescope is open in a night, ascending and disjoint;
// exposures lie within it. The caller must not change it.
func (c *Calendar) Open(telescope, night int) []visibility.Interval {
	return c.telescopes[telescope].open[night]
}

// loosest returns the highest Sun limit of the demands that a telescope may
// serve, and false when there are none.
func (c *Calendar) loosest(telescope int) (float64, bool) {
	return c.telescopes[telescope].limit, c.telescopes[telescope].served
}

// Reserved returns the reserved blocks of a telescope's night, joined.
func (c *Calendar) Reserved(telescope, night int) []visibility.Interval {
	return c.telescopes[telescope].reserved[night]
}

// OpenHours returns the length of the open time, before keep_free, h.
func (c *Calendar) OpenHours(telescope, night int) float64 {
	return seconds(c.telescopes[telescope].open[night]) / 3600
}

// DarkHours returns the time with the Sun's centre at most -18 deg high, h.
func (c *Calendar) DarkHours(site, night int) float64 {
	dark, _ := c.sites[site].stored(night, darkLimit)
	return seconds(dark) / 3600
}

// Budget returns the longest use, exposures and the gaps they need, that
// keep_free leaves of a telescope's night, s.
func (c *Calendar) Budget(telescope, night int) float64 {
	o := &c.telescopes[telescope]
	return (1 - o.keepFree) * seconds(o.open[night])
}

// SunBelow returns when the Sun's centre is at most limit (rad) high in a
// night, and false when the calendar doesn't store that limit: it has those of
// the survey's rules (up to 8 of them), of its telescopes, and -18 deg.
func (c *Calendar) SunBelow(site, night int, limit float64) ([]visibility.Interval, bool) {
	return c.sites[site].stored(night, limit)
}
