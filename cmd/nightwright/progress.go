package main

import (
	"fmt"
	"io"
	"os"
	"sync"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"

	"nightwright/scheduler/model"
)

// reporter shows how far a job is: bars on a terminal, a few plain lines
// elsewhere, nothing with --quiet. It may be called from several goroutines.
type reporter struct {
	mu    sync.Mutex
	out   io.Writer // nil: silent
	bars  *mpb.Progress
	bar   *mpb.Bar
	phase string
	shown int // quarters of the phase told so far
	last  model.Progress
}

func (a *app) startProgress() {
	if a.quiet {
		return
	}
	a.progress.out = a.stderr
	if isTerminal(a.stderr) {
		a.progress.bars = mpb.New(mpb.WithOutput(a.stderr), mpb.WithWidth(40))
	}
}

// endProgress leaves the terminal as messages expect it. It may be called
// more than once.
func (a *app) endProgress() { a.progress.end() }

func (r *reporter) end() {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.bars == nil {
		return
	}
	if r.bar != nil {
		r.bar.SetTotal(-1, true)
	}
	r.bars.Wait()
	r.bars, r.bar, r.out = nil, nil, nil
}

// report takes one progress report of a job.
func (r *reporter) report(p model.Progress) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.out == nil {
		return
	}
	fresh := p.Phase != r.phase
	r.phase, r.last = p.Phase, p
	if r.bars != nil {
		r.draw(p, fresh)
		return
	}
	if fresh {
		r.shown = 0
		fmt.Fprintf(r.out, "%s ...\n", p.Phase)
	}
	if p.Total <= 0 {
		return
	}
	if quarter := 4 * p.Done / p.Total; quarter > r.shown && quarter < 4 {
		r.shown = quarter
		fmt.Fprintf(r.out, "%s %d %%%s\n", p.Phase, 25*quarter, standing(p))
	}
}

func (r *reporter) draw(p model.Progress, fresh bool) {
	if fresh {
		if r.bar != nil {
			r.bar.SetTotal(-1, true)
		}
		r.bar = r.bars.AddBar(int64(p.Total),
			mpb.PrependDecorators(decor.Name(fmt.Sprintf("%-22s", p.Phase))),
			mpb.AppendDecorators(decor.Percentage(decor.WC{W: 5}), decor.Any(func(decor.Statistics) string {
				r.mu.Lock()
				defer r.mu.Unlock()
				return standing(r.last)
			})))
	}
	r.bar.SetTotal(int64(p.Total), false)
	r.bar.SetCurrent(int64(p.Done))
}

// standing writes what the search has so far.
func standing(p model.Progress) string {
	switch {
	case p.Coverage > 0 && p.Ceiling > 0:
		return fmt.Sprintf("  coverage %.4f of at most %.4f", p.Coverage, p.Ceiling)
	case p.Ceiling > 0:
		return fmt.Sprintf("  ceiling %.4f", p.Ceiling)
	}
	return ""
}

// isTerminal is true for a character device other than the null device.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	if !ok {
		return false
	}
	st, err := f.Stat()
	if err != nil || st.Mode()&os.ModeCharDevice == 0 {
		return false
	}
	null, err := os.Stat(os.DevNull)
	return err != nil || !os.SameFile(st, null)
}
