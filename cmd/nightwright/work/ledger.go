package work

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strings"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// maxRecordBytes bounds a file of rows.
const maxRecordBytes = 256 << 20

// FaultsError lists the faults of a file of rows. Nothing was recorded.
type FaultsError struct {
	File   string
	Faults []ledger.Fault
}

// Error joins the faults, a line each.
func (e *FaultsError) Error() string {
	lines := make([]string, len(e.Faults))
	for i, f := range e.Faults {
		lines[i] = f.String()
	}
	return strings.Join(lines, "\n")
}

// RecordAsk says what to record.
type RecordAsk struct {
	File      string
	Telescope string // of rows that name none; "": each row must
	ledger.Terms
}

// RecordResult says what was recorded.
type RecordResult struct {
	ledger.Result
	Ledger  string   // file
	Ignored []string // columns
}

// LedgerPath is where a survey's ledger is, or will be.
func (s *Survey) LedgerPath() string { return filepath.Join(s.Folder(), ledger.FileName) }

// Record takes a file of exposures and lost time into the survey's ledger, all
// or nothing. Faults of the file are a *FaultsError.
func Record(ctx context.Context, s *Survey, ask RecordAsk, o Options) (*RecordResult, error) {
	if ask.Telescope != "" {
		if _, err := s.TelescopeID(ask.Telescope); err != nil {
			return nil, err
		}
	}
	o.tell("record", 0, 1)
	text, err := readRows(ask.File)
	if err != nil {
		return nil, err
	}
	batch, faults := ledger.Read(bytes.NewReader(text), ask.File, ask.Telescope)
	if batch == nil {
		return nil, &FaultsError{ask.File, faults}
	}
	l, err := ledger.OpenWriter(s.LedgerPath())
	if err != nil {
		return nil, ledgerFault(err)
	}
	defer l.Close()
	sum := sha256.Sum256(text)
	e := ledger.Entry{Made: time.Now(), Source: ask.File, SHA256: hex.EncodeToString(sum[:]), Program: o.Version}
	r, faults, err := l.Record(ctx, s.Survey, s.Exact, batch, e, ask.Terms)
	if err != nil {
		return nil, ledgerFault(err)
	}
	if len(faults) > 0 {
		return nil, &FaultsError{ask.File, faults}
	}
	o.tell("record", 1, 1)
	return &RecordResult{*r, l.Path(), batch.Ignored}, l.Close()
}

// readRows reads a file of rows whole.
func readRows(file string) ([]byte, error) {
	info, err := os.Stat(file)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, Inputf("there is no file %s; want a CSV of what was done or lost", file)
	case err != nil:
		return nil, Inputf("%v; want a CSV of what was done or lost", err)
	case info.Mode().IsRegular() && info.Size() > maxRecordBytes:
		return nil, Inputf("%s has %d bytes; want at most %d, split it", file, info.Size(), maxRecordBytes)
	case info.IsDir():
		return nil, Inputf("%s is a folder; want a CSV of what was done or lost", file)
	}
	text, err := os.ReadFile(file)
	if err != nil {
		return nil, Inputf("%v; want a file that can be read", err)
	}
	return text, nil
}

// ledgerFault makes what is wrong with a ledger's file the input's fault.
func ledgerFault(err error) error {
	var file *ledger.FileError
	var row *ledger.RowError
	switch {
	case errors.As(err, &file):
		return &InputError{What: file.Error()}
	case errors.As(err, &row):
		return &InputError{What: row.Error()}
	}
	return err
}

// LoseAsk is a stretch of lost time. From and To are instants, or labels of
// nights: from the start of the one to the end of the other.
type LoseAsk struct {
	Site, Telescope string // one of them
	From, To        string
	Cause, Why      string
	Regained        bool // it wasn't lost after all
}

// Lose records lost time in the survey's ledger. Entry 0 in the result: the
// same was recorded before. The interval is that which was meant.
func Lose(ctx context.Context, s *Survey, ask LoseAsk, o Options) (*RecordResult, visibility.Interval, error) {
	var in visibility.Interval
	site, err := s.lossPlace(ask)
	if err != nil {
		return nil, in, err
	}
	if in.From, err = s.loseInstant("--from", ask.From, site, false); err != nil {
		return nil, in, err
	}
	if in.To, err = s.loseInstant("--to", ask.To, site, true); err != nil {
		return nil, in, err
	}
	if in.To <= in.From {
		return nil, in, Inputf("--to %s is not after --from %s", ask.To, ask.From)
	}
	r := ledger.Row{
		What: ledger.Lost, Site: ask.Site, Telescope: ask.Telescope, Cause: ask.Cause, Note: ask.Why,
		Start: int64(math.Round(in.From * 1e6)), End: int64(math.Round(in.To * 1e6)),
	}
	if ask.Regained {
		r.What, r.Cause = ledger.Regained, ""
	}
	l, err := ledger.OpenWriter(s.LedgerPath())
	if err != nil {
		return nil, in, ledgerFault(err)
	}
	defer l.Close()
	res, err := l.Lose(ctx, s.Survey, s.Exact, r, ledger.Entry{Made: time.Now(), Program: o.Version})
	if err != nil {
		return nil, in, ledgerFault(err)
	}
	return &RecordResult{Result: *res, Ledger: l.Path()}, in, l.Close()
}

// lossPlace finds the site at which time was lost.
func (s *Survey) lossPlace(ask LoseAsk) (int, error) {
	switch {
	case (ask.Site == "") == (ask.Telescope == ""):
		return 0, Inputf("lose wants one of --site and --telescope: where the time was lost")
	case ask.Site != "":
		return s.SiteID(ask.Site)
	}
	t, err := s.TelescopeID(ask.Telescope)
	if err != nil {
		return 0, err
	}
	return s.Telescopes[t].Site, nil
}

// loseInstant reads an instant or a night's label (Unix s).
func (s *Survey) loseInstant(name, text string, site int, end bool) (float64, error) {
	if text == "" {
		return 0, Inputf("lose wants %s: UTC such as 2027-02-01T03:00:00Z, or a night such as 2027-02-01", name)
	}
	if day, err := survey.ParseDay(text); err == nil && day >= s.FirstNight-36600 && day <= s.LastNight+36600 {
		night := s.Exact.Night(constraints.Place(&s.Sites[site]), int32(day))
		if end {
			return night.To, nil
		}
		return night.From, nil
	}
	us, ok := ledger.ParseInstant(text)
	if !ok {
		return 0, Inputf("%s is %q; want UTC such as 2027-02-01T03:00:00Z, or a night such as 2027-02-01", name, text)
	}
	return float64(us) / 1e6, nil
}

// FollowAsk says what to compare.
type FollowAsk struct {
	Plan string // folder; "": plan in the survey folder, if one is there
	Now  string // instant up to which to compare; "": the end of what the ledger holds
}

// FollowResult says whether a survey is on track.
type FollowResult struct {
	*ledger.Track
	Ledger  string
	Folder  string // of the plan; "" without one
	Entries int64
	Lost    []ledger.Loss
	Plans   []ledger.PlanMade
	Changed []string // files of the survey that differ from the plan's
	Unknown bool     // the ledger doesn't know the plan
}

// Follow compares what the ledger holds with a plan.
func Follow(ctx context.Context, s *Survey, ask FollowAsk, o Options) (*FollowResult, error) {
	l, err := ledger.Open(s.LedgerPath())
	if err != nil {
		return nil, ledgerFault(err)
	}
	defer l.Close()
	r := &FollowResult{Ledger: l.Path()}
	h := ledger.Holdings{Survey: s.Survey}
	if h.Done, err = l.Done(ctx); err != nil {
		return nil, ledgerFault(err)
	}
	if r.Lost, err = l.LossRows(ctx, ledger.Now); err != nil {
		return nil, ledgerFault(err)
	}
	if r.Plans, err = l.Plans(ctx); err != nil {
		return nil, ledgerFault(err)
	}
	if r.Entries, err = l.Last(ctx); err != nil {
		return nil, ledgerFault(err)
	}
	until := lastTold(h.Done, r.Lost)
	if ask.Now != "" {
		now, err := ParseInstant("--now", ask.Now)
		if err != nil {
			return nil, err
		}
		until = int64(math.Round(now * 1e6))
	}
	if err := s.followPlan(ask, &h, r); err != nil {
		return nil, err
	}
	if err := s.OpenCalendar(ctx, o); err != nil {
		return nil, err
	}
	h.Open, h.Lost = s.Calendar.Open, ledger.LostTime(s.Survey, r.Lost)
	h.Credits = ledger.Credit(s.Survey, s.Exact, h.Done)
	r.Track = ledger.Follow(h, until)
	return r, ctx.Err()
}

// lastTold is the end of what a ledger tells of.
func lastTold(done []ledger.Exposure, lost []ledger.Loss) int64 {
	var last int64
	for i := range done {
		last = max(last, done[i].End)
	}
	for i := range lost {
		last = max(last, lost[i].End)
	}
	return last
}

// followPlan reads the plan to compare with.
func (s *Survey) followPlan(ask FollowAsk, h *ledger.Holdings, r *FollowResult) error {
	dir := ask.Plan
	if dir == "" {
		dir = filepath.Join(s.Folder(), "plan")
		if _, err := os.Stat(filepath.Join(dir, "plan.json")); err != nil {
			return nil
		}
	}
	pt, err := ReadPlan(dir)
	if err != nil {
		return err
	}
	r.Folder, r.Changed = dir, s.Changed(pt)
	sum, err := planSum(pt)
	if err != nil {
		return err
	}
	r.Unknown = true
	for _, p := range r.Plans {
		r.Unknown = r.Unknown && p.SHA256 != sum
	}
	h.Planned = []ledger.Planned{}
	for i := range pt.Visits {
		v := &pt.Visits[i]
		h.Planned = append(h.Planned, ledger.Planned{
			Program: v.Program, Site: v.Site, Telescope: v.Telescope, Night: survey.Day(v.Night), Start: v.Start, Set: v.Set, Credit: v.Credit,
		})
	}
	return nil
}

// planSum is the SHA-256 of a plan's plan.json: its bytes follow from the
// summary, and the reader of the folder has seen to it that they are the same.
func planSum(pt *tables.PlanTables) (string, error) {
	text, err := pt.Summary.Encode()
	if err != nil {
		return "", fmt.Errorf("plan.json: %w", err)
	}
	sum := sha256.Sum256(text)
	return hex.EncodeToString(sum[:]), nil
}
