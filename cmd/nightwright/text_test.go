package main

import (
	"bufio"
	"bytes"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/vbauerster/mpb/v8"

	"nightwright/scheduler/model"
)

func TestNumbersForReading(t *testing.T) {
	tests := []struct{ got, want string }{
		{thousands(0), "0"}, {thousands(999), "999"}, {thousands(1000), "1,000"}, {thousands(-1234567), "-1,234,567"}, {thousands(-12), "-12"},
		{hours(0), "0.0"}, {hours(1234.56), "1,234.6"}, {hours(-0.3), "-0.3"}, {hours(-1234.5), "-1,234.5"}, {hours(0.04), "0.0"},
		{percent(1, 3), "33.3 %"}, {percent(1, 0), "-"},
		{count(1, "fault"), "1 fault"}, {count(0, "fault"), "0 faults"}, {count(1200, "row"), "1,200 rows"},
		{clip("Cinder Ridge", 6), "Cinde…"}, {clip("Ørsted", 6), "Ørsted"},
		{enumerate([]string{"a"}), "a"}, {enumerate([]string{"a", "b", "c"}), "a, b and c"},
		{ratio(1, 4), "0.25"}, {ratio(1, 0), "never"}, {ratio(0, 0), "-"},
		{readable("sunset_utc", "2027-03-09T01:03:20.62Z"), "2027-03-09 01:03:21"},
		{readable("altitude_deg", "12.3456789"), "12.3457"}, {readable("site", "Mesa 1.5"), "Mesa 1.5"}, {readable("moonset_utc", ""), "-"},
	}
	for i, tt := range tests {
		if tt.got != tt.want {
			t.Errorf("%d: %q; want %q", i, tt.got, tt.want)
		}
	}
}

func TestQuotedWordsSurviveAShell(t *testing.T) {
	tests := []struct{ give, want string }{
		{"my/survey-2.yaml", "my/survey-2.yaml"}, {"Cinder Ridge", "'Cinder Ridge'"}, {"", "''"}, {"it's", `'it'\''s'`}, {"$HOME", "'$HOME'"},
	}
	for _, tt := range tests {
		if got := quote(tt.give); got != tt.want {
			t.Errorf("quote(%q) is %s; want %s", tt.give, got, tt.want)
		}
	}
}

func TestTableAlignsItsColumns(t *testing.T) {
	var out bytes.Buffer
	p := &printer{w: bufio.NewWriter(&out)}
	l := newList("<site", "hours")
	l.add("Salt Mesa", "1.0")
	l.add("Thorn", "1,234.5")
	p.table(l)
	if err := p.flush(); err != nil {
		t.Fatal(err)
	}
	want := "  site         hours\n  Salt Mesa      1.0\n  Thorn      1,234.5\n"
	if d := cmp.Diff(want, out.String()); d != "" {
		t.Errorf("table (-want +got):\n%s", d)
	}
}

// TestPlainProgress: without a terminal a phase tells its start, and then a
// line every ten seconds.
func TestPlainProgress(t *testing.T) {
	var out bytes.Buffer
	clock := time.Date(2027, 3, 1, 0, 0, 0, 0, time.UTC)
	r := &reporter{out: &out, now: func() time.Time { return clock }}
	for done := range 101 {
		r.report(model.Progress{Phase: "sweep 1 of 2", Done: done, Total: 100, Coverage: 0.5, Ceiling: 0.625})
		clock = clock.Add(300 * time.Millisecond)
	}
	r.report(model.Progress{Phase: "ceiling", Done: 1, Total: 1, Ceiling: 0.625})
	r.end()
	want := `sweep 1 of 2 ...
sweep 1 of 2 34 %  coverage 0.5000 of at most 0.6250
sweep 1 of 2 68 %  coverage 0.5000 of at most 0.6250
ceiling ...
`
	if d := cmp.Diff(want, out.String()); d != "" {
		t.Errorf("progress (-want +got):\n%s", d)
	}
	var silent reporter
	silent.report(model.Progress{Phase: "sweep"}) // no stream: nothing to write, nothing to fail
}

func TestColoursNeedATerminal(t *testing.T) {
	var out bytes.Buffer
	a := &app{stdout: &out}
	p := a.printer()
	p.line("%s", p.red("no"))
	if err := p.flush(); err != nil {
		t.Fatal(err)
	}
	if strings.Contains(out.String(), "\x1b") {
		t.Errorf("colour into something that is no terminal: %q", out.String())
	}
	p.colour = true
	if got := p.bold("x"); got != "\x1b[1mx\x1b[0m" {
		t.Errorf("bold is %q", got)
	}
}

// TestBarsAreDrawnWhileWorkGoesOn: reports and drawing don't wait for each
// other, and end returns with every phase on the screen.
func TestBarsAreDrawnWhileWorkGoesOn(t *testing.T) {
	var out bytes.Buffer
	r := &reporter{out: &out, bars: mpb.New(mpb.WithOutput(&out), mpb.WithAutoRefresh(), mpb.WithWidth(pageWidth), mpb.WithRefreshRate(time.Millisecond))}
	for _, phase := range []string{"prices 1 of 2", "sweep 1 of 2"} {
		r.report(model.Progress{Phase: phase})
		for done := range 200 {
			r.report(model.Progress{Phase: phase, Done: done, Total: 400, Coverage: 0.5, Ceiling: 0.625})
			time.Sleep(50 * time.Microsecond)
		}
	}
	r.end()
	r.end() // twice does no harm
	for _, want := range []string{"prices 1 of 2", "sweep 1 of 2", "coverage 0.5000 of at most 0.6250"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("the bars never showed %q", want)
		}
	}
}
