package ledger

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// matcher finds out what rows mean in a survey.
type matcher struct {
	sv         *survey.Survey
	exact      *visibility.Exact
	fields     map[string]int
	telescopes []string
	sites      []string
}

func newMatcher(sv *survey.Survey, exact *visibility.Exact) *matcher {
	m := &matcher{sv: sv, exact: exact, fields: make(map[string]int, len(sv.Fields))}
	for i := range sv.Fields {
		m.fields[sv.Fields[i].Name] = i
	}
	for i := range sv.Telescopes {
		m.telescopes = append(m.telescopes, sv.Telescopes[i].Name)
	}
	for i := range sv.Sites {
		m.sites = append(m.sites, sv.Sites[i].Name)
	}
	return m
}

// trouble is what is wrong with a row, and what would be right.
type trouble struct{ what, want string }

func troublef(want, what string, args ...any) *trouble {
	return &trouble{fmt.Sprintf(what, args...), want}
}

// shot turns a row into a record. none says why it belongs to no demand; such a
// row can be kept all the same. bad are contradictions, which can't. All that is
// wrong is told, not the first of it alone.
func (m *matcher) shot(r *Row) (rec *record, none, bad []*trouble) {
	rec = &record{Exposure: Exposure{
		Row: r.Line, Field: r.Field, Program: r.Program, Demand: r.Demand, Filter: r.Filter, Site: r.Site, Telescope: r.Telescope,
		Start: r.Start, End: r.End, Night: r.Night, Quality: r.Quality, Set: r.Set, Visit: r.Visit,
	}, what: r.What, why: r.Note}
	t := slices.Index(m.telescopes, r.Telescope)
	if t < 0 {
		if r.Telescope != "" { // an empty cell was told by the reader
			none = append(none, troublef(listed(r.Telescope, m.telescopes), "there is no telescope %s", quoted(r.Telescope)))
		}
		if r.Night == noNight { // of no known site: the evening at Greenwich
			rec.Night = survey.Day(math.Floor((float64(r.Start)/1e6 - 43200) / 86400))
		}
	} else {
		bad = m.where(r, rec, t)
	}
	return rec, append(none, m.demand(rec, t)...), bad
}

// where fills a record's site and night, and tells what contradicts them.
func (m *matcher) where(r *Row, rec *record, t int) (bad []*trouble) {
	site := m.sv.Telescopes[t].Site
	rec.Site = m.sites[site]
	if r.Site != "" && r.Site != rec.Site {
		bad = append(bad, troublef("want "+rec.Site+", or nothing", "telescope %s isn't at site %s", r.Telescope, quoted(r.Site)))
	}
	if r.Faulty {
		return bad // the instants can't be relied on
	}
	rec.Night = m.night(site, float64(r.Start)/1e6)
	if r.Night != noNight && r.Night != rec.Night {
		bad = append(bad, troublef("want "+rec.Night.String()+", or another instant", "%s at %s lies in the night %s, not %s", Instant(r.Start), r.Telescope, rec.Night, r.Night))
	}
	return bad
}

// demand finds the demand that a record belongs to, and fills what the row
// left open. The telescope is -1 when it isn't known.
func (m *matcher) demand(rec *record, telescope int) []*trouble {
	var out []*trouble
	fail := func(want, what string, args ...any) []*trouble {
		out = append(out, troublef(want, what, args...))
		return out
	}
	filter := m.filter(rec, telescope, &out)
	if rec.Field == "" {
		return out
	}
	f, ok := m.fields[rec.Field]
	if !ok {
		want := "want a field of the survey"
		for i := range m.sv.Fields {
			if n := m.sv.Fields[i].Name; strings.EqualFold(n, rec.Field) {
				want = fmt.Sprintf("did you mean %q?", n)
				break
			}
		}
		return fail(want, "there is no field %s", quoted(rec.Field))
	}
	p := &m.sv.Programs[m.sv.Fields[f].Program]
	if rec.Program != "" && rec.Program != p.Name {
		fail("want "+p.Name+", or nothing", "field %s isn't of program %s", rec.Field, quoted(rec.Program))
	}
	if len(out) > 0 {
		return out // what follows hangs on all of these
	}
	d, tr := pick(p, rec, filter)
	if tr != nil {
		return append(out, tr)
	}
	if filter < 0 {
		if len(d.Exposures) > 1 {
			return fail("want the filter in each row of a set", "filter is empty")
		}
		filter = d.Exposures[0].Filter
	}
	if d.IsSet() != (rec.Set != 0) {
		if d.IsSet() {
			return fail("want the set's number from the plan, the same in all its rows", "demand %s wants sets of %d exposures, and set is empty", d.Name, len(d.Exposures))
		}
		return fail("want set empty", "demand %s wants single exposures, and set is %d", d.Name, rec.Set)
	}
	rec.Program, rec.Demand, rec.Filter = p.Name, d.Name, m.sv.Filters[filter].Name
	return nil
}

// filter finds a record's filter; -1: it names none, or one that isn't there.
func (m *matcher) filter(rec *record, telescope int, out *[]*trouble) int {
	if rec.Filter == "" {
		return -1
	}
	filter := slices.IndexFunc(m.sv.Filters, func(x visibility.Filter) bool { return x.Name == rec.Filter })
	var names []string
	switch {
	case telescope >= 0 && (filter < 0 || !m.sv.Telescopes[telescope].HasFilter(filter)):
		for _, x := range m.sv.Telescopes[telescope].Filters {
			names = append(names, m.sv.Filters[x].Name)
		}
		*out = append(*out, troublef(listed(rec.Filter, names), "telescope %s has no filter %s", rec.Telescope, quoted(rec.Filter)))
	case filter < 0:
		for _, x := range m.sv.Filters {
			names = append(names, x.Name)
		}
		*out = append(*out, troublef(listed(rec.Filter, names), "there is no filter %s", quoted(rec.Filter)))
	}
	return filter
}

// pick chooses the demand by its name, or else by the filter.
func pick(p *survey.Program, rec *record, filter int) (*survey.Demand, *trouble) {
	var names []string
	var fit []*survey.Demand
	for i := range p.Demands {
		d := &p.Demands[i]
		names = append(names, d.Name)
		has := filter < 0 || slices.ContainsFunc(d.Exposures, func(e survey.Exposure) bool { return e.Filter == filter })
		if rec.Demand == d.Name {
			if !has {
				return nil, troublef("want the filter that was used, and a demand of it", "demand %s of program %s wants no exposure in filter %s", d.Name, p.Name, rec.Filter)
			}
			return d, nil
		}
		if has && d.IsSet() == (rec.Set != 0) {
			fit = append(fit, d)
		}
	}
	switch {
	case rec.Demand != "":
		return nil, troublef(listed(rec.Demand, names), "program %s has no demand %s", p.Name, quoted(rec.Demand))
	case len(fit) == 1:
		return fit[0], nil
	case len(fit) == 0:
		return nil, troublef("want one of "+strings.Join(names, ", ")+" in the column demand", "program %s has no demand that such an exposure would serve", p.Name)
	}
	return nil, troublef("want the column demand filled", "it can't be told which demand of program %s it serves: %s", p.Name, strings.Join(names, ", "))
}

// night returns the label of the night in which an instant (Unix s) lies.
func (m *matcher) night(site int, unix float64) survey.Day {
	return nightOf(m.exact, constraints.Place(&m.sv.Sites[site]), unix)
}

// nightOf finds the night by mean solar time, and asks the Sun only near its
// transit: the equation of time stays under 17 minutes (Meeus, Astronomical
// Algorithms, ch. 28).
func nightOf(exact *visibility.Exact, place visibility.Site, unix float64) survey.Day {
	x := (unix+place.Longitude*(43200/math.Pi))/86400 - 0.5
	day := math.Floor(x)
	const near = 20.0 / 1440
	if part := x - day; part > near && part < 1-near {
		return survey.Day(day)
	}
	day = math.Round(x) - 1
	if unix >= exact.Night(place, int32(day)).To {
		day++
	}
	return survey.Day(day)
}

// stretch turns a row about time into a loss, or tells all that is wrong with it.
func (m *matcher) stretch(r *Row) (*Loss, []*trouble) {
	l := &Loss{Row: r.Line, What: r.What, Site: r.Site, Telescope: r.Telescope, Start: r.Start, End: r.End, Cause: r.Cause, Why: r.Note}
	var out []*trouble
	site := slices.Index(m.sites, r.Site)
	if site < 0 && r.Site != "" {
		out = append(out, troublef(listed(r.Site, m.sites), "there is no site %s", quoted(r.Site)))
	}
	if r.Telescope != "" {
		t := slices.Index(m.telescopes, r.Telescope)
		switch {
		case t < 0:
			out = append(out, troublef(listed(r.Telescope, m.telescopes), "there is no telescope %s", quoted(r.Telescope)))
		case site >= 0 && site != m.sv.Telescopes[t].Site:
			out = append(out, troublef("want "+m.sites[m.sv.Telescopes[t].Site]+", or nothing", "telescope %s isn't at site %s", r.Telescope, quoted(r.Site)))
		default:
			site = m.sv.Telescopes[t].Site
		}
	}
	if len(out) > 0 || r.Faulty {
		return nil, out
	}
	l.Site = m.sites[site]
	if l.Start == 0 {
		in := m.exact.Night(constraints.Place(&m.sv.Sites[site]), int32(r.Night))
		l.Start, l.End = int64(math.Round(in.From*1e6)), int64(math.Round(in.To*1e6))
	}
	return l, nil
}
