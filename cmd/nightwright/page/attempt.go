package page

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"slices"
	"time"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/model"
)

// attempt is a plan that waits to be accepted or thrown away.
type attempt struct {
	trial *work.Trial
	view  *view
	json  trialJSON
}

// markJSON is lost time that is not in the ledger yet.
type markJSON struct {
	Site      string `json:"site,omitempty"`
	Telescope string `json:"telescope,omitempty"`
	From      string `json:"from"`
	To        string `json:"to"`
	Cause     string `json:"cause"`
	Why       string `json:"why,omitempty"`
}

type trialAskJSON struct {
	Losses    []markJSON `json:"losses"`
	Now       string     `json:"now"`
	HoldHours float64    `json:"hold_hours"`
	Stability *float64   `json:"stability"`
}

// trialJSON is what would change.
type trialJSON struct {
	Losses   []markJSON     `json:"losses"`
	Now      string         `json:"now"` // nothing before it was planned
	Before   planJSON       `json:"before"`
	After    planJSON       `json:"after"`
	Counts   map[string]int `json:"counts"`
	Changes  []changeJSON   `json:"changes"` // the first of them
	Checksum string         `json:"checksum"`
}

type changeJSON struct {
	Visit         int64   `json:"visit"`
	Field         string  `json:"field"`
	What          string  `json:"what"`
	FromTelescope string  `json:"from_telescope,omitempty"`
	FromStart     float64 `json:"from_start,omitempty"`
	ToTelescope   string  `json:"to_telescope,omitempty"`
	ToStart       float64 `json:"to_start,omitempty"`
}

const (
	maxMarks     = 200
	changesShown = 500
)

// pick returns the plan that a request asks for: the one that holds, or with
// plan=trial the one that waits.
func (s *Server) pick(r *http.Request) (*view, error) {
	switch which := r.URL.Query().Get("plan"); which {
	case "", "current":
		return s.books.view(r.Context())
	case "trial":
		s.tryMu.Lock()
		defer s.tryMu.Unlock()
		if s.try == nil {
			return nil, noTrial
		}
		return s.try.view, nil
	default:
		return nil, wrong(fmt.Sprintf("plan is %q; want current or trial", which))
	}
}

var noTrial = &statusError{http.StatusNotFound, "no plan waits to be accepted"}

// postTrial starts planning again with marks of lost time. Nothing is written.
func postTrial(s *Server, w http.ResponseWriter, r *http.Request) error {
	var ask trialAskJSON
	if err := readJSON(r, &ask); err != nil {
		return err
	}
	v, err := s.books.view(r.Context())
	if err != nil {
		return err
	}
	losses, err := marks(v, ask.Losses)
	if err != nil {
		return err
	}
	if !(ask.HoldHours >= 0 && ask.HoldHours <= 24*366) {
		return wrong("hold_hours must be 0 to 8784")
	}
	again := work.RedoAsk{Now: ask.Now, Clock: s.cfg.Now(), Hold: time.Duration(ask.HoldHours * float64(time.Hour)), Stability: 0.5}
	if ask.Stability != nil {
		if again.Stability = *ask.Stability; !(again.Stability >= 0 && again.Stability <= 1) {
			return wrong("stability must be 0 to 1")
		}
	}
	if again.Now != "" {
		if _, err := work.ParseInstant("now", again.Now); err != nil {
			return err
		}
	}
	j, err := s.jobs.start("plan again", func(ctx context.Context, tell func(model.Progress)) error {
		return s.attempt(ctx, v, losses, ask.Losses, again, tell)
	})
	if err != nil {
		return err
	}
	w.Header().Set("Location", fmt.Sprintf("/api/jobs/%d", j.ID))
	w.WriteHeader(http.StatusAccepted)
	state, _ := j.now()
	return sendJSON(w, r, state)
}

// marks checks lost time before any work is done for it.
func marks(v *view, in []markJSON) ([]work.LoseAsk, error) {
	if len(in) > maxMarks {
		return nil, wrong(fmt.Sprintf("there are %d marks; want at most %d", len(in), maxMarks))
	}
	var out []work.LoseAsk
	for i, m := range in {
		place := func(what string) error { return wrong(fmt.Sprintf("mark %d: %s", i+1, what)) }
		switch {
		case (m.Site == "") == (m.Telescope == ""):
			return nil, place("want one of site and telescope")
		case !slices.Contains(ledger.Causes(), m.Cause):
			return nil, place(fmt.Sprintf("the cause is %q; want one of %v", m.Cause, ledger.Causes()))
		case len(m.Why) > 500:
			return nil, place("why is longer than 500 characters")
		}
		if m.Site != "" {
			if _, err := v.SiteID(m.Site); err != nil {
				return nil, err
			}
		} else if _, err := v.TelescopeID(m.Telescope); err != nil {
			return nil, err
		}
		out = append(out, work.LoseAsk{Site: m.Site, Telescope: m.Telescope, From: m.From, To: m.To, Cause: m.Cause, Why: m.Why})
	}
	return out, nil
}

// attempt plans again and keeps the result to be looked at.
func (s *Server) attempt(ctx context.Context, v *view, losses []work.LoseAsk, shown []markJSON, redo work.RedoAsk, tell func(model.Progress)) error {
	o := work.Options{Workers: s.cfg.Workers, Version: s.cfg.Version, Progress: tell}
	if err := v.openWindows(ctx, o); err != nil {
		return err
	}
	t, err := work.TryLosses(ctx, s.cfg.Survey, work.TrialAsk{Plan: v.planDir, Losses: losses, Redo: redo, Like: v.Survey}, o)
	if err != nil {
		return err
	}
	nv, err := newView(v.Survey, t.After, v.planDir)
	if err != nil {
		t.Drop()
		return err
	}
	a := &attempt{trial: t, view: nv, json: trialJSON{Losses: shown, Now: t.Now, Before: planOf(v), After: planOf(nv), Counts: map[string]int{}, Changes: []changeJSON{}, Checksum: t.After.Summary.Checksum}}
	for _, c := range t.Changes() {
		a.json.Counts[c.What]++
		if c.What == "kept" || c.What == "done" || len(a.json.Changes) >= changesShown {
			continue
		}
		a.json.Changes = append(a.json.Changes, changeJSON{c.Visit, c.Field, c.What, c.FromTelescope, float64(c.FromStart) / 1e6, c.ToTelescope, float64(c.ToStart) / 1e6})
	}
	s.tryMu.Lock()
	defer s.tryMu.Unlock()
	s.drop()
	s.try = a
	return nil
}

// drop throws the waiting plan away; tryMu is held.
func (s *Server) drop() {
	if s.try != nil {
		s.try.trial.Drop()
		s.try = nil
	}
}

func (s *Server) trialNow() *trialJSON {
	s.tryMu.Lock()
	defer s.tryMu.Unlock()
	if s.try == nil {
		return nil
	}
	return &s.try.json
}

func getTrial(s *Server, w http.ResponseWriter, r *http.Request) error {
	t := s.trialNow()
	if t == nil {
		return noTrial
	}
	return sendJSON(w, r, t)
}

// deleteTrial throws the waiting plan away.
func deleteTrial(s *Server, w http.ResponseWriter, r *http.Request) error {
	s.tryMu.Lock()
	defer s.tryMu.Unlock()
	if s.try == nil {
		return noTrial
	}
	s.drop()
	return sendJSON(w, r, map[string]bool{"dropped": true})
}

type acceptJSON struct {
	Checksum string `json:"checksum"` // of the plan that was looked at
}

// postAccept records the losses and puts the new plan in the old one's place.
func postAccept(s *Server, w http.ResponseWriter, r *http.Request) error {
	var ask acceptJSON
	if err := readJSON(r, &ask); err != nil {
		return err
	}
	s.tryMu.Lock()
	defer s.tryMu.Unlock()
	switch {
	case s.try == nil:
		return noTrial
	case ask.Checksum != s.try.json.Checksum:
		return &statusError{http.StatusConflict, "another plan waits by now; look at it first"}
	}
	err := s.try.trial.Accept(context.WithoutCancel(r.Context()), s.cfg.Survey, work.Options{Workers: s.cfg.Workers, Version: s.cfg.Version})
	var moved *work.ErrMoved
	if errors.As(err, &moved) {
		return &statusError{http.StatusConflict, moved.Error()}
	}
	if err != nil {
		return err
	}
	s.drop()
	v, err := s.books.view(r.Context())
	if err != nil {
		return err
	}
	return sendJSON(w, r, planOf(v))
}
