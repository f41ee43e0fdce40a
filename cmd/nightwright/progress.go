package main

import (
	"fmt"
	"io"
	"os"
	"sync"
	"sync/atomic"
	"time"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"

	"nightwright/scheduler/model"
)

// reporter shows how far a job is: bars on a terminal, a line a
// phase and now and then elsewhere, nothing with --quiet. It may be called from several goroutines.
type reporter struct {
	mu    sync.Mutex
	out   io.Writer // nil: silent
	bars  *mpb.Progress
	bar   *mpb.Bar
	total int64 // of the bar
	phase string
	told  time.Time        // when the last plain line was written
	now   func() time.Time // the clock
	// last is read by the bars while they are drawn: a lock that report holds
	// while it waits for them would never open.
	last atomic.Pointer[model.Progress]
}

// plainEvery is the least time between two lines of one phase.
const plainEvery = 10 * time.Second

// barWidth leaves room for a phase's name and what was reached, on a terminal
// of 80 columns.
const barWidth = 18

func (a *app) startProgress() {
	if a.quiet {
		return
	}
	a.progress.out, a.progress.now = a.stderr, time.Now
	if isTerminal(a.stderr) && os.Getenv("TERM") != "dumb" {
		a.progress.bars = mpb.New(mpb.WithOutput(a.stderr))
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
	r.fill()
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
	r.phase = p.Phase
	r.last.Store(&p)
	if r.bars != nil {
		r.draw(p, fresh)
		return
	}
	switch {
	case fresh:
		fmt.Fprintf(r.out, "%s ...\n", p.Phase)
		r.told = r.now()
	case p.Total > 0 && p.Done < p.Total && r.now().Sub(r.told) >= plainEvery:
		fmt.Fprintf(r.out, "%s %d %%%s\n", p.Phase, 100*p.Done/p.Total, standing(p))
		r.told = r.now()
	}
}

func (r *reporter) draw(p model.Progress, fresh bool) {
	if fresh {
		r.fill()
		r.bar = r.bars.AddBar(int64(p.Total), mpb.BarWidth(barWidth),
			mpb.PrependDecorators(decor.Name(fmt.Sprintf("%-18s", p.Phase))),
			mpb.AppendDecorators(decor.Percentage(decor.WC{W: 5}), decor.Any(func(decor.Statistics) string {
				return standing(*r.last.Load())
			})))
	}
	r.total = int64(p.Total)
	r.bar.SetTotal(r.total, false)
	r.bar.SetCurrent(int64(p.Done))
}

// fill completes the bar of a phase that is over.
func (r *reporter) fill() {
	if r.bar != nil {
		r.bar.SetTotal(max(1, r.total), true)
	}
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
