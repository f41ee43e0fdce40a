package model

// Outcome is what a solver hands back: the plan, what bounds it, and how it
// came to be. Coverage here is the search's own; the tables recount it on the
// exact path.
type Outcome struct {
	Plan     *Plan
	Coverage float64 // C of the plan, 0..1
	Ceiling  float64 // no legal plan's C exceeds it
	Expected float64 // no way of acting has a greater mean C under the expected weather; 0: not worked out
	Status   Status
	Effort   string // quick, normal or thorough
	Seed     uint64
	Prices   []Price // ascending in (Telescope, SlotStart)
	Shares   []ShareOutcome
	Stats    []Stat // counters of the search, in a fixed order
	Parts    []Part // what the gap is made of; they sum to ceiling - coverage
}

// Gap returns (ceiling - coverage) / ceiling, and 0 when the ceiling is 0.
func Gap(coverage, ceiling float64) float64 {
	if ceiling == 0 {
		return 0
	}
	return (ceiling - coverage) / ceiling
}

// Price is the ceiling's multiplier for one telescope and slot.
type Price struct {
	Telescope int32
	SlotStart int64   // UTC, Unix s
	PerHour   float64 // C per hour of telescope time
}

// ShareOutcome says how one program's share came out.
type ShareOutcome struct {
	Program  int32
	Share    float64 // of all scaled exposure time planned and done
	Min, Max float64 // asked for
	Breach   float64 // 0 when the bounds hold to within one visit
	Why      string  // "" when there is no breach
}

// Stat is one named counter.
type Stat struct {
	Name  string
	Value int64
}

// Part is one part of the gap between ceiling and plan.
type Part struct {
	Name  string
	Worth float64 // C
}

// Status says why a search ended.
type Status uint8

// The ways a search ends.
const (
	StepsDone Status = iota + 1 // all steps of the effort were taken
	TimeLimit
	Interrupted
)

// String gives the word that stands in plan.json.
func (s Status) String() string {
	switch s {
	case StepsDone:
		return "steps_done"
	case TimeLimit:
		return "time_limit"
	case Interrupted:
		return "interrupted"
	}
	return "unknown"
}

// Progress is one report of a long job.
type Progress struct {
	Phase       string
	Done, Total int     // steps of the phase; Total 0 when unknown
	Coverage    float64 // 0 when not known yet
	Ceiling     float64
}
