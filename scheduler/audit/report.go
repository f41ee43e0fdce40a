package audit

import (
	"cmp"
	"slices"
)

// Report is the judgement.
type Report struct {
	Breaches  []Breach // none: the plan is legal and its numbers are true
	Exposures int      // rows judged
	Visits    int      // a set counts once
	Instants  int64    // at which an exposure was tested
	Score     Score    // recounted
	Hours     Hours    // recounted
}

// Legal reports whether nothing was found.
func (r *Report) Legal() bool { return len(r.Breaches) == 0 }

// Breach is one thing that is wrong. Visit, Set, Field, Telescope and Night
// are 0 or empty where they don't apply.
type Breach struct {
	Visit     int64
	Set       int64
	Field     string
	Telescope string
	Night     string // YYYY-MM-DD
	Rule      string // one of Rules
	Measured  float64
	Limit     float64 // what Measured had to keep, or should have been
	Unit      string  // of both: deg, h, s, mag/arcsec2, or nothing
	What      string  // one sentence

	at int64 // start, to sort by
}

// The words for what can be wrong. The rules of an instant have the names
// that the grid's blocked_by has for them.
const (
	RuleName             = "name"      // a field, program, demand, filter, site or telescope that the survey hasn't
	RuleVisitID          = "visit_id"  // two rows with one id
	RuleState            = "state"     // a word that isn't one, or done without the ledger
	RuleLength           = "length"    // end - start isn't exposure x exposure_scale
	RuleFilter           = "filter"    // not the one the demand asks for here
	RuleTelescope        = "telescope" // may not observe this demand
	RuleNight            = "night"     // the label is wrong, or the exposure lies in two nights
	RulePeriod           = "period"    // outside the survey's nights
	RuleClosed           = "closed"
	RuleLost             = "lost"
	RuleDates            = "dates"
	RuleSun              = "sun"
	RuleAltitude         = "altitude"
	RuleAirmass          = "airmass"
	RuleHourAngle        = "hour_angle"
	RuleHorizon          = "horizon"
	RuleMountAltitude    = "mount_altitude"
	RuleAzimuthRange     = "azimuth_range"
	RuleMoonIllumination = "moon_illumination"
	RuleMoonSeparation   = "moon_separation"
	RuleQuality          = "quality"
	RuleReserved         = "reserved"
	RuleLowerMeridian    = "lower_meridian" // an equatorial mount's hour angle passes +-12 h
	RuleFlip             = "flip"           // passes the meridian by more than past_meridian
	RuleGap              = "gap"            // between two exposures of a telescope
	RuleKeepFree         = "keep_free"
	RuleSet              = "set"     // not whole, or of mixed parts
	RuleAfter            = "after"   // an exposure of a set at the wrong time
	RuleOverlap          = "overlap" // of two sets of one demand
	RuleGapMin           = "gap_min" // cadence
	RulePerNight         = "per_night"
	RuleCount            = "count"  // more visits than the demand wants
	RuleNumber           = "number" // a number of a visit's row is not what it should be
	RuleTotal            = "total"  // a total is not what it should be
	RuleShare            = "share"  // a share is out of bounds and not told, or told wrongly
	RuleCeiling          = "ceiling"
)

// Rules lists the words of Breach.Rule in the order in which an exposure's
// breaches are told.
func Rules() []string { return slices.Clone(ruleOrder) }

var ruleOrder = []string{
	RuleName, RuleVisitID, RuleState, RuleLength, RuleFilter, RuleTelescope, RuleNight, RulePeriod,
	RuleClosed, RuleLost, RuleDates, RuleSun, RuleAltitude, RuleAirmass, RuleHourAngle, RuleHorizon,
	RuleMountAltitude, RuleAzimuthRange, RuleMoonIllumination, RuleMoonSeparation, RuleQuality, RuleReserved,
	RuleLowerMeridian, RuleFlip, RuleGap, RuleKeepFree, RuleSet, RuleAfter, RuleOverlap, RuleGapMin,
	RulePerNight, RuleCount, RuleNumber, RuleTotal, RuleShare, RuleCeiling,
}

// sortBreaches puts breaches into their fixed order: those of visits by night,
// telescope, start and id, then those of totals.
func sortBreaches(b []Breach) {
	last := func(x *Breach) int {
		if x.at == 0 {
			return 1
		}
		return 0
	}
	slices.SortFunc(b, func(x, y Breach) int {
		return cmp.Or(
			cmp.Compare(last(&x), last(&y)), cmp.Compare(x.Night, y.Night), cmp.Compare(x.Telescope, y.Telescope),
			cmp.Compare(x.at, y.at), cmp.Compare(x.Visit, y.Visit),
			cmp.Compare(slices.Index(ruleOrder, x.Rule), slices.Index(ruleOrder, y.Rule)),
			cmp.Compare(x.Field, y.Field), cmp.Compare(x.What, y.What), cmp.Compare(x.Set, y.Set),
			cmp.Compare(x.Measured, y.Measured), cmp.Compare(x.Limit, y.Limit),
		)
	})
}
