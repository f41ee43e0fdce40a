package surveyfile

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/constraints/survey"
)

// check runs the checks over several parts of the survey file, each only on
// parts that were read without a fault.
func (l *loader) check() {
	l.checkShares()
	for p := range l.sv.Programs {
		for d := range l.sv.Programs[p].Demands {
			l.checkDemand(p, d)
		}
	}
	l.checkClosures()
}

// sound reports whether all of some marks are.
func sound(marks []mark) bool {
	for i := range marks {
		if !marks[i].sound {
			return false
		}
	}
	return true
}

// checkShares compares the programs' shares with each other.
func (l *loader) checkShares() {
	if !sound(l.marks.programs) || len(l.sv.Programs) == 0 {
		return
	}
	var low, high float64
	for i := range l.sv.Programs {
		low += l.sv.Programs[i].ShareMin
		high += l.sv.Programs[i].ShareMax
	}
	const rounding = 1e-9
	if low > 1+rounding {
		l.fault(l.marks.programs[0].node, fmt.Sprintf("the programs' share min add up to %.4g", low), "want 1 at most")
	}
	if high < 1-rounding {
		l.fault(l.marks.programs[0].node, fmt.Sprintf("the programs' share max add up to %.4g", high), "want 1 at least, for all shares together are 1")
	}
}

// carriers lists the telescopes that carry all filters of a demand and are on
// its program's list.
func (l *loader) carriers(p, d int) []int {
	program := &l.sv.Programs[p]
	var ids []int
	for t := range l.sv.Telescopes {
		if program.Telescopes != nil && !slices.Contains(program.Telescopes, t) {
			continue
		}
		all := true
		for _, e := range program.Demands[d].Exposures {
			all = all && l.sv.Telescopes[t].HasFilter(e.Filter)
		}
		if all {
			ids = append(ids, t)
		}
	}
	return ids
}

// checkDemand checks a demand against telescopes, sites and period.
func (l *loader) checkDemand(p, d int) {
	at := &l.marks.demands[p][d]
	if !at.sound || !sound(l.marks.telescopes) || l.telescopes.unknown || l.filters.unknown {
		return
	}
	program, demand := &l.sv.Programs[p], &l.sv.Programs[p].Demands[d]
	carriers := l.carriers(p, d)
	if len(carriers) == 0 {
		l.noCarrier(program, demand, at)
		return
	}
	l.checkSet(demand, at, carriers)
	if span := l.longitudeSpan(carriers); demand.PerNight > 0 && demand.GapMin < 12*hourSeconds && span > 90 {
		l.warn(at.node, fmt.Sprintf("per_night stands without a gap min of 12h, and the sites span %.0f degrees of longitude, where one label means different hours", span),
			"want gap: {min: 12h} or more")
	}
	if !l.marks.period {
		return
	}
	nights := float64(l.sv.Nights())
	if need := float64(demand.Visits-1) * demand.GapMin; need > (nights+1)*daySeconds {
		l.warn(at.node, fmt.Sprintf("%d visits at least %s apart take %.4g days, and the period has %d nights: no field can be finished", demand.Visits, formatDuration(demand.GapMin), need/daySeconds, l.sv.Nights()),
			"want fewer visits, a shorter gap, or a longer period")
	}
	if demand.PerNight > 0 && float64(demand.Visits) > float64(demand.PerNight)*nights {
		l.warn(at.node, fmt.Sprintf("%d visits with %d a night take more than the period's %d nights: no field can be finished", demand.Visits, demand.PerNight, l.sv.Nights()),
			"want fewer visits, more a night, or a longer period")
	}
}

// noCarrier tells why no telescope can take a demand.
func (l *loader) noCarrier(program *survey.Program, demand *survey.Demand, at *demandMark) {
	for i, e := range demand.Exposures {
		mounted := slices.ContainsFunc(l.sv.Telescopes, func(t survey.Telescope) bool { return t.HasFilter(e.Filter) })
		if !mounted {
			l.fault(at.exposures[i], fmt.Sprintf("the filter %s is on no telescope", l.sv.Filters[e.Filter].Name), "want it in the filters of a telescope")
			return
		}
	}
	who := "no telescope"
	if program.Telescopes != nil {
		var listed []string
		for _, t := range program.Telescopes {
			listed = append(listed, l.sv.Telescopes[t].Name)
		}
		who = "none of the program's telescopes (" + strings.Join(listed, ", ") + ")"
	}
	l.fault(at.node, fmt.Sprintf("%s carries %s", who, strings.ReplaceAll(l.sequence(demand), "+", " and ")), "want one that carries every filter of the demand")
}

// checkSet finds a set whose exposures start too soon after each other for
// every telescope: the one before, on that telescope, and the readout and
// change of filter must fit between. The field is tracked: nothing slews.
func (l *loader) checkSet(demand *survey.Demand, at *demandMark, carriers []int) {
	worst, need, who := -1, 0.0, 0
	for _, t := range carriers {
		tel := &l.sv.Telescopes[t]
		ok := true
		for i := 1; i < len(demand.Exposures) && ok; i++ {
			before, e := &demand.Exposures[i-1], &demand.Exposures[i]
			gap := tel.Readout
			switch {
			case before.Filter == e.Filter:
			case tel.DuringSlew:
				gap = max(gap, tel.FilterChange)
			default:
				gap += tel.FilterChange
			}
			takes := before.Duration*tel.ExposureScale + gap
			if e.After+e.Tolerance < takes {
				ok = false
				if i > worst || i == worst && takes < need {
					worst, need, who = i, takes, t
				}
			}
		}
		if ok {
			return
		}
	}
	e := &demand.Exposures[worst]
	l.fault(at.exposures[worst], fmt.Sprintf("exposure %d of the set starts at most %s after the one before, which on %s takes %s with the readout and change of filter",
		worst+1, formatDuration(e.After+e.Tolerance), l.sv.Telescopes[who].Name, formatDuration(need)), "want it later, or shorter exposures")
}

// longitudeSpan is the least arc of longitude, degrees, that holds the sites
// of some telescopes.
func (l *loader) longitudeSpan(telescopes []int) float64 {
	var all []float64
	for _, t := range telescopes {
		turn := math.Mod(l.sv.Sites[l.sv.Telescopes[t].Site].Longitude/degree+360, 360)
		all = append(all, turn)
	}
	slices.Sort(all)
	gap := all[0] + 360 - all[len(all)-1]
	for i := 1; i < len(all); i++ {
		gap = max(gap, all[i]-all[i-1])
	}
	return 360 - gap
}

// checkClosures finds closures that take nothing away, which a slip in the
// year makes.
func (l *loader) checkClosures() {
	if !l.marks.period {
		return
	}
	outside := func(c *survey.Closure) bool {
		if c.ByNight {
			return c.LastNight < l.sv.FirstNight || c.FirstNight > l.sv.LastNight
		}
		// A night of a label reaches at most a day over either side of it.
		return c.To < (l.sv.FirstNight-1).Unix() || c.From > (l.sv.LastNight+2).Unix()
	}
	warn := func(at mark, name string, closures []survey.Closure) {
		for i := range closures {
			if outside(&closures[i]) {
				l.warn(at.closures[i], fmt.Sprintf("a closure of %s lies outside the period", name), "is its year right?")
			}
		}
	}
	for i := range l.sv.Sites {
		warn(l.marks.sites[i], l.sv.Sites[i].Name, l.sv.Sites[i].Closures)
	}
	for i := range l.sv.Telescopes {
		warn(l.marks.telescopes[i], l.sv.Telescopes[i].Name, l.sv.Telescopes[i].Closures)
	}
}
