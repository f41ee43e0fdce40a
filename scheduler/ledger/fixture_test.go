package ledger

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/surveyfile"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// The survey of these tests is the small one of the commands: C1 at Cinder
// Ridge, S1 at Salt Mesa; fields A1-A5 of wide (3 visits of 300 s in r), B1-B3 of
// pairs (one set of g and r, 120 s each); four nights from 2027-03-08.
func small(t testing.TB) (*survey.Survey, *visibility.Exact) {
	t.Helper()
	sv, _, issues := surveyfile.Load(filepath.Join("..", "..", "cmd", "nightwright", "testdata", "small"))
	if sv == nil {
		t.Fatal(issues)
	}
	return sv, visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation))
}

// bench is a ledger in a folder of its own, with the small survey.
type bench struct {
	testing.TB
	sv    *survey.Survey
	exact *visibility.Exact
	path  string
}

func newBench(t testing.TB) *bench {
	sv, exact := small(t)
	return &bench{t, sv, exact, filepath.Join(t.TempDir(), FileName)}
}

func (b *bench) read(text string) *Batch {
	b.Helper()
	batch, faults := Read(strings.NewReader(text), "night.csv", "")
	if faults != nil {
		b.Fatal(faults)
	}
	return batch
}

// record records a text, and returns the faults as text.
func (b *bench) record(text string, keep bool) (*Result, []string) {
	b.Helper()
	return b.recordOn(text, Terms{KeepUnmatched: keep})
}

func (b *bench) recordOn(text string, how Terms) (*Result, []string) {
	b.Helper()
	batch, faults := Read(strings.NewReader(text), "night.csv", "")
	var res *Result
	if batch != nil {
		l := b.open()
		defer l.Close()
		var err error
		if res, faults, err = l.Record(b.Context(), b.sv, b.exact, batch, Entry{Made: time.Unix(1.8e9, 0), Source: "night.csv", Program: "1.0"}, how); err != nil {
			b.Fatal(err)
		}
	}
	var told []string
	for _, f := range faults {
		told = append(told, f.String())
	}
	return res, told
}

// must records a text that has no faults.
func (b *bench) must(text string) *Result {
	b.Helper()
	res, faults := b.record(text, false)
	if faults != nil {
		b.Fatal(faults)
	}
	return res
}

func (b *bench) open() *Ledger {
	b.Helper()
	l, err := OpenWriter(b.path)
	if err != nil {
		b.Fatal(err)
	}
	return l
}

// done returns what holds now, by one word each: telescope, time, field,
// quality.
func (b *bench) done() []Exposure {
	b.Helper()
	l, err := Open(b.path)
	if err != nil {
		b.Fatal(err)
	}
	defer l.Close()
	list, err := l.Done(b.Context())
	if err != nil {
		b.Fatal(err)
	}
	return list
}

// sound has both this program and the sqlite3 command look at the file.
func (b *bench) sound() {
	b.Helper()
	l, err := Open(b.path)
	if err != nil {
		b.Fatal(err)
	}
	defer l.Close()
	if err := l.Check(context.Background()); err != nil {
		b.Error(err)
	}
	outside(b, b.path)
}

// outside asks the sqlite3 command, another build of another version of
// SQLite, whether a file is sound.
func outside(t testing.TB, path string) {
	t.Helper()
	program, err := exec.LookPath("sqlite3")
	if err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal(err)
		}
		t.Log("the sqlite3 command is not installed; the file is checked from inside alone")
		return
	}
	out, err := exec.Command(program, path, "PRAGMA integrity_check; PRAGMA foreign_key_check;").CombinedOutput()
	if err != nil || strings.TrimSpace(string(out)) != "ok" {
		t.Errorf("sqlite3 %s: %v, %s", path, err, out)
	}
}

const head = "field,telescope,filter,start_utc,end_utc,quality\n"

// manyRows are n exposures of 300 s, 400 s apart, of A1 to A5 at C1, from an
// instant on.
func manyRows(n int, from time.Time) string {
	var b strings.Builder
	b.WriteString(head)
	for i := range n {
		t := from.Add(time.Duration(i) * 400 * time.Second).UTC()
		fmt.Fprintf(&b, "A%d,C1,r,%s,%s,0.5\n", i%5+1, t.Format(time.RFC3339), t.Add(300*time.Second).Format(time.RFC3339))
	}
	return b.String()
}

func placeOf(b *bench, site int) visibility.Site { return constraints.Place(&b.sv.Sites[site]) }
