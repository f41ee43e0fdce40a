package model

import (
	"cmp"
	"slices"
)

// State says how firm an exposure of a plan is.
type State uint8

// The states of an exposure.
const (
	Planned State = iota + 1
	Held          // a re-plan may not move it
	Done          // from the ledger
)

// String gives the word that stands in the tables.
func (s State) String() string {
	switch s {
	case Planned:
		return "planned"
	case Held:
		return "held"
	case Done:
		return "done"
	}
	return "unknown"
}

// Exposure is one row of a plan: one exposure on one telescope. Instants are
// UTC in Unix microseconds, [Start, End).
type Exposure struct {
	Visit     int64 // row id, kept through re-plans
	Set       int64 // groups the exposures of one set; 0 without sets
	Field     int32 // ids into the Survey
	Demand    int32 // index in the field's program
	Step      int32 // index of the exposure in the demand
	Telescope int32
	Night     int32 // label, as index from the survey's first night
	State     State
	Start     int64
	End       int64
	Quality   float64 // of one that was done: the ledger's; else 0
}

// Plan is what the program writes out: exposures sorted by (Start, Telescope).
type Plan struct {
	Exposures []Exposure
}

// NewPlan sorts exposures by start and telescope and numbers visits and sets from
// 1 in that order. It keeps the slice.
func NewPlan(all []Exposure) *Plan {
	slices.SortStableFunc(all, func(a, b Exposure) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope))
	})
	sets := map[int64]int64{}
	for i := range all {
		all[i].Visit = int64(i + 1)
		if s := all[i].Set; s != 0 {
			if sets[s] == 0 {
				sets[s] = int64(len(sets) + 1)
			}
			all[i].Set = sets[s]
		}
	}
	return &Plan{Exposures: all}
}
