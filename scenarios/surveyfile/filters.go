package surveyfile

import (
	"nightwright/visibility"
)

// readFilters reads the passbands.
func (l *loader) readFilters(m *mapping) {
	l.filters = names{kind: "filter", plural: "filters"}
	bands := []string{"U", "B", "V", "R", "I"} // in the order of visibility.Band
	items := m.items("filters", "filter")
	l.filters.unknown = len(items) == 0
	for i, n := range items {
		var f visibility.Filter
		if fm := l.mapping(n, "filters", label("filter", i, n)); fm != nil {
			f.Name, _ = fm.name("name")
			if b, ok := fm.word("band", bands); ok {
				f.Band = visibility.BandU + visibility.Band(b)
			}
			f.Extinction, _ = fm.number("extinction", span{low: 0, high: 5, unit: " mag per airmass"})
			f.DarkSky, _ = fm.number("dark_sky", span{low: 10, high: 30, unit: " mag/arcsec2"})
			f.Moonlight, _ = fm.number("moonlight", span{low: 0, high: 100})
			l.filters.add(&l.reader, fm.at("name"), f.Name)
		} else {
			l.filters.add(&l.reader, n, "")
		}
		l.sv.Filters = append(l.sv.Filters, f)
	}
}
