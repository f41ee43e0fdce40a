package surveyfile

import (
	"fmt"
	"strings"
	"time"
	_ "time/tzdata" // time zones must be known on a machine without them

	"go.yaml.in/yaml/v3"

	"nightwright/constraints/survey"
)

// readSites reads the sites with their telescopes.
func (l *loader) readSites(m *mapping) {
	l.sites = names{kind: "site", plural: "sites"}
	l.telescopes = names{kind: "telescope", plural: "telescopes"}
	items := m.items("sites", "site")
	l.sites.unknown, l.telescopes.unknown = len(items) == 0, len(items) == 0
	for i, n := range items {
		before := len(l.issues)
		s := survey.Site{}
		var closures []*yaml.Node
		if sm := l.mapping(n, "sites", label("site", i, n)); sm != nil {
			s, closures = l.site(sm, i)
			l.sites.add(&l.reader, sm.at("name"), s.Name)
		} else {
			l.sites.add(&l.reader, n, "")
			l.telescopes.unknown = true
		}
		l.sv.Sites = append(l.sv.Sites, s)
		l.marks.sites = append(l.marks.sites, mark{n, len(l.issues) == before, closures})
	}
}

// site reads one site; the nodes are those of its closures.
func (l *loader) site(m *mapping, id int) (s survey.Site, closures []*yaml.Node) {
	s.Name, _ = m.name("name")
	latitude, _ := m.number("latitude_deg", span{low: -90, high: 90, unit: " degrees"})
	longitude, _ := m.number("longitude_deg", span{low: -180, high: 180, unit: " degrees, east positive"})
	s.Latitude, s.Longitude = latitude*degree, longitude*degree
	s.Elevation, _ = m.number("elevation_m", span{low: -500, high: 9000, unit: " m"})
	s.TimeZone = m.timeZone("time_zone")
	s.Horizon = m.horizon("horizon")
	s.Cost, _ = m.number("cost", span{low: 0, high: 1e12})
	if n := m.values["weather"]; n != nil {
		if w := l.mapping(n, "sites.weather", "weather"); w != nil {
			l.weather(w, &s)
		}
	}
	s.Closures, closures = m.closures("closures")
	items := m.items("telescopes", "telescope")
	for i, n := range items {
		before := len(l.issues)
		t := survey.Telescope{}
		var shut []*yaml.Node
		if tm := l.mapping(n, "sites.telescopes", label("telescope", i, n)); tm != nil {
			t, shut = l.telescope(tm)
			l.telescopes.add(&l.reader, tm.at("name"), t.Name)
		} else {
			l.telescopes.add(&l.reader, n, "")
		}
		t.Site = id
		s.Telescopes = append(s.Telescopes, len(l.sv.Telescopes))
		l.sv.Telescopes = append(l.sv.Telescopes, t)
		l.marks.telescopes = append(l.marks.telescopes, mark{n, len(l.issues) == before, shut})
	}
	if len(items) == 0 {
		l.telescopes.unknown = true
	}
	return s, closures
}

// timeZone reads an IANA name. The zones come with the program.
func (m *mapping) timeZone(key string) string {
	const want = "want an IANA name such as Etc/GMT+7 or America/Santiago"
	text, ok := m.text(key, want)
	if !ok {
		return ""
	}
	// Local would mean another zone on each machine.
	if _, err := time.LoadLocation(text); err != nil || text == "" || strings.EqualFold(text, "local") {
		m.r.fault(m.at(key), fmt.Sprintf("%s: %q is no time zone", key, clip(text)), want)
		return ""
	}
	return text
}

// horizon reads a mask of azimuth and altitude pairs. Azimuths ascend, so
// that it is a function of azimuth.
func (m *mapping) horizon(key string) []survey.HorizonPoint {
	const want = "want pairs of [azimuth, altitude] in degrees, such as [[0, 12], [90, 20]]"
	var mask []survey.HorizonPoint
	last := -1.0
	for _, n := range m.list(key, want) {
		pair, ok := m.pair(n, key, want)
		if !ok {
			continue
		}
		azimuth, altitude := pair[0], pair[1]
		switch {
		case azimuth < 0 || azimuth >= 360:
			m.r.fault(n, fmt.Sprintf("horizon azimuth is %s", plain(azimuth)), "want from 0 to below 360 degrees")
		case altitude < -10 || altitude > 90:
			m.r.fault(n, fmt.Sprintf("horizon altitude is %s", plain(altitude)), "want -10 to 90 degrees")
		case azimuth == last:
			m.r.fault(n, fmt.Sprintf("the horizon has two altitudes at azimuth %s", plain(azimuth)), "want each azimuth once")
		case azimuth < last:
			m.r.fault(n, fmt.Sprintf("horizon azimuth %s comes after %s", plain(azimuth), plain(last)), "want azimuths that ascend")
		default:
			mask = append(mask, survey.HorizonPoint{Azimuth: azimuth * degree, Altitude: altitude * degree})
			last = azimuth
		}
	}
	return mask
}

// pair reads a list of two numbers.
func (m *mapping) pair(n *yaml.Node, key, want string) (pair [2]float64, ok bool) {
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		what := kindName(n)
		if n.Kind == yaml.SequenceNode {
			what = fmt.Sprintf("a list of %d", len(n.Content))
		}
		m.r.fault(n, "an item of "+key+" is "+what, want)
		return pair, false
	}
	ok = true
	for i := range pair {
		c := resolve(n.Content[i])
		v, err := parseNumber(c.Value)
		if c.Kind != yaml.ScalarNode || err != nil {
			m.r.fault(n, fmt.Sprintf("in %s, %s is no number", key, kindName(c)), want)
			ok = false
		}
		pair[i] = v
	}
	return pair, ok
}

// clear reads the twelve clear fractions.
func (m *mapping) clear(key string) []float64 {
	const want = "want 12 numbers from 0 to 1, January first"
	items := m.list(key, want)
	if n := m.values[key]; n != nil && n.Kind == yaml.SequenceNode && len(items) != 12 {
		m.r.fault(n, fmt.Sprintf("%s has %d values", key, len(items)), want)
		return nil
	}
	var months []float64
	for i, n := range items {
		v, err := parseNumber(n.Value)
		if n.Kind != yaml.ScalarNode || err != nil || v < 0 || v > 1 {
			m.r.fault(n, fmt.Sprintf("%s of %s is %s", key, time.Month(i+1), kindName(n)), want)
			continue
		}
		months = append(months, v)
	}
	return months
}

// closures reads nights or times taken away, of a site or a telescope.
// The nodes are those of the closures.
func (m *mapping) closures(key string) (all []survey.Closure, nodes []*yaml.Node) {
	for i, n := range m.list(key, "want a list of {from, to, why}") {
		cm := m.r.mapping(n, m.path+".closures", fmt.Sprintf("closure %d", i+1))
		if cm == nil {
			continue
		}
		if c, ok := cm.closure(); ok {
			all = append(all, c)
			nodes = append(nodes, n)
		}
	}
	return all, nodes
}

func (m *mapping) closure() (c survey.Closure, ok bool) {
	const want = "want two dates, or two instants in UTC such as 2027-04-02T03:00:00Z"
	c.Why, _ = m.text("why", "want a few words")
	from, ok1 := m.text("from", want)
	to, ok2 := m.text("to", want)
	if !ok1 || !ok2 {
		return c, false
	}
	if isDate(from) && isDate(to) {
		c.ByNight = true
		c.FirstNight, _ = survey.ParseDay(strings.TrimSpace(from))
		c.LastNight, _ = survey.ParseDay(strings.TrimSpace(to))
		if c.LastNight < c.FirstNight {
			m.r.fault(m.at("to"), fmt.Sprintf("the closure is reversed: to %s is before from %s", to, from), "want the earlier night first")
			return c, false
		}
		return c, true
	}
	if isDate(from) != isDate(to) && (instantOK(from) || instantOK(to)) {
		m.r.fault(m.at("from"), fmt.Sprintf("the closure goes from %s to %s, of which one is a date and one an instant", from, to), want)
		return c, false
	}
	ok = true
	read := func(key, text string) float64 {
		v, err := parseInstant(text)
		if err != nil {
			what := err.Error()
			if !isDate(text) {
				m.r.fault(m.at(key), fmt.Sprintf("%s: %q %s", m.say(key), clip(text), what), want)
			}
			ok = false
		}
		return v
	}
	c.From, c.To = read("from", from), read("to", to)
	if ok && c.To <= c.From {
		m.r.fault(m.at("to"), fmt.Sprintf("the closure is reversed: to %s is not after from %s", to, from), "want the earlier instant first")
		return c, false
	}
	return c, ok
}

func instantOK(text string) bool {
	_, err := parseInstant(text)
	return err == nil
}
