package constraints

import (
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Positions returns the sky places of all fields, by field id.
func Positions(sv *survey.Survey) []visibility.Position {
	out := make([]visibility.Position, len(sv.Fields))
	for i := range sv.Fields {
		f := &sv.Fields[i]
		out[i] = visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec}
	}
	return out
}

// Place returns where a site is on the ground.
func Place(s *survey.Site) visibility.Site {
	return visibility.Site{Latitude: s.Latitude, Longitude: s.Longitude, Elevation: s.Elevation}
}

// Sites returns the places of all sites, by site id.
func Sites(sv *survey.Survey) []visibility.Site {
	out := make([]visibility.Site, len(sv.Sites))
	for i := range sv.Sites {
		out[i] = Place(&sv.Sites[i])
	}
	return out
}

// Epoch is the instant from which windows count, UTC Unix s: 00:00Z two days
// before the first night label, so that every instant of the period is later
// at any longitude.
func Epoch(sv *survey.Survey) int64 { return int64(sv.FirstNight-2) * 86400 }

// Period returns a stretch of time that holds every night of the survey at any
// longitude, with an hour to spare; sky tables should cover it.
func Period(sv *survey.Survey) visibility.Interval {
	return visibility.Interval{
		From: (sv.FirstNight - 1).Unix(),
		To:   (sv.LastNight + 3).Unix(),
	}
}

// Tables builds the survey's sky tables over its whole period.
func Tables(sv *survey.Survey, e *visibility.Exact, workers int) *visibility.Sky {
	p := Period(sv)
	return visibility.NewSky(e, Sites(sv), sv.Filters, Positions(sv), p.From, p.To, workers)
}

// EstimateBytes returns about how much memory the windows of a survey will
// take: an index entry a cell (unit, class, night), and one window in each of
// half of them, as surveys over both hemispheres have.
func EstimateBytes(sv *survey.Survey) int64 {
	w := Windows{sv: sv}
	w.setClasses()
	units := 0
	for i := range sv.Fields {
		rules := sv.Fields[i].Rules
		for j := range rules {
			same := false
			for k := range j {
				a, b := rules[j], rules[k]
				a.MinQuality, b.MinQuality = 0, 0
				same = same || a == b
			}
			if !same {
				units++
			}
		}
	}
	return int64(units) * int64(len(w.classes)) * int64(sv.Nights()) * (4 + 8/2)
}
