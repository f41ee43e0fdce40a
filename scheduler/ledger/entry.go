package ledger

import (
	"math"
	"time"

	"nightwright/constraints/survey"
)

// Exposure is one exposure that was done, as the ledger holds it now.
type Exposure struct {
	ID        int64  // in the ledger
	Source    string // the file it came from
	Row       int    // its line there
	Field     string
	Program   string
	Demand    string
	Filter    string
	Site      string
	Telescope string
	Night     survey.Day
	Start     int64   // UTC, Unix microseconds; exposures are [Start, End)
	End       int64   // UTC, Unix microseconds
	Quality   float64 // the telescope's own, 0..1; NaN: it gave none
	Set       int64   // the plan's set; 0: none
	Visit     int64   // the plan's visit; 0: none
	Unmatched string  // why it belongs to no demand; "" when it does
}

// record is an exposure as a row of the ledger's history.
type record struct {
	Exposure
	what     What
	why      string
	replaces int64
	replaced bool    // by a later one
	fresh    bool    // not in the file yet
	before   *record // of a fresh one: the fresh one that it replaces
}

// holds reports whether the record says that an exposure was taken, and is
// the last word on it.
func (r *record) holds() bool { return !r.replaced && r.what != Withdraw }

// same reports whether two records say the same.
func (r *record) same(o *record) bool {
	quality := r.Quality == o.Quality || math.IsNaN(r.Quality) && math.IsNaN(o.Quality)
	return quality && (r.what == Withdraw) == (o.what == Withdraw) && r.why == o.why && r.Telescope == o.Telescope && r.Start == o.Start && r.End == o.End &&
		r.Field == o.Field && r.Program == o.Program && r.Demand == o.Demand && r.Filter == o.Filter && r.Site == o.Site &&
		r.Set == o.Set && r.Visit == o.Visit
}

// differs names the first thing in which an exposure is told differently.
func (r *record) differs(o *record) string {
	switch {
	case r.Field != o.Field:
		return "field " + quoted(o.Field)
	case r.Demand != o.Demand || r.Program != o.Program:
		return "demand " + quoted(o.Demand)
	case r.Filter != o.Filter:
		return "filter " + quoted(o.Filter)
	case r.End != o.End:
		return "end " + Instant(o.End)
	case r.Set != o.Set || r.Visit != o.Visit:
		return "another visit or set"
	case r.Quality != o.Quality && !(math.IsNaN(r.Quality) && math.IsNaN(o.Quality)):
		return "another quality"
	}
	return "another note"
}

// Loss is a row about lost time: lost, or regained. What holds follows from
// all of them in their order.
type Loss struct {
	Entry     int64
	Source    string
	Row       int
	What      What
	Site      string
	Telescope string // "": all of the site
	Start     int64  // UTC, Unix microseconds; [Start, End)
	End       int64
	Cause     string // one of Causes; "" when regained
	Why       string
}

func (l *Loss) same(o *Loss) bool {
	return l.What == o.What && l.Site == o.Site && l.Telescope == o.Telescope && l.Start == o.Start && l.End == o.End && l.Cause == o.Cause && l.Why == o.Why
}

// Instant writes Unix microseconds as RFC 3339 with Z.
func Instant(us int64) string { return time.UnixMicro(us).UTC().Format(time.RFC3339Nano) }
