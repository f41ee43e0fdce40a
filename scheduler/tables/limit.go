package tables

import (
	"cmp"
	"slices"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// The words of limited_by: what keeps a field from having all its visits. For
// a field that misses visits of several demands it is the first that holds,
// in this order, of any of them.
const (
	LimitNothing     = "nothing"     // it has them all
	LimitTelescope   = "telescope"   // no telescope may serve a demand
	LimitWindows     = "windows"     // the rules leave no open time that an exposure fits into
	LimitQuality     = "quality"     // in the middle of no window is quality as high as min_quality
	LimitCadence     = "cadence"     // gap.min and per_night leave room for fewer visits than are wanted
	LimitCompetition = "competition" // there was room, but the time was worth more to others
)

// Limits lists the words of limited_by.
func Limits() []string {
	return []string{LimitNothing, LimitTelescope, LimitWindows, LimitQuality, LimitCadence, LimitCompetition}
}

// opening is a stretch of time in which a demand's exposure may be taken.
type opening struct {
	visibility.Interval
	telescope, night int
}

// usable works out the openings of fields; it keeps its scratch between them.
type usable struct {
	b        *builder
	openings []opening
	all      []visibility.Interval
	seen     []servedUnit
}

// servedUnit is a window unit on a telescope, so that demands which share
// their windows are looked at once.
type servedUnit struct{ unit, telescope int }

// hours returns for how long in the period some demand of a field may be
// observed at some telescope: summed over sites, so that two sites at once
// count twice and two telescopes of one site once.
func (u *usable) hours(field int) float64 {
	b := u.b
	f := &b.sv.Fields[field]
	demands := b.sv.Programs[f.Program].Demands
	sum := 0.0
	for site := range b.sv.Sites {
		u.seen = u.seen[:0]
		for _, t := range b.sv.Sites[site].Telescopes {
			for d := range demands {
				if !b.sv.Qualifies(f, &demands[d], t) {
					continue
				}
				if s := (servedUnit{b.win.Unit(field, d), t}); !slices.Contains(u.seen, s) {
					u.seen = append(u.seen, s)
				}
			}
		}
		for night := range b.sv.Nights() {
			u.all = u.all[:0]
			for _, s := range u.seen {
				u.openings = u.cut(u.openings[:0], s.unit, s.telescope, night)
				for _, o := range u.openings {
					u.all = append(u.all, o.Interval)
				}
			}
			sum += length(u.all)
		}
	}
	return sum / 3600
}

// cut appends the windows of a unit that lie in a telescope's open time.
func (u *usable) cut(dst []opening, unit, telescope, night int) []opening {
	for _, w := range u.b.win.Of(unit, u.b.win.Class(telescope), night) {
		x := u.b.win.Interval(w)
		for _, o := range u.b.cal.Open(telescope, night) {
			if from, to := max(x.From, o.From), min(x.To, o.To); from < to {
				dst = append(dst, opening{visibility.Interval{From: from, To: to}, telescope, night})
			}
		}
	}
	return dst
}

// length returns the length of the union of some intervals, which it sorts.
func length(x []visibility.Interval) float64 {
	slices.SortFunc(x, func(a, b visibility.Interval) int { return cmp.Compare(a.From, b.From) })
	sum, end := 0.0, 0.0
	for i, v := range x {
		if i == 0 || v.From > end {
			end = v.From
		}
		if v.To > end {
			sum += v.To - end
			end = v.To
		}
	}
	return sum
}

// limit returns the word for a field.
func (u *usable) limit(field int) string {
	b := u.b
	if b.tally.got[field] == b.tally.wanted[field] {
		return LimitNothing
	}
	demands := b.sv.Programs[b.sv.Fields[field].Program].Demands
	got := make([]int, len(demands))
	for _, v := range b.tally.of(field) {
		if v.counts {
			got[v.demand]++
		}
	}
	words, worst := Limits(), len(Limits())-1
	for d := range demands {
		if got[d] < demands[d].Visits {
			worst = min(worst, slices.Index(words, u.demandLimit(field, d, got[d])))
		}
	}
	return words[worst]
}

// demandLimit returns the word for one demand that misses visits.
func (u *usable) demandLimit(field, demand, got int) string {
	b := u.b
	f := &b.sv.Fields[field]
	d := &b.sv.Programs[f.Program].Demands[demand]
	u.openings = u.openings[:0]
	served := false
	for t := range b.sv.Telescopes {
		if !b.sv.Qualifies(f, d, t) {
			continue
		}
		served = true
		for night := range b.sv.Nights() {
			k := len(u.openings)
			u.openings = u.cut(u.openings, b.win.Unit(field, demand), t, night)
			starts := u.starts(u.openings[k:], d, t)
			u.openings = append(u.openings[:k], starts...)
		}
	}
	switch {
	case !served:
		return LimitTelescope
	case len(u.openings) == 0:
		return LimitWindows
	case got == 0 && !u.good(field, demand):
		return LimitQuality
	case u.room(d.Visits, d.GapMin, d.PerNight) < d.Visits:
		return LimitCadence
	}
	return LimitCompetition
}

// starts turns the openings of a telescope-night into the stretches in which
// a visit's first exposure may begin: its end lies within its opening, and each
// later exposure of a set finds a start in some opening, within its tolerance
// after the one before and clear of it.
func (u *usable) starts(open []opening, d *survey.Demand, telescope int) []opening {
	t := &u.b.sv.Telescopes[telescope]
	var after []opening // starts of the exposure after
	for k := len(d.Exposures) - 1; k >= 0; k-- {
		long := d.Exposures[k].Duration * t.ExposureScale
		var own []opening
		for _, o := range open {
			o.To -= long
			if o.To < o.From {
				continue
			}
			if k == len(d.Exposures)-1 {
				own = append(own, o)
				continue
			}
			x := &d.Exposures[k+1]
			least, most := max(x.After-x.Tolerance, long+mount.LeastGap(t)), x.After+x.Tolerance
			for _, a := range after {
				s := o
				s.From, s.To = max(o.From, a.From-most), min(o.To, a.To-least)
				if least <= most && s.From <= s.To {
					own = append(own, s)
				}
			}
		}
		after = own
	}
	return after
}

// good reports whether the first exposure of a demand has its min_quality in
// the middle of any opening.
func (u *usable) good(field, demand int) bool {
	b := u.b
	f := &b.sv.Fields[field]
	x := &b.sv.Programs[f.Program].Demands[demand].Exposures[0]
	for _, o := range u.openings {
		t := &b.sv.Telescopes[o.telescope]
		at := b.exact.At((o.From + o.To + x.Duration*t.ExposureScale) / 2)
		_, q := sky(at, b.sites[t.Site], b.places[field], b.sv.Filters[x.Filter])
		if q.quality >= f.Rules[demand].MinQuality {
			return true
		}
	}
	return false
}

// room counts how many visits fit into the openings, at most want, each as
// early as it can be: gapMin seconds after the one before, and at most
// perNight with a night label (0: no limit).
func (u *usable) room(want int, gapMin float64, perNight int) int {
	slices.SortFunc(u.openings, func(a, b opening) int { return cmp.Compare(a.From, b.From) })
	inNight := make([]int, u.b.sv.Nights())
	visits, from := 0, u.openings[0].From
	for visits < want {
		best := -1
		start := 0.0
		for i, o := range u.openings {
			if best >= 0 && o.From >= start {
				break
			}
			if o.To < from || perNight > 0 && inNight[o.night] >= perNight {
				continue
			}
			if s := max(o.From, from); best < 0 || s < start {
				best, start = i, s
			}
		}
		if best < 0 {
			return visits
		}
		inNight[u.openings[best].night]++
		visits++
		from = start + gapMin
	}
	return visits
}
