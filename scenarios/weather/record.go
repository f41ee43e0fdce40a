package weather

import (
	"bufio"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"time"
)

// Columns says how to read a weather record.
type Columns struct {
	Time  string // column of the instants or dates; "" is "date" or "time", whichever is there
	Open  string // when the sky was open: COLUMN OP VALUE, such as precipitation<=0 or weather=sun|fog
	Where string // rows to take, as COLUMN OP VALUE; "" takes all
}

// Sample is one row of a record: whether the sky was open at a time.
type Sample struct {
	At   int64 // UTC, Unix s
	Open bool
}

// Record is a weather record, ascending in time.
type Record struct {
	Samples []Sample
	Step    int64 // s, the commonest difference of two rows
	Gaps    int   // places where more than a step lies between two rows
	Missing int   // rows without a value
	Other   int   // rows that Where left out
}

// RowError is a fault in a line of a record.
type RowError struct {
	File       string
	Line       int
	What, Want string
}

// Error is file:line: what is wrong; what would be right.
func (e *RowError) Error() string {
	return fmt.Sprintf("%s:%d: %s; %s", e.File, e.Line, e.What, e.Want)
}

// maxFaults is how many faults of a record are told.
const maxFaults = 20

// Read reads a record from CSV with a head line. name stands in errors, which
// are RowErrors joined, a fault each, as far as they could be found.
func Read(name string, r io.Reader, cols Columns) (*Record, error) {
	cr := csv.NewReader(bufio.NewReader(r))
	cr.FieldsPerRecord, cr.ReuseRecord = -1, true
	head, err := cr.Read()
	if err != nil {
		if errors.Is(err, io.EOF) {
			return nil, &RowError{name, 1, "the file is empty", "want a head line and a row a day or an hour"}
		}
		return nil, &RowError{name, 1, err.Error(), "want CSV"}
	}
	rd := reader{name: name, head: append([]string(nil), head...), rec: &Record{}}
	rd.head[0] = strings.TrimPrefix(rd.head[0], "\ufeff")
	if err := rd.plan(cols); err != nil {
		return nil, err
	}
	for {
		cells, err := cr.Read()
		if err == io.EOF {
			break
		}
		line, _ := cr.FieldPos(0)
		if err != nil {
			rd.fault(line, err.Error(), "want CSV")
			break
		}
		rd.row(line, cells)
		if len(rd.faults) >= maxFaults {
			break
		}
	}
	if len(rd.faults) > 0 {
		return nil, errors.Join(rd.faults...)
	}
	if err := rd.finish(); err != nil {
		return nil, err
	}
	return rd.rec, nil
}

// reader reads a record row by row.
type reader struct {
	name   string
	head   []string
	time   int
	open   *condition
	where  *condition
	rec    *Record
	last   int64
	faults []error
}

func (rd *reader) fault(line int, what, want string) {
	rd.faults = append(rd.faults, &RowError{rd.name, line, what, want})
}

// plan finds the columns.
func (rd *reader) plan(cols Columns) error {
	names := strings.Join(rd.head, ", ")
	rd.time = -1
	candidates := []string{cols.Time}
	if cols.Time == "" {
		candidates = []string{"date", "time", "time_utc", "start_utc"}
	}
	for _, c := range candidates {
		if k := rd.column(c); k >= 0 && rd.time < 0 {
			rd.time = k
		}
	}
	if rd.time < 0 {
		return &RowError{rd.name, 1, fmt.Sprintf("there is no column %s; there are %s", strings.Join(candidates, " or "), names), "want --time with the column of dates or instants"}
	}
	if cols.Open == "" {
		cols.Open = "open=1"
		if rd.column("open") < 0 {
			return &RowError{rd.name, 1, "there is no column open; there are " + names, "want --open with a condition, such as 'precipitation<=0' or 'weather=sun'"}
		}
	}
	var err error
	if rd.open, err = rd.condition("--open", cols.Open); err != nil {
		return err
	}
	if cols.Where != "" {
		rd.where, err = rd.condition("--where", cols.Where)
	}
	return err
}

func (rd *reader) column(name string) int {
	for k, h := range rd.head {
		if strings.EqualFold(strings.TrimSpace(h), name) {
			return k
		}
	}
	return -1
}

// condition is COLUMN OP VALUE.
type condition struct {
	column int
	op     string
	words  []string // for = and !=
	limit  float64  // for the others
}

func (rd *reader) condition(flag, text string) (*condition, error) {
	const want = "want COLUMN, one of = != < <= > >=, and a value, such as 'precipitation<=0' or 'weather=sun|fog'"
	at := strings.IndexAny(text, "<>=!")
	if at <= 0 {
		return nil, &RowError{rd.name, 1, fmt.Sprintf("%s is %q", flag, text), want}
	}
	c := &condition{op: text[at : at+1]}
	if at+1 < len(text) && text[at+1] == '=' {
		c.op += "="
	}
	value := strings.TrimSpace(text[at+len(c.op):])
	name := strings.TrimSpace(text[:at])
	if c.op == "==" {
		c.op = "="
	}
	if c.op == "!" || value == "" {
		return nil, &RowError{rd.name, 1, fmt.Sprintf("%s is %q", flag, text), want}
	}
	if c.column = rd.column(name); c.column < 0 {
		return nil, &RowError{rd.name, 1, fmt.Sprintf("%s: there is no column %q", flag, name), "want one of " + strings.Join(rd.head, ", ")}
	}
	if c.op == "=" || c.op == "!=" {
		c.words = strings.Split(value, "|")
		return c, nil
	}
	limit, err := strconv.ParseFloat(value, 64)
	if err != nil || math.IsNaN(limit) {
		return nil, &RowError{rd.name, 1, fmt.Sprintf("%s: %q is no number", flag, value), want}
	}
	c.limit = limit
	return c, nil
}

// holds tells whether a cell meets the condition; known is false for an empty
// cell.
func (c *condition) holds(cells []string) (yes, known bool, err error) {
	if c.column >= len(cells) {
		return false, false, nil
	}
	cell := strings.TrimSpace(cells[c.column])
	if cell == "" || strings.EqualFold(cell, "nan") {
		return false, false, nil
	}
	if c.words != nil {
		in := false
		for _, w := range c.words {
			in = in || sameWord(cell, strings.TrimSpace(w))
		}
		return in == (c.op == "="), true, nil
	}
	v, err := strconv.ParseFloat(cell, 64)
	if err != nil {
		return false, false, fmt.Errorf("%q is no number", cell)
	}
	switch c.op {
	case "<":
		return v < c.limit, true, nil
	case "<=":
		return v <= c.limit, true, nil
	case ">":
		return v > c.limit, true, nil
	}
	return v >= c.limit, true, nil
}

// sameWord compares as numbers where both are, else as words.
func sameWord(a, b string) bool {
	x, err1 := strconv.ParseFloat(a, 64)
	y, err2 := strconv.ParseFloat(b, 64)
	if err1 == nil && err2 == nil {
		return x == y
	}
	return strings.EqualFold(a, b)
}

func (rd *reader) row(line int, cells []string) {
	if rd.where != nil {
		yes, known, err := rd.where.holds(cells)
		if err != nil {
			rd.fault(line, rd.head[rd.where.column]+": "+err.Error(), "want a number")
			return
		}
		if !yes || !known {
			rd.rec.Other++
			return
		}
	}
	if rd.time >= len(cells) {
		rd.fault(line, fmt.Sprintf("it has %d cells", len(cells)), fmt.Sprintf("want %d, as in the head line", len(rd.head)))
		return
	}
	at, err := parseTime(strings.TrimSpace(cells[rd.time]))
	if err != nil {
		rd.fault(line, err.Error(), "want a date such as 2027-02-01, or an instant such as 2027-02-01T03:00:00Z")
		return
	}
	open, known, err := rd.open.holds(cells)
	switch {
	case err != nil:
		rd.fault(line, rd.head[rd.open.column]+": "+err.Error(), "want a number, or nothing where it is missing")
		return
	case at <= rd.last && rd.last != 0 && len(rd.rec.Samples)+rd.rec.Missing > 0:
		what := "its time is before that of the row above"
		if at == rd.last {
			what = "its time is that of the row above"
		}
		rd.fault(line, what, "want one row a time, ascending (--where takes one place of several)")
		return
	}
	rd.last = at
	if !known {
		rd.rec.Missing++
		return
	}
	rd.rec.Samples = append(rd.rec.Samples, Sample{at, open})
}

// parseTime reads a date or an instant, UTC.
func parseTime(s string) (int64, error) {
	for _, layout := range []string{time.DateOnly, time.RFC3339, "2006-01-02T15:04:05", "2006-01-02 15:04:05", "2006-01-02 15:04", "2006-01-02T15:04", "2006/01/02"} {
		if t, err := time.Parse(layout, s); err == nil {
			return t.Unix(), nil
		}
	}
	return 0, fmt.Errorf("%q is no date and no instant", s)
}

// leastRows is the least a fit can be made from.
const leastRows = 60

// finish works out the step and the gaps.
func (rd *reader) finish() error {
	s := rd.rec.Samples
	if len(s) < leastRows {
		return &RowError{rd.name, 1, fmt.Sprintf("it has %d rows with a value", len(s)), fmt.Sprintf("want %d or more, at best some years", leastRows)}
	}
	counts := map[int64]int{}
	best := 0
	for i := 1; i < len(s); i++ {
		d := s[i].At - s[i-1].At
		if counts[d]++; counts[d] > best || counts[d] == best && d < rd.rec.Step {
			best, rd.rec.Step = counts[d], d
		}
	}
	for i := 1; i < len(s); i++ {
		if s[i].At-s[i-1].At > rd.rec.Step {
			rd.rec.Gaps++
		}
	}
	if rd.rec.Step > 32*86400 {
		return &RowError{rd.name, 2, fmt.Sprintf("its rows are %d days apart", rd.rec.Step/86400), "want a record by the hour or by the day"}
	}
	return nil
}
