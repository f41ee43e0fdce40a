package scheduler

import (
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
)

// effort is what a search spends, in steps.
type effort struct {
	levels     []dual.Level
	steer      dual.Level // from the ceiling's prices to the search's
	ceilingBin float64    // width of the start bins of the final ceiling, s
	construct  float64    // theta of the construction
	sweeps     []float64
	iterations int // of small plans
}

// efforts by name.
var efforts = map[string]effort{
	"quick": {
		levels: []dual.Level{
			{Block: dual.Block{Nights: 7, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 24, Sample: 8, Eta: 1, EtaLast: 0.2},
			{Block: dual.Block{Nights: 1, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 16, Sample: 2, Eta: 0.5, EtaLast: 0.1},
			{Block: dual.Block{Nights: 1, Hours: 0, Gain: 1}, Memory: 0.8, Steps: 10, Sample: 1, Eta: 0.15, EtaLast: 0.02, Fine: true},
		},
		steer:      dual.Level{Block: dual.Block{Nights: 1, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 12, Sample: 2, Eta: 0.3, EtaLast: 0.05},
		ceilingBin: 600,
		construct:  1,
		sweeps:     []float64{0.5, 0},
		iterations: 50,
	},
	"normal": {
		levels: []dual.Level{
			{Block: dual.Block{Nights: 7, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 32, Sample: 8, Eta: 1, EtaLast: 0.2},
			{Block: dual.Block{Nights: 1, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 24, Sample: 2, Eta: 0.5, EtaLast: 0.1},
			{Block: dual.Block{Nights: 1, Hours: 0, Gain: 1}, Memory: 0.8, Steps: 20, Sample: 1, Eta: 0.15, EtaLast: 0.02, Fine: true},
		},
		steer:      dual.Level{Block: dual.Block{Nights: 1, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 16, Sample: 2, Eta: 0.3, EtaLast: 0.05},
		ceilingBin: 300,
		construct:  1,
		sweeps:     []float64{1, 0.7, 0.4, 0},
		iterations: 600,
	},
	"thorough": {
		levels: []dual.Level{
			{Block: dual.Block{Nights: 7, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 40, Sample: 4, Eta: 1, EtaLast: 0.2},
			{Block: dual.Block{Nights: 1, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 40, Sample: 1, Eta: 0.5, EtaLast: 0.1},
			{Block: dual.Block{Nights: 1, Hours: 0, Gain: 1}, Memory: 0.8, Steps: 60, Sample: 1, Eta: 0.2, EtaLast: 0.01, Fine: true},
		},
		steer:      dual.Level{Block: dual.Block{Nights: 1, Hours: 1, Gain: 1}, Memory: 0.6, Steps: 24, Sample: 2, Eta: 0.3, EtaLast: 0.05},
		ceilingBin: 150,
		construct:  1,
		sweeps:     []float64{1, 1, 0.8, 0.6, 0.4, 0.2, 0, 0},
		iterations: 3000,
	},
}

// fineCells is the size (wants x telescopes x nights) up to which all steps of
// a fine level are taken; larger surveys take fewer, at least leastFine.
const (
	fineCells = 500_000
	leastFine = 3
)

// fit scales a fine level's steps to the survey's size: each costs as much as
// a ceiling.
func fit(p *model.Problem, lv dual.Level) dual.Level {
	if !lv.Fine {
		return lv
	}
	cells := 0
	for i := range p.Wants {
		cells += len(p.Wants[i].Scopes) * p.Nights
	}
	if cells > fineCells {
		lv.Steps = min(lv.Steps, max(leastFine, lv.Steps*fineCells/cells))
	}
	return lv
}
