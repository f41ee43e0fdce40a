package tables

import "cmp"

// The struct tags are the schema: the column's name, whether it may be null
// ("optional"; a zero value of a plain field is written as null), its logical
// type and encoding. SchemaVersion changes with any of them.

// SchemaVersion stands in the key-value metadata of every table.
const SchemaVersion = "1"

// VisitRow is one exposure. Geometry, sky and quality hold at its middle.
type VisitRow struct {
	Visit          int64   `parquet:"visit,delta"`        // kept through re-plans
	Set            int64   `parquet:"set,optional,delta"` // groups the exposures of a set; 0: none, null in files
	Field          string  `parquet:"field,dict"`
	Program        string  `parquet:"program,dict"`
	Demand         string  `parquet:"demand,dict"`
	Filter         string  `parquet:"filter,dict"`
	Site           string  `parquet:"site,dict"`
	Telescope      string  `parquet:"telescope,dict"`
	Night          int32   `parquet:"night,date"`
	Start          int64   `parquet:"start_utc,timestamp(microsecond:utc),delta"`
	End            int64   `parquet:"end_utc,timestamp(microsecond:utc),delta"`
	Exposure       float64 `parquet:"exposure_s"`   // end - start
	GapBefore      float64 `parquet:"gap_before_s"` // needed before the exposure; 0 for the first of a night
	RA             float64 `parquet:"ra_deg"`       // ICRS, as in the survey
	Dec            float64 `parquet:"dec_deg"`
	Altitude       float64 `parquet:"altitude_deg"` // airless, topocentric
	Azimuth        float64 `parquet:"azimuth_deg"`  // north 0, east 90
	Airmass        float64 `parquet:"airmass"`      // Young 1994
	SunAltitude    float64 `parquet:"sun_altitude_deg"`
	MoonAltitude   float64 `parquet:"moon_altitude_deg"`
	MoonSeparation float64 `parquet:"moon_separation_deg"`
	SkyMagnitude   float64 `parquet:"sky_mag_arcsec2"` // in the exposure's filter
	Quality        float64 `parquet:"quality"`
	Credit         float64 `parquet:"credit"` // its part of C, bonus apart
	State          string  `parquet:"state,dict"`
}

// FieldRow is one field's outcome.
type FieldRow struct {
	Field         string   `parquet:"field,dict"`
	Program       string   `parquet:"program,dict"`
	Weight        float64  `parquet:"weight"` // program weight x field weight
	RA            float64  `parquet:"ra_deg"`
	Dec           float64  `parquet:"dec_deg"`
	VisitsWanted  int64    `parquet:"visits_wanted"`
	VisitsPlanned int64    `parquet:"visits_planned"` // planned or held
	VisitsDone    int64    `parquet:"visits_done"`
	Coverage      float64  `parquet:"coverage"` // sum of q / visits wanted, 0..1, bonus apart
	Bonus         float64  `parquet:"bonus"`    // b when every visit is got, else 0
	UsableHours   float64  `parquet:"usable_hours"`
	First         int64    `parquet:"first_utc,optional,timestamp(microsecond:utc)"` // start of the first visit; 0: none
	Last          int64    `parquet:"last_utc,optional,timestamp(microsecond:utc)"`
	LongestGap    *float64 `parquet:"longest_gap_d,optional"` // between starts of consecutive visits; nil with fewer than two
	LimitedBy     string   `parquet:"limited_by,dict"`        // one of the Limit words
}

// DemandRow is one demand of one field.
type DemandRow struct {
	Field          string `parquet:"field,dict"`
	Demand         string `parquet:"demand,dict"`
	Wanted         int64  `parquet:"wanted"`
	Planned        int64  `parquet:"planned"`
	Done           int64  `parquet:"done"`
	GapMaxBreaches int64  `parquet:"gap_max_breaches"`
}

// NightRow is one telescope's night.
type NightRow struct {
	Site             string  `parquet:"site,dict"`
	Telescope        string  `parquet:"telescope,dict"`
	Night            int32   `parquet:"night,date"`
	DarkHours        float64 `parquet:"dark_hours"`     // Sun below -18 deg
	OpenHours        float64 `parquet:"open_hours"`     // below the loosest Sun limit, less closures, reserves and losses
	UsedHours        float64 `parquet:"used_hours"`     // exposures and the gaps they need
	ExposureHours    float64 `parquet:"exposure_hours"` // exposures alone
	Visits           int64   `parquet:"visits"`         // a set counts once
	MoonIllumination float64 `parquet:"moon_illumination"`
	PricePerHour     float64 `parquet:"price_per_hour"` // mean over open time; 0 without any
}

// PriceRow is the ceiling's multiplier of one telescope and slot.
type PriceRow struct {
	Telescope    string  `parquet:"telescope,dict"`
	SlotStart    int64   `parquet:"slot_start_utc,timestamp(microsecond:utc),delta"`
	PricePerHour float64 `parquet:"price_per_hour"` // C per hour
}

// ChangeRow says what a re-plan did to one exposure.
type ChangeRow struct {
	Visit         int64  `parquet:"visit,delta"`
	Field         string `parquet:"field,dict"`
	What          string `parquet:"what,dict"` // kept, moved, dropped, new, lost, done
	FromTelescope string `parquet:"from_telescope,optional,dict"`
	FromStart     int64  `parquet:"from_start_utc,optional,timestamp(microsecond:utc)"`
	ToTelescope   string `parquet:"to_telescope,optional,dict"`
	ToStart       int64  `parquet:"to_start_utc,optional,timestamp(microsecond:utc)"`
}

// GridRow is one field over one site at one instant.
type GridRow struct {
	Site           string   `parquet:"site,dict"`
	Field          string   `parquet:"field,dict"`
	SlotStart      int64    `parquet:"slot_start_utc,timestamp(microsecond:utc),delta"`
	Altitude       float64  `parquet:"altitude_deg"`
	Azimuth        float64  `parquet:"azimuth_deg"`
	Airmass        *float64 `parquet:"airmass,optional"` // nil below the horizon
	SunAltitude    float64  `parquet:"sun_altitude_deg"`
	MoonAltitude   float64  `parquet:"moon_altitude_deg"`
	MoonSeparation float64  `parquet:"moon_separation_deg"`
	SkyMagnitude   *float64 `parquet:"sky_mag_arcsec2,optional"` // nil below the horizon
	Usable         bool     `parquet:"usable"`
	BlockedBy      string   `parquet:"blocked_by,dict"` // comma-separated rule names
}

// AlmanacRow is one night of one site. A crossing that doesn't happen is 0
// here and null in files.
type AlmanacRow struct {
	Site             string  `parquet:"site,dict"`
	Night            int32   `parquet:"night,date"`
	Sunset           int64   `parquet:"sunset_utc,optional,timestamp(microsecond:utc)"`
	DuskCivil        int64   `parquet:"dusk_civil_utc,optional,timestamp(microsecond:utc)"`
	DuskNautical     int64   `parquet:"dusk_nautical_utc,optional,timestamp(microsecond:utc)"`
	DuskAstronomical int64   `parquet:"dusk_astronomical_utc,optional,timestamp(microsecond:utc)"`
	DawnAstronomical int64   `parquet:"dawn_astronomical_utc,optional,timestamp(microsecond:utc)"`
	DawnNautical     int64   `parquet:"dawn_nautical_utc,optional,timestamp(microsecond:utc)"`
	DawnCivil        int64   `parquet:"dawn_civil_utc,optional,timestamp(microsecond:utc)"`
	Sunrise          int64   `parquet:"sunrise_utc,optional,timestamp(microsecond:utc)"`
	Moonrise         int64   `parquet:"moonrise_utc,optional,timestamp(microsecond:utc)"`
	Moonset          int64   `parquet:"moonset_utc,optional,timestamp(microsecond:utc)"`
	MoonIllumination float64 `parquet:"moon_illumination"`
	DarkHours        float64 `parquet:"dark_hours"`
}

// The tables, each with its order of rows.
var (
	Visits = Table[VisitRow]{"visits", []string{"start_utc", "telescope", "visit"}, func(a, b *VisitRow) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope), cmp.Compare(a.Visit, b.Visit))
	}}
	Fields = Table[FieldRow]{"fields", []string{"field"}, func(a, b *FieldRow) int {
		return cmp.Compare(a.Field, b.Field)
	}}
	Demands = Table[DemandRow]{"demands", []string{"field", "demand"}, func(a, b *DemandRow) int {
		return cmp.Or(cmp.Compare(a.Field, b.Field), cmp.Compare(a.Demand, b.Demand))
	}}
	Nights = Table[NightRow]{"nights", []string{"night", "site", "telescope"}, func(a, b *NightRow) int {
		return cmp.Or(cmp.Compare(a.Night, b.Night), cmp.Compare(a.Site, b.Site), cmp.Compare(a.Telescope, b.Telescope))
	}}
	Prices = Table[PriceRow]{"prices", []string{"telescope", "slot_start_utc"}, func(a, b *PriceRow) int {
		return cmp.Or(cmp.Compare(a.Telescope, b.Telescope), cmp.Compare(a.SlotStart, b.SlotStart))
	}}
	Changes = Table[ChangeRow]{"changes", []string{"visit"}, func(a, b *ChangeRow) int {
		return cmp.Compare(a.Visit, b.Visit)
	}}
	Grid = Table[GridRow]{"grid", []string{"site", "field", "slot_start_utc"}, func(a, b *GridRow) int {
		return cmp.Or(cmp.Compare(a.Site, b.Site), cmp.Compare(a.Field, b.Field), cmp.Compare(a.SlotStart, b.SlotStart))
	}}
	Almanac = Table[AlmanacRow]{"almanac", []string{"site", "night"}, func(a, b *AlmanacRow) int {
		return cmp.Or(cmp.Compare(a.Site, b.Site), cmp.Compare(a.Night, b.Night))
	}}
)
