package outlook

import (
	"cmp"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// fieldLook is what an outlook finds of one field.
type fieldLook struct{ demands []demandLook }

// demandLook is what it finds of one of its demands.
type demandLook struct {
	served bool      // some telescope qualifies
	asked  float64   // h for all visits; 0 when not served
	usable []float64 // h by month, union over the telescopes of a site, summed over sites
	wanted int
	most   int    // no plan has more visits; capped at wanted
	limit  string // what caps them
}

// chance is a stretch of one night in which a visit of a demand may start.
type chance struct {
	night    int
	from, to float64 // of the start, UTC Unix s, both inclusive
}

// field looks at one field.
func (in *Input) field(f int, months calendarMonths) fieldLook {
	sv := in.Survey
	fd := &sv.Fields[f]
	demands := sv.Programs[fd.Program].Demands
	look := fieldLook{make([]demandLook, len(demands))}
	for d := range demands {
		l := &look.demands[d]
		l.usable = make([]float64, len(months.rows))
		l.wanted = demands[d].Visits
		var h float64
		if h, l.served = visitHours(sv, fd, &demands[d]); !l.served {
			l.limit = "telescope"
			continue
		}
		l.asked = h * float64(l.wanted)
		for n := range sv.Nights() {
			for s := range sv.Sites {
				l.usable[months.of[n]] += in.usableHours(f, d, s, n)
			}
		}
		l.most, l.limit = in.most(f, d)
		if slices.Max(l.usable) > 0 && !in.reachable(f, d) {
			l.usable, l.limit = make([]float64, len(months.rows)), constraints.Quality.String()
		}
	}
	return look
}

// usable lists when a telescope may observe a demand in a night, ascending.
func (in *Input) usable(f, d, t, night int) []visibility.Interval {
	var all []visibility.Interval
	open := in.Calendar.Open(t, night)
	for _, w := range in.Windows.Of(in.Windows.Unit(f, d), in.Windows.Class(t), night) {
		iv := in.Windows.Interval(w)
		for _, o := range open {
			from, to := math.Max(iv.From, o.From), math.Min(iv.To, o.To)
			if to > from {
				all = append(all, visibility.Interval{From: from, To: to})
			}
		}
	}
	return all
}

// usableHours returns how long some telescope of a site may observe a demand
// in a night, h.
func (in *Input) usableHours(f, d, site, night int) float64 {
	sv := in.Survey
	fd := &sv.Fields[f]
	var all []visibility.Interval
	for _, t := range sv.Sites[site].Telescopes {
		if sv.Qualifies(fd, &sv.Programs[fd.Program].Demands[d], t) {
			all = append(all, in.usable(f, d, t, night)...)
		}
	}
	slices.SortFunc(all, func(a, b visibility.Interval) int { return cmp.Compare(a.From, b.From) })
	sum, end := 0.0, math.Inf(-1)
	for _, iv := range all {
		if iv.To > end {
			sum += iv.To - math.Max(iv.From, end)
			end = iv.To
		}
	}
	return sum / 3600
}

// most bounds the visits of a demand that any plan can hold, as if its field
// were alone. Where visits keep a distance they are taken as early as they can
// be, over all telescopes: optimal for spacing alone, since swapping a start
// for an earlier one never delays the rest. Where they need not, each
// telescope is filled by itself. per_night is bounded apart, by the number of
// labels with a chance, since labels of far sites interleave.
func (in *Input) most(f, d int) (most int, limit string) {
	sv := in.Survey
	dm := &sv.Programs[sv.Fields[f].Program].Demands[d]
	var all []chance
	labels := map[int]bool{}
	limit = "windows"
	spacing := dm.GapMin
	if dm.IsSet() {
		spacing = math.Max(spacing, chain(dm, in.leastScale()))
	}
	for t := range sv.Telescopes {
		chances := in.chances(f, d, t)
		for _, c := range chances {
			labels[c.night] = true
		}
		if spacing > 0 {
			all = append(all, chances...)
			continue
		}
		tel := &sv.Telescopes[t]
		most += starts(chances, dm.Exposures[0].Duration*tel.ExposureScale+mount.LeastGap(tel), dm.Visits)
	}
	if spacing > 0 {
		most, limit = starts(all, spacing, dm.Visits), "gap"
	}
	most = min(most, dm.Visits)
	if by := dm.PerNight * len(labels); dm.PerNight > 0 && by < most {
		most, limit = by, "per_night"
	}
	if len(labels) == 0 {
		limit = "windows"
	}
	return most, limit
}

// leastScale is the smallest exposure scale of any telescope.
func (in *Input) leastScale() float64 {
	scale := math.Inf(1)
	for t := range in.Survey.Telescopes {
		scale = math.Min(scale, in.Survey.Telescopes[t].ExposureScale)
	}
	return scale
}

// starts counts how many instants at least spacing (> 0, s) apart fit into the
// chances, at most wanted. It sorts the chances.
func starts(chances []chance, spacing float64, wanted int) int {
	slices.SortFunc(chances, func(a, b chance) int { return cmp.Compare(a.from, b.from) })
	n, next := 0, math.Inf(-1)
	for _, c := range chances {
		// A chance that began earlier and ends later than the ones before
		// it still serves: next only grows, so nothing is passed over.
		for at := math.Max(next, c.from); at <= c.to && n < wanted; at = next {
			n++
			next = at + spacing
		}
	}
	return n
}

// chain is the least time from the start of a visit's first exposure to the
// end of its last, s, at an exposure scale.
func chain(d *survey.Demand, scale float64) float64 {
	at := 0.0
	for i := range d.Exposures {
		e := &d.Exposures[i]
		if i > 0 {
			at += math.Max(e.After-e.Tolerance, d.Exposures[i-1].Duration*scale)
		}
	}
	return at + d.Exposures[len(d.Exposures)-1].Duration*scale
}

// chances lists when a visit of a demand may start on a telescope, never
// missing an instant: windows rounded outward, a set only asked to begin in a
// window and to end by the end of the night's last.
func (in *Input) chances(f, d, t int) []chance {
	sv := in.Survey
	fd := &sv.Fields[f]
	dm := &sv.Programs[fd.Program].Demands[d]
	if !sv.Qualifies(fd, dm, t) {
		return nil
	}
	unit := in.Windows.Unit(f, d)
	tel := &sv.Telescopes[t]
	first := dm.Exposures[0].Duration * tel.ExposureScale
	length := chain(dm, tel.ExposureScale)
	var all []chance
	var windows []constraints.Window
	for n := range sv.Nights() {
		open := in.Calendar.Open(t, n)
		if len(open) == 0 {
			continue
		}
		windows = in.Windows.AppendOuter(windows[:0], unit, in.Windows.Class(t), n)
		last := math.Inf(-1)
		for _, w := range windows {
			last = math.Max(last, in.Windows.Interval(w).To)
		}
		last = math.Min(last, open[len(open)-1].To)
		for _, w := range windows {
			iv := in.Windows.Interval(w)
			for _, o := range open {
				c := chance{n, math.Max(iv.From, o.From), math.Min(math.Min(iv.To, o.To)-first, last-length)}
				if c.to >= c.from {
					all = append(all, c)
				}
			}
		}
	}
	return all
}
