package surveyfile

import (
	"fmt"

	"nightwright/constraints/survey"
)

// weather reads the two-state sky of a site.
func (l *loader) weather(m *mapping, s *survey.Site) {
	s.Clear = m.clear("clear")
	s.Persistence, _ = m.duration("persistence", span{low: 0, high: 365 * daySeconds, openLow: true})
	if m.has("region") {
		s.Region, _ = m.name("region")
	}
	s.Correlation, _ = m.number("correlation", span{low: 0, high: 1})
	if s.Correlation > 0 && !m.has("region") {
		l.fault(m.at("correlation"), "the correlation has no region to be with", "want region: a name that the sites which share weather have in common")
	}
	s.LevelPersistence, _ = m.duration("level_persistence", span{low: 0, high: 365 * daySeconds, openLow: true})
	sum := 0.0
	for i, n := range m.list("levels", "want a list of {share, extinction_mag, seeing}") {
		lm := l.mapping(n, "sites.weather.levels", fmt.Sprintf("level %d", i+1))
		if lm == nil {
			continue
		}
		var v survey.SkyLevel
		v.Share, _ = lm.number("share", span{low: 0, high: 1})
		v.Extinction, _ = lm.number("extinction_mag", span{low: 0, high: 10, unit: " mag"})
		v.Seeing, _ = lm.number("seeing", span{low: 1, high: 100})
		sum += v.Share
		s.Levels = append(s.Levels, v)
	}
	if len(s.Levels) == 0 {
		s.LevelPersistence = 0
	}
	if sum > 1+1e-9 {
		l.fault(m.at("levels"), fmt.Sprintf("the shares of the levels add up to %.4g", sum), "want 1 at most")
	}
}
