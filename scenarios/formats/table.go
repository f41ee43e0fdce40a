package formats

import (
	"math"
	"reflect"
	"strings"

	"nightwright/scheduler/tables"
)

// Kind is what a column holds.
type Kind uint8

// The kinds, and the Go type of their cells; nil is null in any.
const (
	Text    Kind = iota // string
	Integer             // int64
	Real                // float64
	Truth               // bool
	Instant             // int64, UTC Unix microseconds
	Date                // int32, days since 1970-01-01
	Ring                // []float64 of three: right ascension, declination and radius, deg
)

// Column is one column of a table.
type Column struct {
	Name  string
	Kind  Kind
	Unit  string // VOUnits 1.0
	UCD   string // UCD1+
	Utype string
	Time  bool // a Real that is a modified Julian date
	About string
}

// Table is a table with cells of any kind, ready to be written.
type Table struct {
	Name    string
	Utype   string
	About   string
	Columns []Column
	Rows    [][]any
}

// FromRows makes a Table of rows of a plan's table, in the table's order.
// Units, UCDs and descriptions come from the names of the columns.
func FromRows[T any](of tables.Table[T], rows []T) Table {
	t := Table{Name: of.Name, About: abouts[of.Name]}
	typ := reflect.TypeFor[T]()
	optional := make([]bool, typ.NumField())
	for i := range typ.NumField() {
		name, flags, _ := strings.Cut(typ.Field(i).Tag.Get("parquet"), ",")
		c := known[name]
		c.Name = name
		optional[i] = strings.Contains(flags, "optional")
		ft := typ.Field(i).Type
		if ft.Kind() == reflect.Pointer {
			ft = ft.Elem()
		}
		switch {
		case strings.Contains(flags, "timestamp"):
			c.Kind = Instant
		case strings.Contains(flags, "date"):
			c.Kind = Date
		case ft.Kind() == reflect.Int64:
			c.Kind = Integer
		case ft.Kind() == reflect.Float64:
			c.Kind = Real
		case ft.Kind() == reflect.Bool:
			c.Kind = Truth
		}
		t.Columns = append(t.Columns, c)
	}
	rows = append([]T(nil), rows...)
	of.Sort(rows)
	for r := range rows {
		v := reflect.ValueOf(&rows[r]).Elem()
		cells := make([]any, len(t.Columns))
		for i := range cells {
			x := v.Field(i)
			if optional[i] && x.IsZero() {
				continue
			}
			if x.Kind() == reflect.Pointer {
				x = x.Elem()
			}
			cells[i] = x.Interface()
		}
		t.Rows = append(t.Rows, cells)
	}
	return t
}

// MJD is the modified Julian date (UTC days of 86400 s) of UTC Unix
// microseconds.
func MJD(micros int64) float64 {
	const day = 86400 * 1e6
	whole := math.Floor(float64(micros) / day)
	return 40587 + whole + (float64(micros)-whole*day)/day
}

// abouts describe the tables of a plan.
var abouts = map[string]string{
	"visits":  "Planned, held and done exposures; geometry, sky and quality hold at the middle of each.",
	"fields":  "What each field wants and gets.",
	"demands": "What each demand of each field wants and gets.",
	"nights":  "Each telescope's nights.",
	"prices":  "What one more hour at a telescope and time would add to the ceiling.",
}

// known are units, UCDs and descriptions of the columns of a plan's tables.
var known = map[string]Column{
	"visit":               {UCD: "meta.id;meta.main", About: "Number of the exposure, kept through re-plans"},
	"set":                 {UCD: "meta.id", About: "Number that the exposures of one set share"},
	"field":               {UCD: "meta.id;src", About: "Name of the field"},
	"program":             {UCD: "meta.id;obs.proposal", About: "Program that asks for it"},
	"demand":              {UCD: "meta.id", About: "Demand of the program"},
	"filter":              {UCD: "meta.id;instr.filter", About: "Filter"},
	"site":                {UCD: "meta.id;instr.obsty", About: "Site"},
	"telescope":           {UCD: "meta.id;instr.tel", About: "Telescope"},
	"night":               {UCD: "time.epoch", About: "Date of the night's evening at the site"},
	"start_utc":           {UCD: "time.start;obs.exposure", About: "Start of the exposure, UTC"},
	"end_utc":             {UCD: "time.end;obs.exposure", About: "End of the exposure, UTC"},
	"exposure_s":          {Unit: "s", UCD: "time.duration;obs.exposure", About: "End less start"},
	"gap_before_s":        {Unit: "s", UCD: "time.duration", About: "Time the telescope needs before it; 0 for the first of a night"},
	"ra_deg":              {Unit: "deg", UCD: "pos.eq.ra;meta.main", About: "Right ascension, ICRS"},
	"dec_deg":             {Unit: "deg", UCD: "pos.eq.dec;meta.main", About: "Declination, ICRS"},
	"altitude_deg":        {Unit: "deg", UCD: "pos.az.alt", About: "Altitude without refraction, topocentric"},
	"azimuth_deg":         {Unit: "deg", UCD: "pos.az.azi", About: "Azimuth, north 0, east 90"},
	"airmass":             {UCD: "obs.airMass", About: "Airmass (Young 1994)"},
	"sun_altitude_deg":    {Unit: "deg", UCD: "pos.az.alt", About: "Altitude of the Sun's centre"},
	"moon_altitude_deg":   {Unit: "deg", UCD: "pos.az.alt", About: "Altitude of the Moon's centre"},
	"moon_separation_deg": {Unit: "deg", UCD: "pos.angDistance", About: "Angle between field and Moon"},
	"sky_mag_arcsec2":     {Unit: "mag.arcsec**-2", UCD: "phot.mag.sb", About: "Sky brightness at the field in the exposure's filter"},
	"quality":             {UCD: "arith.factor", About: "Worth of the exposure, 0 to 1, against one at the zenith in a dark sky"},
	"credit":              {UCD: "stat.value;arith.ratio", About: "Part of the coverage that it earns"},
	"state":               {UCD: "meta.code.status", About: "planned, held or done"},
	"weight":              {UCD: "stat.weight", About: "Weight of program times weight of field"},
	"visits_wanted":       {UCD: "meta.number", About: "Visits wanted"},
	"visits_planned":      {UCD: "meta.number", About: "Visits planned or held"},
	"visits_done":         {UCD: "meta.number", About: "Visits done"},
	"coverage":            {UCD: "stat.value;arith.ratio", About: "Quality got over visits wanted, 0 to 1"},
	"bonus":               {UCD: "stat.value;arith.ratio", About: "Bonus for a finished field"},
	"usable_hours":        {Unit: "h", UCD: "time.duration", About: "Hours in which some telescope may observe it"},
	"first_utc":           {UCD: "time.start", About: "Start of the first visit, UTC"},
	"last_utc":            {UCD: "time.end", About: "Start of the last visit, UTC"},
	"longest_gap_d":       {Unit: "d", UCD: "time.interval", About: "Longest time between starts of visits in turn"},
	"limited_by":          {UCD: "meta.note", About: "What limits the field"},
	"wanted":              {UCD: "meta.number", About: "Visits wanted"},
	"planned":             {UCD: "meta.number", About: "Visits planned or held"},
	"done":                {UCD: "meta.number", About: "Visits done"},
	"gap_max_breaches":    {UCD: "meta.number", About: "Times that visits are farther apart than wished"},
	"dark_hours":          {Unit: "h", UCD: "time.duration", About: "Hours with the Sun below -18 deg"},
	"open_hours":          {Unit: "h", UCD: "time.duration", About: "Hours that the telescope is open"},
	"used_hours":          {Unit: "h", UCD: "time.duration", About: "Hours of exposures and the gaps they need"},
	"exposure_hours":      {Unit: "h", UCD: "time.duration;obs.exposure", About: "Hours of exposures alone"},
	"visits":              {UCD: "meta.number", About: "Visits; a set counts once"},
	"moon_illumination":   {UCD: "stat.value;arith.ratio", About: "Illuminated part of the Moon's disc, at the middle of the night"},
	"price_per_hour":      {Unit: "h**-1", UCD: "arith.rate", About: "What one more hour would add to the ceiling"},
	"slot_start_utc":      {UCD: "time.start", About: "Start of the time slot, UTC"},
}
