package work

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

// Trial is a plan made in a copy of the survey, with lost time that its ledger
// doesn't have yet. Nothing of it reaches the survey's folder before Accept.
type Trial struct {
	Losses []LoseAsk
	Before *tables.PlanTables
	After  *tables.PlanTables
	Now    string  // the instant before which nothing was planned
	Survey *Survey // the copy, with the losses

	dir    string // the copy
	folder string // where the plan stands that it would replace
	base   string // checksum of that plan
	seen   int64  // last entry of the survey's ledger
}

// TrialAsk says what to try.
type TrialAsk struct {
	Plan   string // folder of the plan that holds now
	Losses []LoseAsk
	Redo   RedoAsk
	Like   *Survey // of the same files, with its windows open, which are then taken over; nil: none
}

// TryLosses plans again in a copy of the survey in which the losses are
// recorded. The caller drops the trial when it is no longer wanted.
func TryLosses(ctx context.Context, survey string, ask TrialAsk, o Options) (_ *Trial, err error) {
	s, err := ReadSurvey(survey)
	if err != nil {
		return nil, err
	}
	t := &Trial{Losses: ask.Losses, folder: ask.Plan}
	if t.Before, err = ReadPlan(ask.Plan); err != nil {
		return nil, err
	}
	if t.base, err = planSum(t.Before); err != nil {
		return nil, err
	}
	if t.dir, err = os.MkdirTemp("", "nightwright-trial-"); err != nil {
		return nil, err
	}
	defer func() {
		if err != nil {
			t.Drop()
		}
	}()
	if err := t.copySurvey(ctx, s); err != nil {
		return nil, err
	}
	c, err := ReadSurvey(filepath.Join(t.dir, filepath.Base(s.Source.Files[0].Name)))
	if err != nil {
		return nil, err
	}
	t.Survey = c
	for _, loss := range ask.Losses {
		if _, _, err := Lose(ctx, c, loss, o); err != nil {
			return nil, err
		}
	}
	if err := c.takeWindows(ctx, ask.Like, o); err != nil {
		return nil, err
	}
	t.After, t.Now, err = redo(ctx, c, ask.Plan, filepath.Join(t.dir, "plan"), ask.Redo, o)
	if err != nil {
		return nil, err
	}
	text, err := t.After.Summary.Encode()
	if err != nil {
		return nil, err
	}
	sum, err := tables.DecodeSummary("plan.json", text) // with its checksum
	if err != nil {
		return nil, err
	}
	t.After.Summary = *sum
	return t, nil
}

// takeWindows takes the windows of the same survey over: lost time is no part
// of them.
func (s *Survey) takeWindows(ctx context.Context, like *Survey, o Options) error {
	if like == nil || like.Windows == nil || like.sum() != s.sum() {
		return nil
	}
	if _, err := s.TakeLosses(ctx, ledger.Now); err != nil {
		return err
	}
	if err := s.OpenCalendar(ctx, o); err != nil {
		return err
	}
	s.Sky, s.Windows = like.Sky, like.Windows.On(s.Calendar)
	return nil
}

// copySurvey copies the survey's files and its ledger.
func (t *Trial) copySurvey(ctx context.Context, s *Survey) error {
	files, err := s.files()
	if err != nil {
		return err
	}
	for _, f := range files {
		to := filepath.Join(t.dir, filepath.FromSlash(f.Name))
		if err := os.MkdirAll(filepath.Dir(to), 0o700); err != nil {
			return err
		}
		if err := os.WriteFile(to, f.Data, 0o600); err != nil {
			return err
		}
	}
	l, err := ledger.Open(s.LedgerPath())
	if err != nil {
		return ledgerFault(err)
	}
	defer l.Close()
	if t.seen, err = l.Last(ctx); err != nil {
		return ledgerFault(err)
	}
	return ledgerFault(l.CopyTo(ctx, filepath.Join(t.dir, ledger.FileName)))
}

// Drop throws the trial away.
func (t *Trial) Drop() {
	if t.dir != "" {
		_ = os.RemoveAll(t.dir) // a leftover in the system's temporary folder harms nobody
		t.dir = ""
	}
}

// ErrMoved says that the plan or the ledger changed while a trial stood.
type ErrMoved struct{ What string }

// Error says what to do.
func (e *ErrMoved) Error() string {
	return e.What + " changed since the trial was made; throw it away and plan again"
}

// Accept records the trial's losses in the survey's ledger and puts its plan
// in the place of the one that held. It refuses when either changed meanwhile.
func (t *Trial) Accept(ctx context.Context, survey string, o Options) error {
	s, err := ReadSurvey(survey)
	if err != nil {
		return err
	}
	now, err := ReadPlan(t.folder)
	if err != nil {
		return err
	}
	sum, err := planSum(now)
	if err != nil {
		return err
	}
	last, err := s.lastEntry(ctx)
	switch {
	case err != nil:
		return err
	case sum != t.base:
		return &ErrMoved{"the plan"}
	case last != t.seen:
		return &ErrMoved{"the ledger"}
	case len(s.Changed(t.After)) > 0:
		return &ErrMoved{"the survey"}
	}
	files, err := s.files()
	if err != nil {
		return err
	}
	for _, loss := range t.Losses {
		if _, _, err := Lose(ctx, s, loss, o); err != nil {
			return err
		}
	}
	if last, err = s.lastEntry(ctx); err != nil {
		return err
	}
	if err := tables.WriteFolder(t.folder, t.After, files); err != nil {
		return fmt.Errorf("the lost time is in the ledger, the plan could not be written: %w", err)
	}
	if err := s.enterPlan(ctx, t.folder, t.After, last, o); err != nil {
		return fmt.Errorf("the plan was written, the ledger doesn't have it: %w", err)
	}
	return nil
}

func (s *Survey) lastEntry(ctx context.Context) (int64, error) {
	l, err := ledger.Open(s.LedgerPath())
	if err != nil {
		return 0, ledgerFault(err)
	}
	defer l.Close()
	last, err := l.Last(ctx)
	return last, ledgerFault(err)
}

// RedoAsk says how to plan again.
type RedoAsk struct {
	Now       string        // instant before which nothing is planned; "": see Clock
	Clock     time.Time     // the present; it counts where it lies in the survey's period
	Hold      time.Duration // what starts so soon after is kept
	Stability float64       // 0 to 1: how dear moving a visit is
}

// redo plans the rest of a survey again from its ledger and a plan.
func redo(ctx context.Context, s *Survey, plan, out string, ask RedoAsk, o Options) (*tables.PlanTables, string, error) {
	now, err := s.redoNow(ctx, ask)
	if err != nil {
		return nil, "", err
	}
	r, err := Replan(ctx, s, ReplanAsk{Plan: plan, Now: now, Hold: ask.Hold, Stability: ask.Stability, Out: out}, o)
	if err != nil {
		return nil, "", err
	}
	return r.Tables, now, nil
}

// redoNow is the instant asked for; else the clock's, in the survey's period;
// else where the ledger ends, or the period begins.
func (s *Survey) redoNow(ctx context.Context, ask RedoAsk) (string, error) {
	if ask.Now != "" {
		return ask.Now, nil
	}
	h, err := s.history(ctx, ledger.Now)
	if err != nil {
		return "", err
	}
	from, to := int64((s.FirstNight-1).Unix()*1e6), int64((s.LastNight+1).Unix()*1e6)
	if clock := ask.Clock.Unix() * 1e6; clock > from && clock < to {
		from = clock
	}
	return tables.Instant(max(h.Last, from)), nil
}
