package ledger

import (
	"cmp"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Visit is one visit that was done for a demand of a field: an exposure, or
// the exposures of a set.
type Visit struct {
	Field, Demand int32 // ids in the survey
	Telescope     int32 // -1: the survey has it no more
	Night         survey.Day
	Start, End    int64   // UTC, Unix microseconds
	Set           int64   // the plan's set; 0: none
	Quality       float64 // mean over its exposures
	Exposures     []int32 // which of the exposures given, by start
	Whole         bool    // all exposures of the demand are there, in its order
	Sound         bool    // whole, and no exposure below min_quality; others count for nothing and bind nothing
	Counts        bool    // sound, and among the first that the demand wants
}

// Credits says what the exposures of a ledger are worth to a survey.
type Credits struct {
	Visits    []Visit   // by field, demand and start
	Qualities []float64 // of each exposure given: the telescope's own, or computed; NaN: it belongs to no demand
	Strangers []int32   // exposures that belong to no demand of the survey
	first     []int32   // visits of row r are Visits[first[r]:first[r+1]]
	rows      []int32   // row of a field's first demand
}

// Of returns the visits of one demand of one field, by start.
func (c *Credits) Of(field, demand int) []Visit {
	r := c.rows[field] + int32(demand)
	return c.Visits[c.first[r]:c.first[r+1]]
}

// Got returns how many visits of a demand count, and the sum of their
// qualities.
func (c *Credits) Got(field, demand int) (visits int, quality float64) {
	for _, v := range c.Of(field, demand) {
		if v.Counts {
			visits++
			quality += v.Quality
		}
	}
	return visits, quality
}

// Last returns the start of the last sound visit of a demand, which gap.min is
// counted from (UTC, Unix microseconds), and false without one.
func (c *Credits) Last(field, demand int) (int64, bool) {
	list := c.Of(field, demand)
	for i := len(list) - 1; i >= 0; i-- {
		if list[i].Sound {
			return list[i].Start, true
		}
	}
	return 0, false
}

// Credit works out which visits the exposures make for the demands of a
// survey, from before its period as well, and what they are worth. A quality that
// the telescope gave wins; else it is computed on the exact path for the middle
// of the exposure, times the part of the wanted time that the exposure had, 1 at
// most. Unmatched exposures and those of fields, demands or filters that the
// survey hasn't are strangers.
//
// It is a pure function, in time proportional to the exposures.
func Credit(sv *survey.Survey, exact *visibility.Exact, done []Exposure) *Credits {
	c := &Credits{Qualities: make([]float64, len(done)), rows: make([]int32, len(sv.Fields)+1)}
	for f := range sv.Fields {
		c.rows[f+1] = c.rows[f] + int32(len(sv.Programs[sv.Fields[f].Program].Demands))
	}
	m := newMatcher(sv, exact)
	type set struct {
		row       int32
		telescope string
		night     survey.Day
		set       int64
	}
	order := make([]int32, len(done))
	for i := range order {
		order[i] = int32(i)
	}
	slices.SortStableFunc(order, func(a, b int32) int { return cmp.Compare(done[a].Start, done[b].Start) })
	open := map[set]int{}
	for _, i := range order {
		e := &done[i]
		f, d, ok := m.place(e)
		c.Qualities[i] = math.NaN()
		if !ok {
			c.Strangers = append(c.Strangers, i)
			continue
		}
		k := set{c.rows[f] + int32(d), e.Telescope, e.Night, e.Set}
		if at, ok := open[k]; ok && e.Set != 0 {
			v := &c.Visits[at]
			v.Exposures, v.End = append(v.Exposures, i), max(v.End, e.End)
			continue
		}
		open[k] = len(c.Visits)
		c.Visits = append(c.Visits, Visit{
			Field: int32(f), Demand: int32(d), Telescope: int32(slices.Index(m.telescopes, e.Telescope)),
			Night: e.Night, Start: e.Start, End: e.End, Set: e.Set, Exposures: []int32{i},
		})
	}
	slices.Sort(c.Strangers)
	slices.SortStableFunc(c.Visits, func(a, b Visit) int {
		return cmp.Or(cmp.Compare(a.Field, b.Field), cmp.Compare(a.Demand, b.Demand), cmp.Compare(a.Start, b.Start))
	})
	c.judge(m, done)
	return c
}

// place finds the demand of an exposure by its names.
func (m *matcher) place(e *Exposure) (field, demand int, ok bool) {
	if e.Unmatched != "" {
		return 0, 0, false
	}
	f, ok := m.fields[e.Field]
	if !ok {
		return 0, 0, false
	}
	p := &m.sv.Programs[m.sv.Fields[f].Program]
	if p.Name != e.Program {
		return 0, 0, false
	}
	for d := range p.Demands {
		if p.Demands[d].Name == e.Demand {
			return f, d, slices.ContainsFunc(p.Demands[d].Exposures, func(x survey.Exposure) bool { return m.sv.Filters[x.Filter].Name == e.Filter })
		}
	}
	return 0, 0, false
}

// judge works out what each visit is worth and which count.
func (c *Credits) judge(m *matcher, done []Exposure) {
	c.first = make([]int32, c.rows[len(c.rows)-1]+1)
	counted := 0
	for i := range c.Visits {
		v := &c.Visits[i]
		if i == 0 || c.Visits[i-1].Field != v.Field || c.Visits[i-1].Demand != v.Demand {
			counted = 0
		}
		f := &m.sv.Fields[v.Field]
		d := &m.sv.Programs[f.Program].Demands[v.Demand]
		v.Whole = len(v.Exposures) == len(d.Exposures)
		v.Sound = true
		for k, x := range v.Exposures {
			e := &done[x]
			step := k
			if k >= len(d.Exposures) || m.sv.Filters[d.Exposures[k].Filter].Name != e.Filter {
				v.Whole = false
				step = m.stepOf(d, e.Filter)
			}
			q := m.quality(e, int(v.Field), &d.Exposures[step])
			c.Qualities[x] = q
			v.Quality += q / float64(len(v.Exposures))
			v.Sound = v.Sound && q >= f.Rules[v.Demand].MinQuality
		}
		v.Sound = v.Sound && v.Whole
		if v.Counts = v.Sound && counted < d.Visits; v.Counts {
			counted++
		}
		c.first[c.rows[v.Field]+v.Demand+1] = int32(i + 1)
	}
	for r := 1; r < len(c.first); r++ {
		c.first[r] = max(c.first[r], c.first[r-1])
	}
}

// stepOf returns the first exposure of a demand in a filter; place has seen to
// it that there is one.
func (m *matcher) stepOf(d *survey.Demand, filter string) int {
	return slices.IndexFunc(d.Exposures, func(x survey.Exposure) bool { return m.sv.Filters[x.Filter].Name == filter })
}

// quality is the telescope's own, or computed.
func (m *matcher) quality(e *Exposure, field int, want *survey.Exposure) float64 {
	if !math.IsNaN(e.Quality) {
		return e.Quality
	}
	t := slices.Index(m.telescopes, e.Telescope)
	if t < 0 {
		return 0 // nobody knows where it stood
	}
	tel := &m.sv.Telescopes[t]
	site := constraints.Place(&m.sv.Sites[tel.Site])
	f := &m.sv.Fields[field]
	at := m.exact.At((float64(e.Start) + float64(e.End)) / 2e6)
	star := at.Star(site, visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec})
	sun, moon := at.Sun(site), at.Moon(site)
	q := visibility.Quality(m.sv.Filters[want.Filter], visibility.Geometry{
		SinAltitude: star.Direction[2], SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude,
		MoonSeparation: visibility.Separation(star, moon.Horizontal), MoonPhaseAngle: moon.PhaseAngle,
	})
	const slack = 1e-3 // s: instants are rounded
	if had, wanted := float64(e.End-e.Start)/1e6, want.Duration*tel.ExposureScale; had < wanted-slack {
		q *= had / wanted
	}
	return q
}

// below reports whether an exposure that belongs to a demand is under its
// min_quality.
func below(m *matcher, e *Exposure) bool {
	f, d, ok := m.place(e)
	if !ok {
		return false
	}
	demand := &m.sv.Programs[m.sv.Fields[f].Program].Demands[d]
	return m.quality(e, f, &demand.Exposures[m.stepOf(demand, e.Filter)]) < m.sv.Fields[f].Rules[d].MinQuality
}
