package audit

import (
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Input is a plan with the survey that it claims to serve.
type Input struct {
	Survey *survey.Survey
	// Exact is the sky; nil: made from the survey's own leap seconds and
	// Earth orientation.
	Exact *visibility.Exact
	// Losses holds, for each telescope, lost time (UTC, Unix s); nil: none.
	Losses  [][]visibility.Interval
	Workers int // threads, 1 at least; the report doesn't depend on it
	Plan
}

// Plan is what is judged.
type Plan struct {
	Visits []Visit // in any order
	Totals *Totals // nil: not judged
	// Done lists what the ledger says was done; a row of state done must be
	// among it.
	Done []Done
	// LegalityOnly leaves out the numbers that rows carry beside who, what and
	// when (altitude to credit), which a plan in the making doesn't have yet.
	LegalityOnly bool
}

// Visit is one row of the visits table: one exposure. Field for field it is
// that table's row, in its units (degrees, seconds, Unix microseconds); Night
// is in days since 1970-01-01, and Set 0 stands for none.
type Visit struct {
	Visit          int64
	Set            int64
	Field          string
	Program        string
	Demand         string
	Filter         string
	Site           string
	Telescope      string
	Night          int32
	Start          int64
	End            int64
	Exposure       float64
	GapBefore      float64
	RA             float64
	Dec            float64
	Altitude       float64
	Azimuth        float64
	Airmass        float64
	SunAltitude    float64
	MoonAltitude   float64
	MoonSeparation float64
	SkyMagnitude   float64
	Quality        float64
	Credit         float64
	State          string
}

// Done is one exposure of the ledger.
type Done struct {
	Telescope string
	Start     int64   // UTC, Unix microseconds
	Quality   float64 // the telescope's own; NaN: it gave none
}

// Totals is what a plan claims of itself. A nil slice is not judged.
type Totals struct {
	Score
	Ceiling float64
	Gap     float64
	Hours   Hours

	Programs   []ProgramTotal
	Sites      []PlaceTotal
	Telescopes []PlaceTotal
	Fields     []FieldTotal
	Demands    []DemandTotal
	Nights     []NightTotal
}

// Score is what a plan earns.
type Score struct {
	Coverage       float64 // C, 0..1
	VisitsGot      int64
	VisitsWanted   int64
	FieldsFinished int64
	FieldsWanted   int64
}

// Hours is time of telescopes, h.
type Hours struct {
	Dark     float64 // Sun below -18 deg
	Open     float64
	Used     float64 // exposures and the gaps they need
	Exposure float64 // exposures alone
}

// ProgramTotal is one program's outcome; its coverage is that of a survey
// which had this program alone.
type ProgramTotal struct {
	Program string
	Score
	ExposureHours float64
	Share         float64 // of all exposure time, 0..1
	ShareBreach   float64 // 0 when the bounds hold to within one visit
}

// PlaceTotal is the outcome of one site or of one telescope.
type PlaceTotal struct {
	Name   string
	Visits int64 // a set counts once
	Hours  Hours
}

// FieldTotal is one field's outcome, as the fields table has it.
type FieldTotal struct {
	Field, Program string
	Weight         float64
	RA, Dec        float64 // deg
	VisitsWanted   int64
	VisitsPlanned  int64 // planned or held
	VisitsDone     int64
	Coverage       float64  // sum of q / visits wanted, bonus apart
	Bonus          float64  // finish_bonus when every visit is got, else 0
	First, Last    int64    // start of the first and last visit, Unix microseconds; 0: none
	LongestGap     *float64 // d, between starts of consecutive visits; nil with fewer than two
}

// DemandTotal is one demand of one field, as the demands table has it.
type DemandTotal struct {
	Field, Demand  string
	Wanted         int64
	Planned        int64
	Done           int64
	GapMaxBreaches int64
}

// NightTotal is one telescope's night, as the nights table has it.
type NightTotal struct {
	Site, Telescope  string
	Night            int32 // days since 1970-01-01
	DarkHours        float64
	OpenHours        float64
	UsedHours        float64
	ExposureHours    float64
	Visits           int64
	MoonIllumination float64
}
