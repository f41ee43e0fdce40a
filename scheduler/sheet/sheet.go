// Package sheet makes one telescope's list for one night from a plan: what to
// observe when, how late each exposure may start, and what the Sun and Moon
// do. Build makes the Sheet; its Write methods put it on paper.
//
// Instants are UTC Unix seconds, angles degrees as in the tables.
package sheet

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// Sheet is one telescope's night.
type Sheet struct {
	Survey, Site, Telescope string
	Night                   survey.Day
	Zone                    *time.Location // for local times
	Place                   visibility.Site
	Sky                     visibility.AlmanacRow
	ClockChange             float64 // when local clocks change in the night; 0: they don't
	Open                    []visibility.Interval
	Lines                   []Line
	Totals                  Totals
	Reserve                 []Spare // what may be taken instead when the plan breaks, the worthiest of its time first
	HourPrice               float64 // what an hour of this night is worth in the plan, C
	Cautions                []string
}

// Line is one exposure, or one reserved block.
type Line struct {
	Start, End   float64
	SiderealTime float64 // local apparent, at Start, rad
	Reserved     string  // what a reserved block is for; "" in an exposure's line

	// Of exposures alone.
	Order        int // from 1
	Visit        *tables.VisitRow
	Step, Steps  int    // which exposure of a set, from 1; 0 without sets
	FilterBefore string // the filter to change from; "" when it stays; the first line has "-"
	Latest       float64
	LatestBy     Bound
}

// Bound says what the latest start of an exposure is bound by.
type Bound string

// What bounds a latest start.
const (
	ByNext    Bound = "next"    // the next exposure would be late
	ByRules   Bound = "rules"   // a rule would be broken after it
	ByOpen    Bound = "open"    // the open time ends, or a reserved block starts
	BySet     Bound = "set"     // the tolerance of its set
	ByCadence Bound = "cadence" // gap.min to a later visit, here or elsewhere
)

// Totals sums a sheet up; times in s.
type Totals struct {
	Exposures, Visits, FilterChanges int
	Exposure, Gaps, Open             float64
}

// Ask says which sheet is wanted.
type Ask struct {
	Telescope string
	Night     survey.Day
	Zone      *time.Location // of local times; nil: UTC
}

// Build makes a sheet from a plan of the survey. It errs when there is no such
// telescope or night, or when the plan is of another survey.
func Build(sv *survey.Survey, exact *visibility.Exact, cal *constraints.Calendar, pt *tables.PlanTables, ask Ask) (*Sheet, error) {
	t := slices.IndexFunc(sv.Telescopes, func(t survey.Telescope) bool { return t.Name == ask.Telescope })
	if t < 0 {
		var names []string
		for i := range sv.Telescopes {
			names = append(names, sv.Telescopes[i].Name)
		}
		return nil, fmt.Errorf("there is no telescope %q; want one of %s", ask.Telescope, strings.Join(names, ", "))
	}
	if ask.Night < sv.FirstNight || ask.Night > sv.LastNight {
		return nil, fmt.Errorf("night %s is outside the survey's period; want %s to %s", ask.Night, sv.FirstNight, sv.LastNight)
	}
	b := &builder{sv: sv, exact: exact, cal: cal, telescope: t, night: int(ask.Night - sv.FirstNight)}
	site := &sv.Sites[sv.Telescopes[t].Site]
	b.place = constraints.Place(site)
	if err := b.take(pt); err != nil {
		return nil, err
	}
	s := &Sheet{
		Survey: sv.Name, Site: site.Name, Telescope: ask.Telescope, Night: ask.Night, Zone: ask.Zone, Place: b.place,
		Sky: exact.Almanac(b.place, int32(ask.Night)), Open: cal.Open(t, b.night),
	}
	if s.Zone == nil {
		s.Zone = time.UTC
	}
	s.Lines = b.lines()
	s.ClockChange = clockChange(s.Zone, s.Sky.Night)
	s.Totals = totals(s)
	for i := range pt.Nights {
		if r := &pt.Nights[i]; r.Telescope == ask.Telescope && r.Night == int32(ask.Night) {
			s.HourPrice = r.PricePerHour
		}
	}
	s.Cautions = cautions(s, site)
	return s, nil
}

// clockChange returns when the zone's offset changes within a night, or 0.
func clockChange(zone *time.Location, night visibility.Interval) float64 {
	from := time.Unix(int64(night.From), 0).In(zone)
	_, end := from.ZoneBounds()
	if end.IsZero() || end.Unix() >= int64(night.To) {
		return 0
	}
	_, before := from.Zone()
	_, after := end.Zone()
	if before == after { // a new name alone
		return 0
	}
	return float64(end.Unix())
}

func totals(s *Sheet) Totals {
	var t Totals
	sets := map[int64]bool{}
	for i := range s.Lines {
		l := &s.Lines[i]
		if l.Visit == nil {
			continue
		}
		t.Exposures++
		t.Exposure += l.Visit.Exposure
		t.Gaps += l.Visit.GapBefore
		if l.FilterBefore != "" && l.FilterBefore != firstFilter {
			t.FilterChanges++
		}
		if l.Visit.Set == 0 || !sets[l.Visit.Set] {
			t.Visits++
			sets[l.Visit.Set] = true
		}
	}
	for _, o := range s.Open {
		t.Open += o.To - o.From
	}
	return t
}

// firstFilter stands where there is no exposure before.
const firstFilter = "-"

// cautions are what a list can't know.
func cautions(s *Sheet, site *survey.Site) []string {
	out := []string{
		"This list is advice. The site's own rules, its staff and its weather limits come first; close when they say so.",
		"Domes, mounts and covers move without warning: keep clear, leave every interlock in place, and know where the emergency stop is.",
		"Never point at or slew across the Sun. Nothing here guards a telescope that moves by day or is started before the Sun is down.",
		"Altitudes are without refraction. Times rest on the survey's value of UT1-UTC; a wrong one turns the whole sky by 15 arc seconds a second.",
	}
	if s.ClockChange != 0 {
		out = append(out, "Local clocks change in this night: work by UTC.")
	}
	if site.TimeZone == "" {
		out = append(out, "The survey names no time zone for this site: local times are UTC.")
	}
	return out
}

// local gives an instant in the sheet's zone.
func (s *Sheet) local(unix float64) time.Time {
	return time.UnixMicro(int64(math.Round(unix * 1e6))).In(s.Zone)
}
