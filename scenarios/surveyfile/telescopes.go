package surveyfile

import (
	"fmt"
	"math"

	"go.yaml.in/yaml/v3"

	"nightwright/constraints/survey"
)

// longest is the limit on overheads: nothing a telescope does takes longer.
var longest = span{low: 0, high: daySeconds}

// telescope reads one telescope; the nodes are those of its closures.
func (l *loader) telescope(m *mapping) (t survey.Telescope, closures []*yaml.Node) {
	t.Name, _ = m.name("name")
	if k, ok := m.word("mount", []string{"altazimuth", "equatorial"}); ok {
		t.Mount = survey.Altazimuth + survey.MountKind(k)
	}
	t.FieldOfView = m.fieldOfView("field_of_view_deg")
	altitude := m.group("altitude_deg", m.path+".altitude_deg")
	degrees := span{low: -5, high: 90, unit: " degrees"}
	low, ok := altitude.number("min", degrees)
	high, ok2 := altitude.number("max", degrees)
	if ok && ok2 && low >= high {
		l.fault(altitude.node, fmt.Sprintf("altitude_deg goes from %s to %s", plain(low), plain(high)), "want min below max")
	}
	t.AltitudeMin, t.AltitudeMax = low*degree, high*degree
	l.azimuthRange(m, &t)
	l.slew(m, &t)
	l.flip(m, &t)
	t.Readout, _ = m.duration("readout", longest)
	t.Filters = m.names("filters", &l.filters)
	t.FilterChange, _ = m.duration("filter_change", longest)
	truth, _ := m.word("during_slew", []string{"false", "true"})
	t.DuringSlew = truth == 1
	t.ExposureScale, _ = m.number("exposure_scale", span{low: 0, high: 1000, openLow: true})
	t.Reserved = m.reserved("reserved")
	t.KeepFree, _ = m.number("keep_free", span{low: 0, high: 1, openHigh: true})
	t.Closures, closures = m.closures("closures")
	return t, closures
}

// fieldOfView reads a diameter, or a width and a height.
func (m *mapping) fieldOfView(key string) survey.FieldOfView {
	size := span{low: 0, high: 180, openLow: true, unit: " degrees"}
	n := m.values[key]
	if n != nil && n.Kind == yaml.MappingNode {
		v := m.r.mapping(n, m.path+"."+key, key)
		width, _ := v.number("width", size)
		height, _ := v.number("height", size)
		return survey.FieldOfView{Width: width * degree, Height: height * degree}
	}
	diameter, _ := m.number(key, size)
	return survey.FieldOfView{Diameter: diameter * degree}
}

// azimuthRange reads what an altazimuth mount can reach.
func (l *loader) azimuthRange(m *mapping, t *survey.Telescope) {
	const key = "azimuth_range_deg"
	n := m.values[key]
	if n == nil || saysNone(n) {
		return
	}
	if t.Mount == survey.Equatorial {
		l.fault(n, "an equatorial mount has no "+key, "want it for altazimuth mounts only")
	}
	r := l.mapping(n, m.path+"."+key, key)
	if r == nil {
		return
	}
	turns := span{low: -720, high: 720, unit: " degrees"}
	from, ok := r.number("from", turns)
	to, ok2 := r.number("to", turns)
	if ok && ok2 && (to <= from || to-from > 360) {
		l.fault(r.node, fmt.Sprintf("%s goes from %s to %s, %s degrees wide", key, plain(from), plain(to), plain(to-from)), "want more than 0 and at most 360 degrees")
		return
	}
	t.AzimuthRange = &survey.AzimuthRange{From: from * degree, To: to * degree}
}

// slew reads how the axes move.
func (l *loader) slew(m *mapping, t *survey.Telescope) {
	n := m.values["slew"]
	if n == nil {
		return
	}
	s := l.mapping(n, m.path+".slew", "slew")
	if s == nil {
		return
	}
	rate, _ := s.number("rate_deg_s", span{low: 0, high: 360, openLow: true, unit: " degrees a second"})
	acceleration, _ := s.number("acceleration_deg_s2", span{low: 0, high: 1000, openLow: true, unit: " degrees a second squared"})
	t.Slew.Rate, t.Slew.Acceleration = rate*degree, acceleration*degree
	t.Slew.Settle, _ = s.duration("settle", longest)
}

// flip reads an equatorial mount's change of side. past_meridian is hour
// angle: an hour is 15 degrees.
func (l *loader) flip(m *mapping, t *survey.Telescope) {
	n := m.values["flip"]
	if n == nil || saysNone(n) {
		return
	}
	if t.Mount == survey.Altazimuth {
		l.fault(n, "an altazimuth mount has no flip", "want it for equatorial mounts only")
	}
	f := l.mapping(n, m.path+".flip", "flip")
	if f == nil {
		return
	}
	time, _ := f.duration("time", longest)
	past, _ := f.duration("past_meridian", span{low: 0, high: 12 * hourSeconds})
	t.Flip = &survey.Flip{Time: time, PastMeridian: past / hourSeconds * math.Pi / 12}
}

// reserved reads the blocks taken out of each night.
func (m *mapping) reserved(key string) []survey.Reserved {
	var all []survey.Reserved
	for i, n := range m.list(key, "want a list of {at, takes, why} or {every, takes, why}") {
		name := fmt.Sprintf("reserved block %d", i+1)
		b := m.r.mapping(n, m.path+"."+key, name)
		if b == nil {
			continue
		}
		var r survey.Reserved
		r.Why, _ = b.text("why", "want a few words")
		takes, sound := b.duration("takes", span{low: 0, high: daySeconds, openLow: true})
		r.Takes = takes
		if b.has("at") == b.has("every") {
			what := " has neither at nor every"
			if b.has("at") {
				what = " has both at and every"
			}
			m.r.fault(n, name+what, "want one of them: at: opening, at: closing, or every: 2h")
			continue
		}
		if b.has("at") {
			at, ok := b.word("at", []string{"opening", "closing"})
			r.At, sound = survey.AtOpening+survey.ReservedAt(at), sound && ok
		} else {
			every, ok := b.duration("every", span{low: 0, high: daySeconds, openLow: true})
			r.At, r.Every = survey.AtEvery, every
			if ok && sound && every <= takes {
				m.r.fault(b.at("takes"), fmt.Sprintf("%s takes %s every %s, all of the night", name, formatDuration(takes), formatDuration(every)), "want takes to be shorter than every")
				sound = false
			}
			sound = sound && ok
		}
		if sound {
			all = append(all, r)
		}
	}
	return all
}
