package ledger

import (
	"math"

	"nightwright/constraints/survey"
)

// What says what a row is about.
type What string

// The kinds of rows, by the word that stands for them in the ledger.
const (
	Done     What = "done"     // an exposure was taken
	Correct  What = "correct"  // what was recorded of an exposure was wrong; this is right
	Withdraw What = "withdraw" // an exposure that was recorded wasn't taken
	Lost     What = "lost"     // time was lost
	Regained What = "regained" // time that was recorded as lost wasn't, or not all of it
)

// ofTime is true for rows about time, not exposures.
func (w What) ofTime() bool { return w == Lost || w == Regained }

// Causes lists the causes of lost time.
func Causes() []string { return []string{"weather", "technical", "people", "other"} }

// Row is one row of a file, as far as the file alone can say.
type Row struct {
	Line      int // in the file, from 1
	What      What
	Telescope string
	Site      string
	Night     survey.Day // label; noNight: not given
	Start     int64      // UTC, Unix microseconds; 0: not given
	End       int64
	Note      string

	// Of exposures.
	Field, Program, Demand, Filter string
	Exposure                       float64 // s; 0: not given
	Quality                        float64 // the telescope's own, 0..1; NaN: not given
	Set, Visit                     int64   // of the plan; 0: not given

	// Of lost time.
	Cause string

	Faulty bool // the row has faults of its own
}

// noNight marks a row without a night.
const noNight survey.Day = math.MinInt32

// Batch is a file of rows.
type Batch struct {
	File    string // as it was named
	Rows    []Row
	Skipped int      // rows of a sheet that don't say done or lost
	Ignored []string // columns that say nothing to a ledger and are in no table of this program
	faults  faults   // of the rows themselves
}
