package scheduler

import (
	"nightwright/constraints"
	"nightwright/constraints/survey"
)

// EstimateBytes returns about how much memory planning a survey takes, within
// a factor of 1.6 of what was measured from 50 MB to 2 GB. It counts the tables
// that grow with nights, sites, fields and kinds of exposure, and what the
// collector lets lie between its rounds.
func EstimateBytes(sv *survey.Survey) int64 {
	nights, sites := int64(sv.Nights()), int64(len(sv.Sites))
	telescopes, filters := int64(len(sv.Telescopes)), int64(len(sv.Filters))
	lengths := map[float64]bool{}
	demands := map[int]int64{}
	for p := range sv.Programs {
		for _, d := range sv.Programs[p].Demands {
			demands[p] += int64(len(d.Exposures))
			for _, e := range d.Exposures {
				lengths[e.Duration] = true
			}
		}
	}
	var rows int64 // of the shelf: at most one for each exposure asked of a field
	for f := range sv.Fields {
		rows += min(demands[sv.Fields[f].Program], filters)
	}
	const (
		direction = 24  // a field and day
		body      = 64  // Sun and Moon at a site, each 600 s
		frame     = 280 // of a grid, each 300 s; two grids
		light     = 56  // of it, for each filter
		start     = 32  // of the ceiling: about 350 a telescope, night and length
		shelf     = 28  // a row, site and night
	)
	sum := constraints.EstimateBytes(sv) +
		int64(len(sv.Fields))*(nights+4)*direction +
		sites*nights*(144*body+2*130*(frame+filters*light)) +
		telescopes*nights*int64(len(lengths))*350*start +
		rows*sites*nights*shelf
	return 20<<20 + sum*3/2
}
