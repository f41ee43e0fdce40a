package page

import (
	"context"
	"encoding/json"
	"fmt"
	"net/http"
	"strconv"
	"sync"
	"time"

	"nightwright/scheduler/model"
)

// job is long work: at most one goes on at a time.
type job struct {
	ID   int
	What string

	cancel context.CancelFunc
	done   chan struct{}

	mu      sync.Mutex
	state   jobState
	changed chan struct{} // closed at the next change
}

// jobState is how far a job is.
type jobState struct {
	ID       int     `json:"job"`
	What     string  `json:"what"`
	State    string  `json:"state"` // working, done, cancelled, failed
	Phase    string  `json:"phase"`
	Done     int     `json:"done"`
	Total    int     `json:"total"`
	Coverage float64 `json:"coverage"`
	Ceiling  float64 `json:"ceiling"`
	Error    string  `json:"error,omitempty"`
	Seconds  float64 `json:"seconds"`
}

func (j *job) set(change func(s *jobState)) {
	j.mu.Lock()
	defer j.mu.Unlock()
	change(&j.state)
	close(j.changed)
	j.changed = make(chan struct{})
}

func (j *job) now() (jobState, <-chan struct{}) {
	j.mu.Lock()
	defer j.mu.Unlock()
	return j.state, j.changed
}

type jobs struct {
	mu   sync.Mutex
	last *job
	next int
	shut bool
	now  func() time.Time
}

// start begins a job, unless one goes on.
func (b *jobs) start(what string, do func(ctx context.Context, tell func(model.Progress)) error) (*job, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.shut {
		return nil, &statusError{http.StatusServiceUnavailable, "the server is closing"}
	}
	if b.last != nil {
		select {
		case <-b.last.done:
		default:
			return nil, &statusError{http.StatusConflict, "work goes on already; wait for it or cancel it"}
		}
	}
	b.next++
	ctx, cancel := context.WithCancel(context.Background())
	j := &job{ID: b.next, What: what, cancel: cancel, done: make(chan struct{}), changed: make(chan struct{})}
	j.state = jobState{ID: j.ID, What: what, State: "working"}
	b.last = j
	began := b.now()
	go func() {
		defer close(j.done)
		defer cancel()
		err := do(ctx, func(p model.Progress) {
			j.set(func(s *jobState) {
				s.Phase, s.Done, s.Total, s.Coverage, s.Ceiling = p.Phase, p.Done, p.Total, p.Coverage, p.Ceiling
			})
		})
		j.set(func(s *jobState) {
			s.Seconds = b.now().Sub(began).Seconds()
			switch {
			case ctx.Err() != nil:
				s.State = "cancelled"
			case err != nil:
				s.State, s.Error = "failed", err.Error()
			default:
				s.State = "done"
			}
		})
	}()
	return j, nil
}

func (b *jobs) find(id string) (*job, error) {
	n, err := strconv.Atoi(id)
	b.mu.Lock()
	defer b.mu.Unlock()
	if err != nil || b.last == nil || b.last.ID != n {
		return nil, &statusError{http.StatusNotFound, "there is no such job; only the last one is known"}
	}
	return b.last, nil
}

// close cancels what goes on and waits for it.
func (b *jobs) close() {
	b.mu.Lock()
	b.shut = true
	j := b.last
	b.mu.Unlock()
	if j != nil {
		j.cancel()
		<-j.done
	}
}

func jobOf(s *Server, w http.ResponseWriter, r *http.Request) error {
	j, err := s.jobs.find(r.PathValue("id"))
	if err != nil {
		return err
	}
	state, _ := j.now()
	return sendJSON(w, r, state)
}

func cancelJob(s *Server, w http.ResponseWriter, r *http.Request) error {
	j, err := s.jobs.find(r.PathValue("id"))
	if err != nil {
		return err
	}
	j.cancel()
	select {
	case <-j.done:
	case <-r.Context().Done():
		return nil
	}
	state, _ := j.now()
	return sendJSON(w, r, state)
}

// jobEvents streams a job's progress (server-sent events of the HTML
// standard) until it ends.
func jobEvents(s *Server, w http.ResponseWriter, r *http.Request) error {
	j, err := s.jobs.find(r.PathValue("id"))
	if err != nil {
		return err
	}
	out := http.NewResponseController(w)
	w.Header().Set("Content-Type", "text/event-stream")
	for {
		state, changed := j.now()
		text, err := json.Marshal(state)
		if err != nil {
			return err
		}
		_ = out.SetWriteDeadline(s.cfg.Now().Add(10 * time.Second)) // a reader that stalls is let go
		name := "progress"
		if state.State != "working" {
			name = "end"
		}
		if _, err := fmt.Fprintf(w, "event: %s\ndata: %s\n\n", name, text); err != nil {
			return nil
		}
		if err := out.Flush(); err != nil || name == "end" {
			return nil
		}
		pause := time.NewTimer(80 * time.Millisecond) // a dozen a second is all an eye wants
		select {
		case <-r.Context().Done():
			pause.Stop()
			return nil
		case <-pause.C:
		}
		select {
		case <-r.Context().Done():
			return nil
		case <-changed:
		case <-time.After(10 * time.Second):
		}
	}
}
