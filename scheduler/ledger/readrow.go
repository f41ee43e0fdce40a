package ledger

import (
	"math"
	"slices"
	"strconv"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"nightwright/constraints/survey"
)

// cell returns a column's cell of the present row; "" without the column.
func (d *reader) cell(column string) string {
	if i, ok := d.at[column]; ok {
		return strings.TrimSpace(d.cells[i])
	}
	return ""
}

// wrong notes a fault of the present row.
func (d *reader) wrong(want, what string, args ...any) { d.add(d.line, want, what, args...) }

// sheetKinds stand in the column kind of a sheet where nothing was done yet,
// or nothing new; such rows are passed over.
var sheetKinds = []string{"planned", "held", "recorded", "reserved", "reserve"}

// row reads the present row.
func (d *reader) row() {
	if !slices.ContainsFunc(d.cells, func(c string) bool { return strings.TrimSpace(c) != "" }) {
		return // the empty rows that spreadsheets leave
	}
	for i, c := range d.cells {
		if !utf8.ValidString(c) || strings.ContainsFunc(c, unicode.IsControl) {
			d.wrong("want text in UTF-8", "cell %d has bytes that are no text", i+1)
			return
		}
	}
	what, skip, ok := d.what()
	if skip {
		d.batch.Skipped++
	}
	if !ok || skip {
		return
	}
	before := len(d.list) + d.more
	r := Row{Line: d.line, What: what, Quality: math.NaN(), Night: noNight}
	r.Telescope, r.Site, r.Note = d.name("telescope"), d.name("site"), d.name("note")
	if text := d.cell("night"); text != "" {
		day, err := survey.ParseDay(text)
		if err != nil || day.Unix() < earliest || day.Unix() > latest {
			d.wrong("want the date of its evening, such as 2027-03-08", "night is %s", quoted(text))
		}
		r.Night = day
	}
	r.Start, r.End = d.instant("start_utc"), d.instant("end_utc")
	if what.ofTime() {
		d.lost(&r)
	} else {
		d.exposure(&r)
	}
	r.Faulty = len(d.list)+d.more > before
	d.batch.Rows = append(d.batch.Rows, r)
}

// what tells what the row is; skip is true for one to pass over.
func (d *reader) what() (what What, skip, ok bool) {
	switch d.form {
	case allLost:
		return Lost, false, true
	case allDone:
		return Done, false, true
	}
	kind := strings.ToLower(d.cell("kind"))
	if slices.Contains(sheetKinds, kind) {
		return "", true, true
	}
	if kind != string(Done) && kind != string(Lost) {
		d.wrong("want done or lost", "kind is %s", quoted(d.cell("kind")))
		return "", false, false
	}
	return What(kind), false, true
}

// exposure reads what rows of exposures have.
func (d *reader) exposure(r *Row) {
	if r.Telescope == "" {
		r.Telescope = d.telescope
	}
	r.Field, r.Program, r.Demand, r.Filter = d.name("field"), d.name("program"), d.name("demand"), d.name("filter")
	r.Set, r.Visit = d.id("set"), d.id("visit")
	r.Quality = d.number("quality", 0, 1, math.NaN(), "want 0 to 1, or nothing where the telescope gives none")
	r.Exposure = d.number("exposure_s", 1e-6, longest, 0, "want seconds, more than 0 and at most a day")
	const instant = "want an instant such as 2027-03-09T03:00:00Z"
	if r.Telescope == "" {
		d.wrong("want its name, or the option --telescope for all rows", "telescope is empty")
	}
	if d.cell("start_utc") == "" {
		d.wrong(instant, "start_utc is empty")
	}
	if r.Field == "" {
		d.wrong("want the field's name", "field is empty")
	}
	switch {
	case d.cell("end_utc") == "" && d.cell("exposure_s") == "":
		d.wrong(instant+" in end_utc, or seconds in exposure_s", "it can't be told when the exposure ended")
	case d.cell("end_utc") == "":
		r.End = r.Start + int64(math.Round(r.Exposure*1e6))
	case r.Start != 0 && r.End != 0 && r.End <= r.Start:
		d.wrong("want end_utc after start_utc", "it ends at %s, and starts at %s", d.cell("end_utc"), d.cell("start_utc"))
	case r.Start != 0 && r.End != 0 && r.End-r.Start > longest*1e6:
		d.wrong("want an exposure, of a day at most", "it lasts %.1f h", float64(r.End-r.Start)/3600e6)
	}
}

// lost reads what rows of lost time have.
func (d *reader) lost(r *Row) {
	if r.Telescope == "" && r.Site == "" {
		d.wrong("want a site, or one telescope", "neither site nor telescope is given")
	}
	r.Cause = strings.ToLower(d.cell("cause"))
	if !slices.Contains(Causes(), r.Cause) {
		d.wrong("want "+strings.Join(Causes(), ", "), "cause is %s", quoted(d.cell("cause")))
	}
	start, end := d.cell("start_utc") != "", d.cell("end_utc") != ""
	switch {
	case start != end || (!start && r.Night == noNight && d.cell("night") == ""):
		d.wrong("want start_utc and end_utc, or neither and a night", "it can't be told when the time was lost")
	case start && r.Start != 0 && r.End != 0 && r.End <= r.Start:
		d.wrong("want end_utc after start_utc", "it ends at %s, and starts at %s", d.cell("end_utc"), d.cell("start_utc"))
	}
}

// longest is the longest exposure that is believed, s.
const longest = 86400

// earliest and latest bound the instants that are believed, as the survey
// file bounds its period; Unix s.
var (
	earliest = float64(time.Date(1972, 1, 1, 0, 0, 0, 0, time.UTC).Unix())
	latest   = float64(time.Date(2100, 1, 2, 0, 0, 0, 0, time.UTC).Unix())
)

// ParseInstant reads UTC, ISO 8601 with Z, as Unix microseconds, and false for
// anything else or an instant before 1972 or after 2099.
func ParseInstant(text string) (int64, bool) {
	t, err := time.Parse(time.RFC3339Nano, text)
	if err != nil || t.Location() != time.UTC || float64(t.Unix()) < earliest || float64(t.Unix()) > latest {
		return 0, false
	}
	return t.UnixMicro(), true
}

func (d *reader) instant(column string) int64 {
	text := d.cell(column)
	if text == "" {
		return 0
	}
	us, ok := ParseInstant(text)
	if !ok {
		d.wrong("want UTC such as 2027-03-09T03:00:00Z, from 1972 to 2099", "%s is %s", column, quoted(text))
	}
	return us
}

func (d *reader) number(column string, low, high, none float64, want string) float64 {
	text := d.cell(column)
	if text == "" {
		return none
	}
	x, err := strconv.ParseFloat(text, 64)
	if err != nil || !(x >= low && x <= high) {
		d.wrong(want, "%s is %s", column, quoted(text))
		return none
	}
	return x
}

func (d *reader) id(column string) int64 {
	text := d.cell(column)
	if text == "" {
		return 0
	}
	n, err := strconv.ParseInt(text, 10, 64)
	if err != nil || n < 1 {
		d.wrong("want the plan's whole number, from 1, or nothing", "%s is %s", column, quoted(text))
		return 0
	}
	return n
}

// maxName is the longest text of a cell that is kept, in bytes.
const maxName = 1000

func (d *reader) name(column string) string {
	text := d.cell(column)
	if len(text) > maxName {
		d.wrong("want at most "+strconv.Itoa(maxName), "%s has %d bytes", column, len(text))
		return ""
	}
	return strings.Clone(text) // not the whole line with it
}
