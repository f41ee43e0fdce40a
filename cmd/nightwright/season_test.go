package main

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
)

// played is a season that is played through the commands alone.
type played struct {
	t          *testing.T
	dir, plan  string
	telescopes []string
	log        bytes.Buffer
}

// run runs a command and keeps what it said for the log: lines of the summary
// that keep names, or the first ones.
func (p *played) run(keep []string, args ...string) string {
	p.t.Helper()
	out, _ := session(p.t, exitDone, append(args, "--quiet")...)
	shown := make([]string, len(args))
	for i, a := range args {
		shown[i] = quote(strings.ReplaceAll(a, p.dir, "s"))
	}
	fmt.Fprintf(&p.log, "$ nightwright %s\n", strings.Join(shown, " "))
	for _, line := range strings.Split(strings.ReplaceAll(out, p.dir, "s"), "\n") {
		if slices.ContainsFunc(keep, func(k string) bool { return strings.HasPrefix(strings.TrimSpace(line), k) }) {
			fmt.Fprintf(&p.log, "%s\n", line)
		}
	}
	return out
}

// night records a night as the telescopes' sheets have it: done over planned, but
// for those from an instant on that took(telescope) says broke.
func (p *played) night(night string, lost []string, broke map[string]time.Time) {
	p.t.Helper()
	var all [][]string
	for _, tel := range p.telescopes {
		if slices.Contains(lost, tel) {
			continue
		}
		out := p.run(nil, "sheet", p.dir, p.plan, "--telescope", tel, "--night", night, "--csv")
		rows, err := csv.NewReader(strings.NewReader(out)).ReadAll()
		if err != nil {
			p.t.Fatal(err)
		}
		start := slices.Index(rows[0], "start_utc")
		if all == nil {
			all = append(all, rows[0])
		}
		for _, r := range rows[1:] {
			if r[0] == "reserve" { // no times: it wasn't planned
				all = append(all, r)
				continue
			}
			at, err := time.Parse(time.RFC3339Nano, r[start])
			if err != nil {
				p.t.Fatal(err)
			}
			if until, ok := broke[tel]; ok && at.After(until) {
				continue
			}
			if r[0] == "planned" || r[0] == "held" {
				r[0] = "done"
			}
			all = append(all, r)
		}
	}
	var b bytes.Buffer
	if err := csv.NewWriter(&b).WriteAll(all); err != nil {
		p.t.Fatal(err)
	}
	file := filepath.Join(p.dir, "night-"+night+".csv")
	if err := os.WriteFile(file, b.Bytes(), 0o644); err != nil {
		p.t.Fatal(err)
	}
	p.run([]string{"s/night", ""}, "record", p.dir, file)
}

// TestASeasonIsPlayed plans the demo and plays ten of its nights: recorded from
// sheets, two cloudy ones and a fault among them, planned again each day, audited
// each time, explained for three fields. NIGHTWRIGHT_LONG=1 plays the whole demo
// (30 nights, 300 fields) and prints the log that stands in the contributor's
// guide; else a part of it is played.
func TestASeasonIsPlayed(t *testing.T) {
	long := os.Getenv("NIGHTWRIGHT_LONG") != ""
	dir := filepath.Join(t.TempDir(), "s")
	session(t, exitDone, "new", dir, "--like", "demo", "--quiet")
	if !long {
		spoil(t, filepath.Join(dir, "survey.yaml"), "last_night: 2027-03-30", "last_night: 2027-03-20")
		thin(t, filepath.Join(dir, "fields.csv"), 5)
	}
	p := &played{t: t, dir: dir, plan: filepath.Join(dir, "plan"), telescopes: []string{"C1", "S1", "T1"}}
	head := []string{"coverage", "visits", "lost", "won back", "moved", "passed"}
	p.run(head, "plan", dir, "--effort", "quick")
	first := time.Date(2027, 3, 1, 0, 0, 0, 0, time.UTC)
	sites := map[string]string{"Salt Mesa": "S1", "Thorn Gate": "T1"}
	cloudy := map[int]string{2: "Salt Mesa", 5: "Thorn Gate"}
	const fault = 7
	for k := range 10 {
		night := first.AddDate(0, 0, k).Format(time.DateOnly)
		var lost []string
		if site := cloudy[k]; site != "" {
			lost = append(lost, sites[site])
		}
		broke := map[string]time.Time{}
		if k == fault {
			broke["C1"] = first.AddDate(0, 0, k+1).Add(6 * time.Hour)
		}
		p.night(night, lost, broke)
		if site := cloudy[k]; site != "" {
			p.run([]string{site}, "lose", dir, "--site", site, "--from", night, "--to", night, "--cause", "weather")
		}
		if k == fault {
			p.run([]string{"C1"}, "lose", dir, "--telescope", "C1", "--from", broke["C1"].Format(time.RFC3339), "--to", night, "--cause", "technical", "--why", "the dome stuck")
		}
		now := first.AddDate(0, 0, k+1).Add(14*time.Hour + 30*time.Minute).Format(time.RFC3339)
		next := filepath.Join(dir, fmt.Sprintf("plan%d", k+1))
		p.run(head, "replan", dir, p.plan, "--now", now, "--out", next)
		p.plan = next
		p.run(head, "audit", dir, p.plan)
		p.check(k, cloudy[k] != "" || k == fault)
	}
	p.run([]string{"Copper", "done", "planned"}, "ledger", dir, "--plan", p.plan)
	for _, field := range p.fields() {
		p.run([]string{field, "2027-03-", "What", "a ", "without", "nothing", "W0", "M0"}, "explain", dir, p.plan, field)
	}
	if long {
		t.Log("\n" + p.log.String())
	}
}

// check holds what a re-plan said against what happened.
func (p *played) check(k int, lost bool) {
	p.t.Helper()
	text, err := os.ReadFile(filepath.Join(p.plan, "plan.json"))
	if err != nil {
		p.t.Fatal(err)
	}
	var m struct {
		Coverage float64 `json:"coverage"`
		Ceiling  float64 `json:"ceiling"`
		Replan   struct {
			CeilingHeld float64 `json:"ceiling_held"`
			Done        int     `json:"visits_done"`
			Lost        int     `json:"visits_lost"`
			Moved       int     `json:"visits_moved"`
			Dropped     int     `json:"visits_dropped"`
			Won         float64 `json:"credit_won"`
		} `json:"replan"`
	}
	if err := json.Unmarshal(text, &m); err != nil {
		p.t.Fatal(err)
	}
	r := &m.Replan
	switch {
	case m.Coverage > r.CeilingHeld || r.CeilingHeld > m.Ceiling:
		p.t.Errorf("day %d: coverage %.6f, ceiling with the hold %.6f, ceiling %.6f", k+1, m.Coverage, r.CeilingHeld, m.Ceiling)
	case (r.Lost > 0) != lost:
		p.t.Errorf("day %d: %d visits lost; want some: %v", k+1, r.Lost, lost)
	case r.Moved+r.Dropped > r.Lost:
		p.t.Errorf("day %d: %d visits moved or dropped for %d lost", k+1, r.Moved+r.Dropped, r.Lost)
	case r.Done == 0 || r.Won < 0 || lost && r.Won == 0:
		p.t.Errorf("day %d: %+v", k+1, *r)
	}
}

// fields picks three fields: one that lacks visits by competition and one that is
// finished, where there are such, and others.
func (p *played) fields() []string {
	out := p.run(nil, "export", p.plan, "--as", "csv", "--table", "fields")
	rows, err := csv.NewReader(strings.NewReader(out)).ReadAll()
	if err != nil {
		p.t.Fatal(err)
	}
	by := slices.Index(rows[0], "limited_by")
	var picked []string
	for _, want := range []func(s string) bool{
		func(s string) bool { return s == "competition" },
		func(s string) bool { return s == "nothing" },
		func(string) bool { return true },
		func(string) bool { return true },
	} {
		for _, r := range rows[1:] {
			if len(picked) < 3 && want(r[by]) && !slices.Contains(picked, r[0]) {
				picked = append(picked, r[0])
				break
			}
		}
	}
	if len(picked) < 3 {
		p.t.Errorf("only %v to explain", picked)
	}
	return picked
}

// thin keeps the head line and each n-th field of a list.
func thin(t *testing.T, file string, n int) {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	var out []string
	for i, line := range strings.Split(strings.TrimSpace(string(text)), "\n") {
		if i == 0 || i%n == 0 {
			out = append(out, line)
		}
	}
	if err := os.WriteFile(file, []byte(strings.Join(out, "\n")+"\n"), 0o644); err != nil {
		t.Fatal(err)
	}
}
