package ledger

import (
	"cmp"
	"context"
	"database/sql"
	"errors"
	"fmt"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Result says what a file of rows did to a ledger.
type Result struct {
	Entry      int64 // 0: nothing was new, and nothing was written
	Done       int   // exposures recorded, unmatched ones among them
	Unmatched  int   // of those, kept though they belong to no demand
	Below      int   // of those, below min_quality: they count for nothing
	Corrected  int
	Withdrawn  int
	Lost       int // stretches
	Regained   int
	Seen       int // rows that were recorded before and changed nothing
	Skipped    int // rows of a sheet that weren't marked
	FirstStart int64
	LastEnd    int64 // of the exposures recorded; 0: none
}

// recording is a file of rows on its way into a ledger.
type recording struct {
	faults
	l    *Ledger
	m    *matcher
	how  Terms
	past map[key][]*record // all records of the telescopes and time in question
	lost []*Loss
	now  []*Loss // of those, what was neither corrected nor given back whole
	new  []*record
	gone []*Loss // new ones
	Result
}

// Terms say what Record is to put up with.
type Terms struct {
	// KeepUnmatched records exposures that overlap others or belong to no
	// demand, as unmatched: they count for nothing.
	KeepUnmatched bool
	// Correct lets a row take the place of a different one that was recorded
	// for the same telescope (or site) and start.
	Correct bool
}

// key is what a row is known by.
type key struct {
	telescope string
	start     int64
}

// errFaults turns a transaction back without being told.
var errFaults = errors.New("the rows have faults")

// Record takes a file of rows in: all of it in one transaction, or nothing.
//
// A row is known by its telescope (lost time: or its site) and start. One that
// was recorded before with the same words changes nothing; with other words it
// is a fault, unless the terms say that the file corrects: then it takes the
// place of the older row, which stays on record. A correction that says lost of
// the start of an exposure takes that exposure back. Exposures of one telescope
// that overlap and those that belong to no demand of the survey are faults,
// unless the terms say to keep them as unmatched.
//
// All faults of the batch and of its names are returned by line, and then
// nothing was written. The error is about the file of the ledger (ErrBusy:
// another program held it), or ctx's.
func (l *Ledger) Record(ctx context.Context, sv *survey.Survey, exact *visibility.Exact, b *Batch, e Entry, how Terms) (*Result, []Fault, error) {
	return l.take(ctx, sv, exact, b, e, "record", how)
}

// Lose records one stretch of time: lost, or regained. What is wrong with it is
// the error.
func (l *Ledger) Lose(ctx context.Context, sv *survey.Survey, exact *visibility.Exact, r Row, e Entry) (*Result, error) {
	if !r.What.ofTime() {
		panic("ledger: Lose of a row that is not about time: " + string(r.What))
	}
	res, faults, err := l.take(ctx, sv, exact, &Batch{Rows: []Row{r}}, e, "lose", Terms{})
	if err != nil {
		return nil, err
	}
	if len(faults) > 0 {
		return nil, &RowError{faults[0].What, faults[0].Want}
	}
	return res, nil
}

// RowError says what is wrong with a single stretch of time.
type RowError struct{ What, Want string }

// Error is "what is wrong; what would be right".
func (e *RowError) Error() string { return e.What + "; " + e.Want }

func (l *Ledger) take(ctx context.Context, sv *survey.Survey, exact *visibility.Exact, b *Batch, e Entry, kind string, how Terms) (*Result, []Fault, error) {
	c := &recording{faults: b.faults, l: l, m: newMatcher(sv, exact), how: how, past: map[key][]*record{}}
	c.file, c.list = b.File, slices.Clone(b.faults.list)
	c.Skipped = b.Skipped
	err := l.change(ctx, e.Program, func(tx *sql.Tx) error {
		if err := c.load(ctx, tx, b); err != nil {
			return err
		}
		for i := range b.Rows {
			if r := &b.Rows[i]; r.What.ofTime() {
				c.takeTime(r, kind == "record")
			} else {
				c.takeShot(r)
			}
		}
		c.overlaps()
		if len(c.list) > 0 {
			return errFaults
		}
		if len(c.new)+len(c.gone) == 0 {
			return errFaults // nothing to write: not even the entry
		}
		return c.write(ctx, tx, kind, e)
	})
	if errors.Is(err, errFaults) {
		err = nil
	}
	if err != nil || len(c.list) > 0 {
		return nil, c.all(), err
	}
	c.sum()
	return &c.Result, nil, nil
}

// load reads what the ledger holds of the telescopes and times of a batch.
func (c *recording) load(ctx context.Context, tx *sql.Tx, b *Batch) error {
	type span struct{ from, to int64 }
	spans := map[string]span{}
	time := false
	for i := range b.Rows {
		r := &b.Rows[i]
		time = time || r.What.ofTime()
		if r.Faulty || r.Telescope == "" {
			continue
		}
		s, ok := spans[r.Telescope]
		if !ok {
			s = span{r.Start, r.Start}
		}
		spans[r.Telescope] = span{min(s.from, r.Start), max(s.to, r.Start, r.End)}
	}
	for _, t := range sortedKeys(spans) {
		// An exposure that reaches into the time starts at most longest before.
		list, err := c.l.records(ctx, tx, "telescope = (SELECT id FROM names WHERE name = ?) AND start_utc BETWEEN ? AND ?", t, spans[t].from-longest*1e6, spans[t].to)
		if err != nil {
			return err
		}
		for _, r := range list {
			c.past[key{t, r.Start}] = append(c.past[key{t, r.Start}], r)
		}
	}
	if time {
		list, err := c.l.losses(ctx, tx, Now)
		if err != nil {
			return err
		}
		for i := range list {
			c.addLoss(&list[i])
		}
	}
	return nil
}

func sortedKeys[V any](m map[string]V) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// takeShot takes one row about an exposure.
func (c *recording) takeShot(r *Row) {
	rec, none, bad := c.m.shot(r)
	for _, tr := range bad {
		c.add(r.Line, tr.want, "%s", tr.what)
	}
	rec.fresh = true
	if r.Faulty || len(bad) > 0 {
		for _, tr := range none {
			c.strange(rec, tr)
		}
		return
	}
	k := key{r.Telescope, r.Start}
	last := c.last(k)
	seen := last != nil && last.same(rec)
	if !c.how.Correct { // any older word on it is a file read again
		seen = slices.ContainsFunc(c.past[k], rec.same)
	}
	if seen {
		c.Seen++
		return
	}
	switch {
	case last == nil:
	case c.how.Correct:
		rec.what = Correct
		c.replace(last, rec)
	case last.what == Withdraw:
		c.add(r.Line, "want --correct to set it right again", "the exposure of %s at %s was recorded and taken back (%s)", r.Telescope, Instant(r.Start), c.place(last))
		return
	default:
		none = append(none, troublef("want the same, or --correct", "the exposure of %s at %s is told otherwise in %s: %s", r.Telescope, Instant(r.Start), c.place(last), rec.differs(last)))
	}
	for _, tr := range none {
		c.strange(rec, tr)
	}
	c.past[k], c.new = append(c.past[k], rec), append(c.new, rec)
}

// strange marks a record that belongs to no demand, or refuses it.
func (c *recording) strange(rec *record, tr *trouble) {
	if rec.Unmatched == "" {
		rec.Unmatched = tr.what
	}
	if !c.how.KeepUnmatched {
		c.add(rec.Row, tr.want+"; or --keep-unmatched", "%s", tr.what)
	}
}

// place says where a record came from.
func (c *recording) place(r *record) string {
	if r.fresh {
		return fmt.Sprintf("line %d", r.Row)
	}
	return fmt.Sprintf("%s:%d, recorded before", r.Source, r.Row)
}

// last returns the last word on an exposure; nil: there is none. Of several,
// which unmatched rows can make, it is the one that counts.
func (c *recording) last(k key) *record {
	var found *record
	for _, r := range c.past[k] {
		if !r.replaced && (found == nil || found.Unmatched != "" || r.Unmatched == "") {
			found = r
		}
	}
	return found
}

func (c *recording) replace(old, rec *record) {
	old.replaced = true
	if old.fresh {
		rec.before = old
	} else {
		rec.replaces = old.ID
	}
}

// withdraw takes back an exposure that was recorded.
func (c *recording) withdraw(r *Row, last *record) {
	rec := &record{Exposure: last.Exposure, what: Withdraw, why: r.Note, fresh: true}
	rec.Row, rec.ID, rec.Source = r.Line, 0, ""
	c.replace(last, rec)
	k := key{last.Telescope, last.Start}
	c.past[k], c.new = append(c.past[k], rec), append(c.new, rec)
}

// overlaps refuses new exposures that overlap others of their telescope. Of
// two, what was recorded before stays, else the earlier line.
func (c *recording) overlaps() {
	byTelescope := map[string][]*record{}
	for _, list := range c.past { // sorted below
		for _, r := range list {
			if r.holds() && r.Unmatched == "" {
				byTelescope[r.Telescope] = append(byTelescope[r.Telescope], r)
			}
		}
	}
	for _, t := range sortedKeys(byTelescope) {
		list := byTelescope[t]
		slices.SortFunc(list, func(a, b *record) int { return cmp.Or(cmp.Compare(a.Start, b.Start), a.age(b)) })
		last := list[0]
		for _, r := range list[1:] {
			if r.Start >= last.End {
				last = r
				continue
			}
			loser, other := r, last
			if r.age(last) < 0 {
				loser, other, last = last, r, r
			}
			if loser.fresh {
				c.strange(loser, troublef("want one exposure at a time", "the exposure of %s at %s overlaps that of %s (%s)", t, Instant(loser.Start), Instant(other.Start), c.place(other)))
			}
		}
	}
}

// age orders records by their seniority.
func (r *record) age(o *record) int {
	if r.fresh != o.fresh {
		if o.fresh {
			return -1
		}
		return 1
	}
	return cmp.Or(cmp.Compare(r.ID, o.ID), cmp.Compare(r.Row, o.Row))
}

// sum counts what was written.
func (c *recording) sum() {
	for _, r := range c.new {
		switch r.what {
		case Done:
			c.Done++
			c.LastEnd = max(c.LastEnd, r.End)
			if c.FirstStart == 0 || r.Start < c.FirstStart {
				c.FirstStart = r.Start
			}
		case Correct:
			c.Corrected++
		case Withdraw:
			c.Withdrawn++
			continue
		}
		switch {
		case r.Unmatched != "":
			c.Unmatched++
		case below(c.m, &r.Exposure):
			c.Below++
		}
	}
	for _, l := range c.gone {
		if l.What == Lost {
			c.Lost++
		} else {
			c.Regained++
		}
	}
}
