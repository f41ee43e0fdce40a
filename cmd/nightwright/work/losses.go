package work

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"path/filepath"
	"time"

	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

// TakeLosses reads the lost time that the survey's ledger holds, for the
// calendar: after an entry, or ledger.Now. It returns the number of the last
// entry taken into account. It must come before OpenCalendar; later calls change
// nothing.
func (s *Survey) TakeLosses(ctx context.Context, upTo int64) (knew int64, err error) {
	if s.lossesTaken {
		return s.lossesUpTo, nil
	}
	l, err := ledger.Open(s.LedgerPath())
	if err != nil {
		return 0, ledgerFault(err)
	}
	defer l.Close()
	if knew, err = l.Last(ctx); err != nil {
		return 0, ledgerFault(err)
	}
	knew = min(knew, upTo)
	if s.Losses, err = l.Losses(ctx, s.Survey, knew); err != nil {
		return 0, ledgerFault(err)
	}
	s.lossesTaken, s.lossesUpTo = true, knew
	return knew, nil
}

// TakeLossesOf reads the lost time that a plan took into account when it was
// made; of a plan that the ledger doesn't know, the lost time of now. What was
// lost since is no fault of the plan.
func (s *Survey) TakeLossesOf(ctx context.Context, pt *tables.PlanTables) error {
	if s.lossesTaken {
		return nil
	}
	upTo, err := s.knewOf(ctx, pt)
	if err != nil {
		return err
	}
	_, err = s.TakeLosses(ctx, upTo)
	return err
}

func (s *Survey) knewOf(ctx context.Context, pt *tables.PlanTables) (int64, error) {
	l, err := ledger.Open(s.LedgerPath())
	if err != nil {
		return 0, ledgerFault(err)
	}
	defer l.Close()
	plans, err := l.Plans(ctx)
	if err != nil {
		return 0, ledgerFault(err)
	}
	sum, err := planSum(pt)
	if err != nil {
		return 0, err
	}
	upTo := ledger.Now
	for _, p := range plans { // the last of equal ones
		if p.SHA256 == sum {
			upTo = p.Knew
		}
	}
	return upTo, nil
}

// enterPlan records in the ledger that a plan was made.
func (s *Survey) enterPlan(ctx context.Context, dir string, pt *tables.PlanTables, knew int64, o Options) error {
	l, err := ledger.OpenWriter(s.LedgerPath())
	if err != nil {
		return ledgerFault(err)
	}
	defer l.Close()
	sum, err := planSum(pt)
	if err != nil {
		return err
	}
	p := ledger.PlanMade{SHA256: sum, Path: s.within(dir), Coverage: pt.Summary.Coverage, Ceiling: pt.Summary.Ceiling, MadeFor: s.sum(), Knew: knew}
	if err := l.AddPlan(ctx, p, ledger.Entry{Made: time.Now(), Source: p.Path, SHA256: sum, Program: o.Version}); err != nil {
		return ledgerFault(err)
	}
	return l.Close()
}

// within names a folder from the survey's folder where it lies in it.
func (s *Survey) within(dir string) string {
	root, err1 := filepath.Abs(s.Folder())
	abs, err2 := filepath.Abs(dir)
	if err1 != nil || err2 != nil {
		return dir
	}
	if rel, err := filepath.Rel(root, abs); err == nil && filepath.IsLocal(rel) {
		return filepath.ToSlash(rel)
	}
	return abs
}

// sum is one checksum over all of the survey's files.
func (s *Survey) sum() string {
	h := sha256.New()
	for _, f := range s.Source.Files {
		fmt.Fprintf(h, "%s  %s\n", f.SHA256, f.Name)
	}
	return hex.EncodeToString(h.Sum(nil))
}
