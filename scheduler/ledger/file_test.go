package ledger

import (
	"bytes"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// raw opens the file as SQLite alone would.
func raw(t testing.TB, path string) *sql.DB {
	t.Helper()
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { db.Close() })
	return db
}

func mustExec(t testing.TB, db *sql.DB, text string) {
	t.Helper()
	if _, err := db.Exec(text); err != nil {
		t.Fatal(err)
	}
}

func TestReadingMakesNoFile(t *testing.T) {
	b := newBench(t)
	l, err := Open(b.path)
	if err != nil {
		t.Fatal(err)
	}
	n, err := l.Last(t.Context())
	losses, err2 := l.Losses(t.Context(), b.sv, Now)
	plans, err3 := l.Plans(t.Context())
	if err := errors.Join(err, err2, err3, l.Check(t.Context()), l.Close()); err != nil || n != 0 || losses != nil || plans != nil || len(b.done()) != 0 {
		t.Errorf("a ledger that isn't there: %d, %v, %v, %v", n, losses, plans, err)
	}
	if _, err := os.Stat(b.path); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("reading made a file: %v", err)
	}
	if _, err := OpenWriter(filepath.Join(b.path, "deeper", FileName)); err == nil || !strings.Contains(err.Error(), "want a survey folder") {
		t.Errorf("no folder: %v", err)
	}
}

func TestTheJournalIsARollbackJournalAndFull(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	l := b.open()
	defer l.Close()
	for pragma, want := range map[string]string{"journal_mode": "delete", "synchronous": "2", "foreign_keys": "1", "busy_timeout": strconv.Itoa(int(Wait.Milliseconds())), "application_id": "1314344007"} {
		var got string
		if err := l.db.QueryRow("PRAGMA " + pragma).Scan(&got); err != nil || got != want {
			t.Errorf("%s is %q, %v; want %s", pragma, got, err, want)
		}
	}
}

func TestANewerLedgerIsRefusedByName(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	mustExec(t, raw(t, b.path), "UPDATE about SET value = '9' WHERE key = 'schema_version'; UPDATE about SET value = '3.5' WHERE key = 'written_by'")
	want := b.path + ": it was written by nightwright 3.5 and has schema_version 9, newer than the 2 that this version knows; want nightwright 3.5 or later"
	for name, open := range map[string]func(string) (*Ledger, error){"reader": Open, "writer": OpenWriter} {
		var file *FileError
		if _, err := open(b.path); !errors.As(err, &file) || err.Error() != want {
			t.Errorf("%s: %v; want %s", name, err, want)
		}
	}
}

// oldLedger makes a file of version 1, with a row in it.
func oldLedger(t testing.TB, path string) {
	db := raw(t, path)
	mustExec(t, db, steps[0])
	mustExec(t, db, fmt.Sprintf("PRAGMA application_id = %d", applicationID))
	mustExec(t, db, `INSERT INTO about VALUES ('schema_version', '1'), ('written_by', '0.9');
INSERT INTO entries VALUES (1, 'record', 0, 'old.csv', '', '0.9');
INSERT INTO names VALUES (1, 'C1'), (2, 'Cinder Ridge'), (3, 'A1'), (4, 'wide'), (5, 'r');
INSERT INTO exposures VALUES (1, 1, 2, 'done', NULL, 1, 1804564800000000, 1804565100000000, 20885, 2, 3, 4, 5, 5, 0.5, NULL, NULL, '', '');`)
	if err := db.Close(); err != nil {
		t.Fatal(err)
	}
}

func TestAnOlderLedgerIsReadAndBroughtUp(t *testing.T) {
	b := newBench(t)
	oldLedger(t, b.path)
	before, err := os.ReadFile(b.path)
	if err != nil {
		t.Fatal(err)
	}
	l, err := Open(b.path)
	if err != nil {
		t.Fatal(err)
	}
	plans, err := l.Plans(t.Context())
	if err := errors.Join(err, l.Close()); err != nil || plans != nil {
		t.Errorf("plans of version 1: %v, %v", plans, err)
	}
	if got := b.done(); len(got) != 1 || got[0].Source != "old.csv" || got[0].Field != "A1" {
		t.Errorf("%+v", got)
	}
	if after, err := os.ReadFile(b.path); err != nil || !bytes.Equal(before, after) {
		t.Error("reading changed the file")
	}
	// The first row written brings it to the present version, rows and all. The
	// old row is known.
	if res := b.must(head + "A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.5\n" + line("A2", "C1", "r", "05:00")); res.Seen != 1 || res.Done != 1 || res.Entry != 2 {
		t.Errorf("%+v", res)
	}
	w := b.open()
	defer w.Close()
	made := PlanMade{SHA256: "ab", Path: "plan", Coverage: 0.5, Ceiling: 0.6, MadeFor: "cd", Knew: 2}
	if err := w.AddPlan(t.Context(), made, Entry{Made: time.Unix(1.8e9, 0), Program: "1.0"}); err != nil {
		t.Fatal(err)
	}
	made.Entry = 3
	plans, err = w.Plans(t.Context())
	if d := cmp.Diff([]PlanMade{made}, plans); d != "" || err != nil {
		t.Error(d, err)
	}
	about, err := w.table(t.Context(), w.db, "SELECT rowid, sql FROM sqlite_schema WHERE sql IS NOT NULL ORDER BY name")
	if err != nil {
		t.Fatal(err)
	}
	fresh := newBench(t)
	fresh.must(head + line("A1", "C1", "r", "04:00"))
	f := fresh.open()
	defer f.Close()
	wanted, err := f.table(t.Context(), f.db, "SELECT rowid, sql FROM sqlite_schema WHERE sql IS NOT NULL ORDER BY name")
	if d := cmp.Diff(wanted, about); d != "" || err != nil {
		t.Errorf("an old file brought up differs from a new one (-new +old):\n%s %v", d, err)
	}
	b.sound()
}

func TestOtherFilesAreNoLedger(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	whole, err := os.ReadFile(b.path)
	if err != nil {
		t.Fatal(err)
	}
	other := filepath.Join(t.TempDir(), "other")
	mustExec(t, raw(t, other), "CREATE TABLE x (y)")
	stranger, err := os.ReadFile(other)
	if err != nil {
		t.Fatal(err)
	}
	for msg, text := range map[string][]byte{
		"text": []byte(strings.Repeat("field,telescope\n", 100)), "another database": stranger, "cut off": whole[:len(whole)/2],
		"a damaged page": append(append(bytes.Clone(whole[:4096]), bytes.Repeat([]byte{0xa5}, 4096)...), whole[8192:]...),
	} {
		path := filepath.Join(t.TempDir(), FileName)
		if err := os.WriteFile(path, text, 0o644); err != nil {
			t.Fatal(err)
		}
		var file *FileError
		l, err := OpenWriter(path)
		if err == nil {
			err = errors.Join(l.Check(t.Context()), l.Close())
		}
		if !errors.As(err, &file) || file.Path != path || file.Want == "" {
			t.Errorf("%s: %v; want a fault of the file", msg, err)
		}
	}
	if _, err := Open(t.TempDir()); err == nil || !strings.Contains(err.Error(), "it is no file") {
		t.Errorf("a folder: %v", err)
	}
	// A file of no bytes is what a writer leaves that was killed at once.
	path := filepath.Join(t.TempDir(), FileName)
	if err := os.WriteFile(path, nil, 0o644); err != nil {
		t.Fatal(err)
	}
	b.path = path
	if n := len(b.done()); n != 0 {
		t.Errorf("%d exposures in no bytes", n)
	}
	if res := b.must(head + line("A1", "C1", "r", "04:00")); res.Done != 1 {
		t.Errorf("%+v", res)
	}
}

// mounted mounts a memory disk of a size, and says why it can't.
func mounted(t *testing.T, size string) (dir string, err error) {
	dir = t.TempDir()
	program, err := exec.LookPath("mount")
	if err != nil {
		return "", err
	}
	if out, err := exec.Command(program, "-t", "tmpfs", "-o", "size="+size, "tmpfs", dir).CombinedOutput(); err != nil {
		return "", fmt.Errorf("mount: %w: %s", err, out)
	}
	t.Cleanup(func() {
		if out, err := exec.Command("umount", dir).CombinedOutput(); err != nil {
			t.Errorf("umount: %v: %s", err, out)
		}
	})
	return dir, nil
}

func TestAFullDiskLeavesTheLedger(t *testing.T) {
	dir, err := mounted(t, "256k")
	if err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("no small disk can be mounted here; the test needs root: ", err)
		}
		t.Skip("no small disk can be mounted here: ", err)
	}
	b := newBench(t)
	b.path = filepath.Join(dir, FileName)
	b.must(head + line("A1", "C1", "r", "04:00"))
	l := b.open()
	_, faults, err := l.Record(t.Context(), b.sv, b.exact, b.read(manyRows(5000, time.Unix(1.7e9, 0))), Entry{}, Terms{})
	if faults != nil || err == nil || !strings.Contains(err.Error(), "the disk is full; nothing was written") {
		t.Errorf("a full disk: %v, %v", faults, err)
	}
	if err := l.Close(); err != nil {
		t.Error(err)
	}
	if n := len(b.done()); n != 1 {
		t.Errorf("%d exposures after the disk was full; want the 1 from before", n)
	}
	b.sound()
	if res := b.must(head + line("A2", "C1", "r", "05:00")); res.Done != 1 {
		t.Errorf("a small file after a large one: %+v", res)
	}
	// No room for anything at all.
	if err := os.WriteFile(filepath.Join(dir, "ballast"), make([]byte, 1<<20), 0o644); err == nil {
		t.Fatal("the disk isn't full")
	}
	l = b.open()
	defer l.Close()
	if _, _, err = l.Record(t.Context(), b.sv, b.exact, b.read(head+line("A3", "C1", "r", "06:00")), Entry{}, Terms{}); err == nil {
		t.Error("recorded on a full disk")
	}
	if n := len(b.done()); n != 2 {
		t.Errorf("%d exposures; want 2", n)
	}
	b.sound()
}

// readOnly makes a folder read-only; root, who may write anywhere, needs a
// disk for it.
func readOnly(t *testing.T, fill func(dir string)) (string, error) {
	if os.Geteuid() != 0 {
		dir := t.TempDir()
		fill(dir)
		t.Cleanup(func() { os.Chmod(dir, 0o755) })
		return dir, errors.Join(os.Chmod(filepath.Join(dir, FileName), 0o444), os.Chmod(dir, 0o555))
	}
	dir, err := mounted(t, "16m")
	if err != nil {
		return "", err
	}
	fill(dir)
	if out, err := exec.Command("mount", "-o", "remount,ro", dir).CombinedOutput(); err != nil {
		return "", fmt.Errorf("remount: %w: %s", err, out)
	}
	return dir, nil
}

// cutOff makes the files of a writer that was killed amid its writing, in a
// folder: a ledger of one exposure with a journal to roll back.
func cutOff(b *bench, dir string) {
	b.Helper()
	b.must(head + line("A1", "C1", "r", "04:00"))
	l := b.open()
	defer l.Close()
	batch := b.read(manyRows(30_000, time.Unix(1.5e9, 0))) // more than SQLite keeps in memory
	stop := errors.New("stop")
	err := l.change(b.Context(), "1.0", func(tx *sql.Tx) error {
		c := &recording{l: l, m: newMatcher(b.sv, b.exact), past: map[key][]*record{}}
		for i := range batch.Rows {
			c.takeShot(&batch.Rows[i])
		}
		if err := c.write(b.Context(), tx, "record", Entry{}); err != nil {
			return err
		}
		for _, suffix := range []string{"", "-journal"} {
			text, err := os.ReadFile(b.path + suffix)
			if err != nil {
				return err
			}
			if err := os.WriteFile(filepath.Join(dir, FileName+suffix), text, 0o644); err != nil {
				return err
			}
		}
		return stop
	})
	if !errors.Is(err, stop) {
		b.Fatal(err)
	}
	b.path = filepath.Join(dir, FileName)
}

func TestAReaderTakesBackWhatWasCutOff(t *testing.T) {
	b := newBench(t)
	cutOff(b, t.TempDir())
	if n := len(b.done()); n != 1 {
		t.Errorf("%d exposures; want the 1 from before the write that was cut off", n)
	}
	if _, err := os.Stat(b.path + "-journal"); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("the journal is still there: %v", err)
	}
	b.sound()
}

func TestWhatWasCutOffIsToldInAReadOnlyFolder(t *testing.T) {
	b := newBench(t)
	_, err := readOnly(t, func(dir string) { cutOff(b, dir) })
	if err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("no folder can be made read-only here: ", err)
		}
		t.Skip("no folder can be made read-only here: ", err)
	}
	if _, err := Open(b.path); err == nil || !strings.Contains(err.Error(), "a write to it was cut off and must be taken back first") {
		t.Errorf("got %v", err)
	}
}

func TestFoldersOfAnyName(t *testing.T) {
	b := newBench(t)
	dir := filepath.Join(t.TempDir(), "a b?mode=ro&c#d%41 é")
	if err := os.Mkdir(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	b.path = filepath.Join(dir, FileName)
	b.must(head + line("A1", "C1", "r", "04:00"))
	if _, err := os.Stat(b.path); err != nil || len(b.done()) != 1 {
		t.Errorf("the ledger went elsewhere: %v", err)
	}
}

func TestAReadOnlyFolderCanBeRead(t *testing.T) {
	b := newBench(t)
	dir, err := readOnly(t, func(dir string) {
		b.path = filepath.Join(dir, FileName)
		b.must(head + line("A1", "C1", "r", "04:00"))
	})
	if err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("no folder can be made read-only here: ", err)
		}
		t.Skip("no folder can be made read-only here: ", err)
	}
	if n := len(b.done()); n != 1 {
		t.Errorf("%d exposures; want 1", n)
	}
	l, err := OpenWriter(b.path)
	if err == nil {
		defer l.Close()
		_, _, err = l.Record(t.Context(), b.sv, b.exact, b.read(head+line("A2", "C1", "r", "05:00")), Entry{}, Terms{})
	}
	if err == nil || !strings.Contains(err.Error(), "want a folder that can be written to") {
		t.Errorf("writing there: %v", err)
	}
	l2, err := OpenWriter(filepath.Join(dir, "new.sqlite"))
	if err == nil {
		l2.Close()
	}
	if err == nil || !strings.Contains(err.Error(), "want a folder that can be written to") {
		t.Errorf("a new ledger there: %v", err)
	}
}
