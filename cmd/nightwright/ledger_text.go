package main

import (
	"fmt"
	"strings"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/ledger"
)

// ledger tells whether the survey is on track: the verdict first.
func (p *printer) ledger(s *work.Survey, r *work.FollowResult) {
	if r.Entries == 0 {
		p.line("%s: the ledger is empty; nothing was done or lost yet", p.bold(s.Name))
		p.line("")
		p.line("  nightwright record %s FILE", quote(s.Path))
		return
	}
	p.line("%s: %s", p.bold(s.Name), p.verdict(r))
	p.line("")
	p.line("  done     %s of %s visits wanted%s", thousands(r.All.Done), thousands(r.Wanted), beforePeriod(r.Before))
	if r.Compared {
		p.line("  planned  %s by then; coverage, bonus apart: %s done, %s planned",
			thousands(r.All.Planned), fixed(r.All.DoneCredit, 4), fixed(r.All.PlannedCredit, 4))
	}
	if r.Until != 0 {
		p.line("  until    %s UTC; %s in the ledger", clock(r.Until), entries(r.Entries))
	}
	p.uncounted(r)
	p.trackPrograms(r)
	p.trackPlaces(r)
	p.trackLost(r)
	p.trackNights(r)
	p.trackPlans(r)
}

func entries(n int64) string {
	if n == 1 {
		return "1 entry"
	}
	return thousands(int(n)) + " entries"
}

func beforePeriod(n int) string {
	if n == 0 {
		return ""
	}
	return fmt.Sprintf(", %s from before the period", thousands(n))
}

// verdict is the answer in one line.
func (p *printer) verdict(r *work.FollowResult) string {
	behind := r.All.Behind()
	switch {
	case !r.Compared:
		return count(r.All.Done, "visit") + " done; there is no plan to compare with"
	case behind > 0:
		return p.red(fmt.Sprintf("behind the plan by %s (%s)", count(behind, "visit"), percent(float64(behind), float64(r.All.Planned))))
	case behind < 0:
		return p.green("ahead of the plan by " + count(-behind, "visit"))
	}
	return p.green("on track")
}

// uncounted tells what is on record and counts for nothing.
func (p *printer) uncounted(r *work.FollowResult) {
	var parts []string
	add := func(n int, noun, rest string) {
		if n > 0 {
			parts = append(parts, count(n, noun)+rest)
		}
	}
	add(r.Below, "visit", " below min_quality")
	add(r.Broken, "set", " not whole")
	add(r.Surplus, "visit", " more than wanted")
	add(r.Strange, "exposure", " unmatched")
	if len(parts) > 0 {
		p.line("  counted for nothing: %s", strings.Join(parts, ", "))
	}
}

// behindCell is how many visits are missing, "-" without a plan.
func behindCell(r *work.FollowResult, t ledger.Tally) (planned, behind string) {
	if !r.Compared {
		return "-", "-"
	}
	return thousands(t.Planned), thousands(t.Behind())
}

func (p *printer) trackPrograms(r *work.FollowResult) {
	p.head("Programs")
	l := newList("<program", "wanted", "planned", "done", "behind", "coverage", "planned")
	for _, g := range r.Programs {
		planned, behind := behindCell(r, g.Tally)
		l.add(clip(g.Program, 20), thousands(g.Wanted), planned, thousands(g.Done), behind, fixed(g.DoneCredit, 4), fixed(g.PlannedCredit, 4))
	}
	p.table(l)
}

func (p *printer) trackPlaces(r *work.FollowResult) {
	p.head("Telescopes (hours of open time)")
	l := newList("<site", "<telescope", "planned", "done", "behind", "open h", "lost h", "")
	for _, t := range r.Places {
		lost := 0.0
		for _, c := range t.Lost {
			lost += c.Hours
		}
		planned, behind := behindCell(r, t.Tally)
		l.add(clip(t.Site, 20), clip(t.Telescope, 12), planned, thousands(t.Done), behind, hours(t.OpenHours), hours(lost), percent(lost, t.OpenHours))
	}
	p.table(l)
}

// trackLost lists what each cause took of each site.
func (p *printer) trackLost(r *work.FollowResult) {
	l := newList("<site", "<cause", "lost h", "planned visits in it")
	var sites []string
	sum := map[string][]ledger.LostCause{}
	for _, t := range r.Places {
		if sum[t.Site] == nil {
			sites = append(sites, t.Site)
			sum[t.Site] = make([]ledger.LostCause, len(t.Lost))
		}
		for i, c := range t.Lost {
			x := &sum[t.Site][i]
			x.Cause, x.Hours, x.Visits = c.Cause, x.Hours+c.Hours, x.Visits+c.Visits
		}
	}
	for _, s := range sites {
		for _, c := range sum[s] {
			if c.Hours > 0 || c.Visits > 0 {
				visits := "-"
				if r.Compared {
					visits = thousands(c.Visits)
				}
				l.add(clip(s, 20), c.Cause, hours(c.Hours), visits)
			}
		}
	}
	if len(l.rows) == 0 {
		p.head("No open time was lost")
		return
	}
	p.head("Lost time")
	p.table(l)
}

// shownNights is how many of the last nights are listed.
const shownNights = 10

// trackNights lists the last nights with a bar for what was done of the plan.
func (p *printer) trackNights(r *work.FollowResult) {
	rows := r.Nights
	if len(rows) == 0 {
		return
	}
	title := "Nights (# done, . planned)"
	if len(rows) > shownNights {
		title = fmt.Sprintf("Nights, the last %d (# done, . planned)", shownNights)
	}
	p.head("%s", title)
	rows = rows[max(0, len(rows)-shownNights):]
	most := 1
	for _, n := range rows {
		most = max(most, n.Planned, n.Done)
	}
	l := newList("<night", "planned", "done", "lost", "<")
	for _, n := range rows {
		const width = 24
		done, planned := n.Done*width/most, n.Planned*width/most
		bar := strings.Repeat("#", done) + strings.Repeat(".", max(0, planned-done))
		was := "-"
		if r.Compared {
			was = thousands(n.Planned)
		}
		l.add(n.Label, was, thousands(n.Done), percent(n.LostHours, n.OpenHours), bar)
	}
	p.table(l)
}

func (p *printer) trackPlans(r *work.FollowResult) {
	if len(r.Plans) == 0 {
		return
	}
	p.head("Plans made")
	l := newList("entry", "<folder", "coverage", "ceiling", "knew entries")
	for _, x := range r.Plans[max(0, len(r.Plans)-shownNights):] {
		l.add(thousands(int(x.Entry)), clip(x.Path, 30), fixed(x.Coverage, 4), fixed(x.Ceiling, 4), thousands(int(x.Knew)))
	}
	p.table(l)
}
