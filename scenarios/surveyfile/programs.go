package surveyfile

import (
	"fmt"
	"math"
	"strings"

	"go.yaml.in/yaml/v3"

	"nightwright/constraints/survey"
)

// readPrograms reads what is asked for.
func (l *loader) readPrograms(m *mapping) {
	l.programs = names{kind: "program", plural: "programs"}
	items := m.items("programs", "program")
	l.programs.unknown = len(items) == 0
	for i, n := range items {
		before := len(l.issues)
		var p survey.Program
		var demands []demandMark
		if pm := l.mapping(n, "programs", label("program", i, n)); pm != nil {
			p, demands = l.program(pm)
			l.programs.add(&l.reader, pm.at("name"), p.Name)
		} else {
			l.programs.add(&l.reader, n, "")
		}
		l.sv.Programs = append(l.sv.Programs, p)
		l.marks.programs = append(l.marks.programs, mark{node: n, sound: len(l.issues) == before})
		l.marks.demands = append(l.marks.demands, demands)
	}
}

func (l *loader) program(m *mapping) (survey.Program, []demandMark) {
	p := survey.Program{ShareMax: 1}
	p.Name, _ = m.name("name")
	p.Weight, _ = m.number("weight", span{low: 0, high: 1e9})
	share := m.group("share", m.path+".share")
	part := span{low: 0, high: 1}
	low, ok := share.number("min", part)
	high, ok2 := share.number("max", part)
	if ok && ok2 {
		p.ShareMin, p.ShareMax = low, high
		if low > high {
			l.fault(share.node, fmt.Sprintf("share goes from %s to %s", plain(low), plain(high)), "want min at most max")
		}
	}
	p.Telescopes = m.names("telescopes", &l.telescopes)
	programRules := m.overrides()
	var marks []demandMark
	named := names{kind: "demand", plural: "demands"}
	sequences := map[string]int{}
	for i, n := range m.items("demands", "demand") {
		before := len(l.issues)
		name := label("demand", i, n)
		dm := l.mapping(n, m.path+".demands", name)
		if dm == nil {
			p.Demands = append(p.Demands, survey.Demand{GapMax: math.Inf(1)})
			marks = append(marks, demandMark{mark: mark{node: n}})
			continue
		}
		d, mk := l.demand(dm)
		named.add(&l.reader, dm.at("name"), d.Name)
		if sequence := l.sequence(&d); sequence != "" {
			if line, twice := sequences[sequence]; twice {
				l.fault(dm.node, fmt.Sprintf("%s has the same filters (%s) as the demand on line %d of this program", name, sequence, line),
					"want one demand with all the visits, or another order of filters")
			} else {
				sequences[sequence] = dm.node.Line
			}
		}
		mk.rules = append(append(mk.rules, programRules...), dm.overrides()...)
		mk.mark = mark{node: n, sound: len(l.issues) == before}
		p.Demands = append(p.Demands, d)
		marks = append(marks, mk)
	}
	return p, marks
}

// sequence is a demand's filters in order, or nothing when one is not known.
func (l *loader) sequence(d *survey.Demand) string {
	var words []string
	for i := range d.Exposures {
		if d.Exposures[i].Filter < 0 {
			return ""
		}
		words = append(words, l.filters.list[d.Exposures[i].Filter])
	}
	return strings.Join(words, "+")
}

// exposureTime is what one exposure may last.
var exposureTime = span{low: 0, high: 12 * hourSeconds, openLow: true}

// demand reads one demand, its set written out.
func (l *loader) demand(m *mapping) (survey.Demand, demandMark) {
	d := survey.Demand{GapMax: math.Inf(1)}
	var mk demandMark
	d.Visits, _ = m.integer("visits", 1, 10_000)
	gap := m.group("gap", m.path+".gap")
	if v, ok := gap.duration("min", span{low: 0, high: 3650 * daySeconds}); ok {
		d.GapMin = v
	}
	if v, ok := gap.duration("max", span{low: 0, high: 3650 * daySeconds, openLow: true}); ok {
		d.GapMax = v
	}
	if d.GapMax < d.GapMin {
		l.fault(gap.node, fmt.Sprintf("gap goes from %s to %s", formatDuration(d.GapMin), formatDuration(d.GapMax)), "want min at most max")
	}
	d.PerNight, _ = m.integer("per_night", 1, 10_000)
	switch {
	case m.has("set"):
		for _, key := range []string{"filter", "exposure", "repeats"} {
			if m.has(key) {
				l.fault(m.at(key), "a demand with a set has no "+key+" of its own", "want it inside the set, or no set")
			}
		}
		l.set(m, &d, &mk)
	case m.has("filter") && m.has("exposure"):
		one := survey.Exposure{Filter: l.filterOf(m)}
		one.Duration, _ = m.duration("exposure", exposureTime)
		d.Exposures = append(d.Exposures, one)
		mk.exposures = append(mk.exposures, m.node)
		if m.has("repeats") {
			l.repeats(m, &d, &mk)
		}
	default:
		for _, key := range []string{"filter", "exposure"} {
			if !m.has(key) {
				l.fault(m.node, "the demand has no "+key, "want filter and exposure, or a set")
			}
		}
	}
	d.Name = l.sequence(&d)
	if m.has("name") {
		d.Name, _ = m.name("name")
	}
	return d, mk
}

// filterOf reads the filter key; -1 when it names none.
func (l *loader) filterOf(m *mapping) int {
	text, ok := m.text("filter", "want a filter's name")
	if !ok {
		return -1
	}
	id, ok := l.filters.find(&l.reader, m.at("filter"), text)
	if !ok {
		return -1
	}
	return id
}

// longestSet is the most exposures in a set.
const longestSet = 100

// repeats writes out a set of equal exposures.
func (l *loader) repeats(m *mapping, d *survey.Demand, mk *demandMark) {
	r := l.mapping(m.values["repeats"], m.path+".repeats", "repeats")
	if r == nil {
		return
	}
	count, ok := r.integer("count", 2, longestSet)
	spacing, ok2 := r.duration("spacing", span{low: 0, high: daySeconds, openLow: true})
	tolerance, ok3 := r.duration("tolerance", span{low: 0, high: daySeconds})
	if !ok || !ok2 || !ok3 {
		return
	}
	for range count - 1 {
		next := d.Exposures[0]
		next.After, next.Tolerance = spacing, tolerance
		d.Exposures = append(d.Exposures, next)
		mk.exposures = append(mk.exposures, r.node)
	}
}

// set reads exposures in order.
func (l *loader) set(m *mapping, d *survey.Demand, mk *demandMark) {
	items := m.list("set", "want a list of {filter, exposure, after, tolerance}")
	if n := m.values["set"]; n.Kind != yaml.SequenceNode {
		return
	} else if len(items) < 2 || len(items) > longestSet {
		l.fault(n, fmt.Sprintf("the set has %d exposures", len(items)), fmt.Sprintf("want 2 to %d", longestSet))
		return
	}
	for i, n := range items {
		e := survey.Exposure{Filter: -1}
		name := fmt.Sprintf("exposure %d of the set", i+1)
		if em := l.mapping(n, m.path+".set", name); em != nil {
			e.Filter = l.filterOf(em)
			e.Duration, _ = em.duration("exposure", exposureTime)
			for _, key := range []string{"after", "tolerance"} {
				if em.has(key) && i == 0 {
					l.fault(em.at(key), name+" has "+key, "want it from the second exposure on")
				} else if !em.has(key) && i > 0 {
					l.fault(em.node, name+" has no "+key, "want such as after: 10m, tolerance: 5m")
				}
			}
			if i > 0 {
				e.After, _ = em.duration("after", span{low: 0, high: daySeconds, openLow: true})
				e.Tolerance, _ = em.duration("tolerance", span{low: 0, high: daySeconds})
			}
		}
		d.Exposures = append(d.Exposures, e)
		mk.exposures = append(mk.exposures, n)
	}
}

// readNetworks reads the sets of sites to compare.
func (l *loader) readNetworks(m *mapping) {
	l.networks = names{kind: "network", plural: "networks"}
	for i, n := range m.list("networks", "want a list of {name, sites}") {
		nm := l.mapping(n, "networks", label("network", i, n))
		if nm == nil {
			continue
		}
		var w survey.Network
		w.Name, _ = nm.name("name")
		l.networks.add(&l.reader, nm.at("name"), w.Name)
		w.Sites = nm.names("sites", &l.sites)
		l.sv.Networks = append(l.sv.Networks, w)
	}
}
