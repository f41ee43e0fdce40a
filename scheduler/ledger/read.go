package ledger

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"errors"
	"io"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"
)

// The columns that Read understands. README.md tells them to the user.
var columns = []string{
	"kind", "telescope", "site", "field", "demand", "filter", "start_utc", "end_utc", "quality", "cause", "note",
	"program", "night", "exposure_s", "set", "visit",
}

// passed are the columns of the plan's visits table and of a night's sheet
// that say nothing of what was done.
var passed = []string{
	"gap_before_s", "ra_deg", "dec_deg", "altitude_deg", "azimuth_deg", "airmass", "sun_altitude_deg", "moon_altitude_deg",
	"moon_separation_deg", "sky_mag_arcsec2", "credit", "state",
	"start_local", "sidereal_time", "order", "set_step", "ra", "dec", "filter_change", "latest_start_utc", "latest_by",
}

// form says how the rows of a file tell what they are.
type form uint8

const (
	byKind  form = iota + 1 // a column kind
	allDone                 // all are exposures
	allLost                 // all are lost time
)

// reader reads one file.
type reader struct {
	faults
	at        map[string]int // column to its place
	form      form
	telescope string // of rows that name none
	batch     *Batch
	cells     []string // of the present row
	line      int
}

// Read reads a file of rows: CSV as RFC 4180 has it, in UTF-8 with or without a
// byte-order mark, lines ending with LF or CRLF. The head line names the
// columns, in any order:
//
//   - kind: done or lost. Rows of a night's sheet that still say planned, held,
//     recorded, reserved or reserve are passed over. Without it the file holds exposures if
//     it has a column field, and lost time if it has a column cause.
//   - Of exposures, by the names of the plan's visits table: field, telescope,
//     start_utc, and end_utc or exposure_s; filter, program and demand where they
//     aren't plain from the survey; site, night, quality (the telescope's own; it
//     wins over the computed one), set (needed for exposures of sets), visit, note.
//   - Of lost time: site or telescope; start_utc and end_utc, or night for a whole
//     one; cause (weather, technical, people, other), note.
//
// The other columns of those tables are passed over; unknown ones are listed in
// Batch.Ignored, unless they look like a slip of a known one. telescope, unless
// it is "", stands for the telescope of rows of exposures that name none, as a
// sheet's don't.
//
// The faults are returned by line. The batch is nil only when the head line is
// at fault; with other faults it holds every row as far as it could be read, and
// Record, which then takes nothing in, tells what is wrong with the names too.
func Read(r io.Reader, file, telescope string) (*Batch, []Fault) {
	d := &reader{faults: faults{file: file}, at: map[string]int{}, telescope: telescope, batch: &Batch{File: file}}
	buffered := bufio.NewReaderSize(r, 1<<16)
	mark, _ := buffered.Peek(3)
	switch {
	case bytes.Equal(mark, []byte("\ufeff")):
		buffered.Discard(3)
	case bytes.HasPrefix(mark, []byte{0xff, 0xfe}) || bytes.HasPrefix(mark, []byte{0xfe, 0xff}):
		d.add(1, "save it as CSV in UTF-8", "the file is UTF-16")
		return nil, d.all()
	}
	c := csv.NewReader(buffered)
	c.ReuseRecord = true
	c.FieldsPerRecord = -1 // counted below, so that the reading goes on
	c.TrimLeadingSpace = true
	head, err := c.Read()
	if err != nil {
		d.add(1, "want a head line with the names of columns, such as "+example, "there is no head line")
		return nil, d.all()
	}
	line, _ := c.FieldPos(0)
	if !d.head(slices.Clone(head), line) {
		return nil, d.all()
	}
	width := len(head)
	for {
		cells, err := c.Read()
		var bad *csv.ParseError
		switch {
		case errors.Is(err, io.EOF):
			d.batch.faults = d.faults
			return d.batch, d.all()
		case errors.As(err, &bad):
			d.add(bad.Line, "want cells with commas between, quoted whole or not at all", "the row is no CSV: %v", bad.Err)
			continue
		case err != nil:
			d.add(d.line+1, "want a file that can be read", "the reading stopped: %v", err)
			return nil, d.all()
		}
		d.line, _ = c.FieldPos(0)
		if len(cells) != width {
			d.add(d.line, "want "+strconv.Itoa(width)+", as many as there are columns", "the row has %d cells", len(cells))
			continue
		}
		d.cells = cells
		d.row()
	}
}

const example = "field,telescope,filter,start_utc,end_utc"

// head reads the head line, and tells whether the rows make sense under it.
func (d *reader) head(names []string, line int) bool {
	if len(names) == 1 && strings.ContainsAny(names[0], ";\t") {
		d.add(line, "want commas between", "the columns stand apart by other signs than commas")
		return false
	}
	for i, n := range names {
		n = strings.ToLower(strings.TrimSpace(n))
		if !utf8.ValidString(n) {
			d.add(line, "save it as CSV in UTF-8", "the name of column %d is not UTF-8", i+1)
			continue
		}
		if _, twice := d.at[n]; twice && n != "" {
			d.add(line, "want it once", "the column %s is there twice", quoted(n))
		}
		if slices.Contains(columns, n) {
			d.at[n] = i
			continue
		}
		if slices.Contains(passed, n) || n == "" {
			continue
		}
		if near, ok := nearest(n, columns); ok {
			d.add(line, "did you mean "+near+"?", "there is no column %s", quoted(n))
			continue
		}
		d.batch.Ignored = append(d.batch.Ignored, n)
	}
	d.setForm(line)
	return len(d.list) == 0
}

func (d *reader) has(column string) bool { _, ok := d.at[column]; return ok }

func (d *reader) setForm(line int) {
	switch {
	case d.has("kind"):
		d.form = byKind
	case d.has("field") && d.has("cause"):
		d.add(line, "want a column kind with done or lost in each row", "there are both a column field, of exposures, and a column cause, of lost time")
		return
	case d.has("field"):
		d.form = allDone
	case d.has("cause"):
		d.form = allLost
	default:
		d.add(line, "want such as "+example, "it can't be told what the rows are: there is no column kind, field or cause")
		return
	}
	need := func(want string, any ...string) {
		if !slices.ContainsFunc(any, d.has) {
			d.add(line, want, "there is no column %s", strings.Join(any, " or "))
		}
	}
	const instant = "want it, with instants such as 2027-03-09T03:00:00Z"
	if d.form == allDone {
		need("want the field's name in each row", "field")
		need(instant, "start_utc")
		need("want when the exposure ended, or how long it was", "end_utc", "exposure_s")
		if d.telescope == "" {
			need("want it, or the option --telescope for all rows", "telescope")
		}
	}
	if d.form == allLost {
		need("want where the time was lost", "site", "telescope")
		need("want when the time was lost: both instants, or the label of a night", "start_utc", "night")
	}
}
