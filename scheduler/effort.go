package scheduler

import (
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
)

// effort is what a search spends, in steps.
type effort struct {
	soft       dual.Soft  // prices, smoothed
	fine       dual.Level // and by the proving oracle
	steer      int        // soft steps from the ceiling's prices to the search's
	ceilingBin float64    // width of the start bins of the final ceiling, s
	construct  float64    // theta of the construction
	sweeps     []float64
	iterations int // of small plans
}

// softPrices is the smoothed price search in so many steps down to a tau.
func softPrices(steps int, last float64) dual.Soft {
	return dual.Soft{
		Steps: steps, Tau: 0.1, TauLast: last,
		Slot: 0.2, Night: 0.1, Most: 2, Network: 0.3, Memory: 0.5,
	}
}

// finePrices are steps of the proving oracle from prices that are nearly right.
func finePrices(steps int) dual.Level {
	return dual.Level{Memory: 0.8, Steps: steps, Eta: 0.02, EtaLast: 0.005}
}

// efforts by name.
var efforts = map[string]effort{
	"quick": {
		soft: softPrices(50, 0.0007), fine: finePrices(4), steer: 3, ceilingBin: 600,
		construct: 1, sweeps: []float64{0.5, 0}, iterations: 50,
	},
	"normal": {
		soft: softPrices(60, 0.0005), fine: finePrices(10), steer: 5, ceilingBin: 300,
		construct: 1, sweeps: []float64{1, 0.7, 0.4, 0}, iterations: 600,
	},
	"thorough": {
		soft: softPrices(150, 0.0003), fine: finePrices(30), steer: 8, ceilingBin: 150,
		construct: 1, sweeps: []float64{1, 1, 0.8, 0.6, 0.4, 0.2, 0, 0}, iterations: 3000,
	},
}

// fineCells is the size (wants x telescopes x nights) up to which all steps of
// a fine level are taken; larger surveys take fewer, down to none: what the
// smoothed prices leave there is small.
const fineCells = 500_000

// fit scales a fine level's steps to the survey's size: each costs as much as
// a ceiling.
func fit(p *model.Problem, lv dual.Level) dual.Level {
	cells := 0
	for i := range p.Wants {
		cells += len(p.Wants[i].Scopes) * p.Nights
	}
	if cells > fineCells {
		lv.Steps = lv.Steps * fineCells / cells
	}
	return lv
}

// hopeOf is the part of its want's multiplier that a visit made to leave is
// hoped to get elsewhere: none in the last sweeps, after which nothing is placed
// again.
func hopeOf(theta float64) float64 {
	if theta > 0 {
		return 0.9
	}
	return 0
}
