package scheduler

import "nightwright/scheduler/dual"

// effort is what a search spends, in steps.
type effort struct {
	levels     []dual.Level
	ceilingBin float64 // width of the start bins of the final ceiling, s
	construct  float64 // theta of the construction
	sweeps     []float64
}

// efforts by name.
var efforts = map[string]effort{
	"quick": {
		levels: []dual.Level{
			{Nights: 30, Hours: 1, Steps: 20, Sample: 8, Eta: 0.6, EtaLast: 0.1, Bin: 1200},
			{Nights: 7, Hours: 0.5, Steps: 20, Sample: 4, Eta: 0.3, EtaLast: 0.05, Bin: 600},
		},
		ceilingBin: 600,
		construct:  0.8,
		sweeps:     []float64{0.4, 0},
	},
	"normal": {
		levels: []dual.Level{
			{Nights: 30, Hours: 1, Steps: 30, Sample: 8, Eta: 0.6, EtaLast: 0.1, Bin: 1200},
			{Nights: 7, Hours: 0.5, Steps: 30, Sample: 4, Eta: 0.3, EtaLast: 0.05, Bin: 600},
			{Nights: 1, Hours: 0, Steps: 20, Sample: 1, Eta: 0.1, EtaLast: 0.02, Bin: 600},
		},
		ceilingBin: 300,
		construct:  0.8,
		sweeps:     []float64{0.6, 0.4, 0},
	},
	"thorough": {
		levels: []dual.Level{
			{Nights: 30, Hours: 1, Steps: 40, Sample: 4, Eta: 0.6, EtaLast: 0.1, Bin: 1200},
			{Nights: 7, Hours: 0.5, Steps: 40, Sample: 2, Eta: 0.3, EtaLast: 0.05, Bin: 600},
			{Nights: 1, Hours: 0, Steps: 60, Sample: 1, Eta: 0.1, EtaLast: 0.01, Bin: 600},
		},
		ceilingBin: 150,
		construct:  0.8,
		sweeps:     []float64{0.8, 0.6, 0.4, 0.2, 0, 0, 0},
	},
}
