package ledger

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"
)

// Two writers at once: one waits for the other, and both files are in.
func TestWritersTakeTurns(t *testing.T) {
	b := newBench(t)
	const writers, files = 4, 5
	var wg sync.WaitGroup
	errs := make([]error, writers)
	for w := range writers {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for k := range files {
				text := manyRows(50, time.Unix(1.7e9+apart(w*files+k), 0))
				batch, faults := Read(strings.NewReader(text), fmt.Sprintf("w%d-%d.csv", w, k), "")
				l, err := OpenWriter(b.path)
				if err == nil {
					_, more, err2 := l.Record(context.Background(), b.sv, b.exact, batch, Entry{}, Terms{})
					faults, err = append(faults, more...), errors.Join(err2, l.Close())
				}
				if err != nil || len(faults) > 0 {
					errs[w] = errors.Join(errs[w], err, fmt.Errorf("%d faults", len(faults)))
				}
			}
		}()
	}
	wg.Wait()
	if err := errors.Join(errs...); err != nil {
		t.Error(err)
	}
	if n := len(b.done()); n != writers*files*50 {
		t.Errorf("%d exposures; want %d", n, writers*files*50)
	}
	b.sound()
}

// apart keeps the files of TestWritersTakeTurns apart, s.
func apart(k int) int64 { return int64(k) * 50 * 400 }

// A writer that holds on makes the other one wait, and then tells it; a reader
// meanwhile sees what stood before.
func TestAWriterThatWaitedInVainIsTold(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	first := b.open()
	defer first.Close()
	tx, err := first.db.BeginTx(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	if n := len(b.done()); n != 1 {
		t.Errorf("a reader beside a writer sees %d exposures", n)
	}
	second := b.open()
	defer second.Close()
	// The wait is cut for the test's sake.
	if _, err := second.db.Exec("PRAGMA busy_timeout = 50"); err != nil {
		t.Fatal(err)
	}
	batch := b.read(head + line("A2", "C1", "r", "05:00"))
	_, _, err = second.Record(t.Context(), b.sv, b.exact, batch, Entry{}, Terms{})
	if !errors.Is(err, ErrBusy) || !strings.Contains(err.Error(), "nothing was written; try again when that one is done") {
		t.Errorf("the second writer: %v", err)
	}
	if err := tx.Rollback(); err != nil {
		t.Fatal(err)
	}
	if res, _, err := second.Record(t.Context(), b.sv, b.exact, batch, Entry{}, Terms{}); err != nil || res.Done != 1 {
		t.Errorf("after the first was done: %+v, %v", res, err)
	}
}

func TestACancelledRecordWritesNothing(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	l := b.open()
	defer l.Close()
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, _, err := l.Record(ctx, b.sv, b.exact, b.read(manyRows(100, time.Unix(1.7e9, 0))), Entry{}, Terms{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	if n := len(b.done()); n != 1 {
		t.Errorf("%d exposures", n)
	}
}

// A large ledger is asked field by field, and says the same.
func TestDoneForIsDoneOfTheSurvey(t *testing.T) {
	b := newBench(t)
	b.must(manyRows(300, time.Unix(1.7e9, 0)))
	mend := "kind,field,telescope,start_utc,end_utc,cause\nlost,,C1,2023-11-14T22:13:20Z,2023-11-14T22:14:00Z,other\ndone,A5,C1,2023-11-14T22:20:00Z,2023-11-14T22:22:00Z,\n"
	if _, faults := b.recordOn(mend, Terms{Correct: true}); faults != nil {
		t.Fatal(faults)
	}
	b.sv.Fields = b.sv.Fields[2:] // A1 and A2 are other surveys'
	l := b.open()
	defer l.Close()
	small, err := l.DoneFor(t.Context(), b.sv, Now)
	if err != nil {
		t.Fatal(err)
	}
	large, err := l.done(t.Context(), b.sv, Now)
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(small) != fmt.Sprint(large) || len(small) != 181 {
		t.Errorf("%d read whole, %d field by field; want 181 the same", len(small), len(large))
	}
}
