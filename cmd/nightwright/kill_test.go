package main

import (
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"nightwright/scheduler/ledger"
)

// killsAsked says how often the test of kills kills: 20 times unless
// NIGHTWRIGHT_KILLS has another number.
func killsAsked(t *testing.T) int {
	text := os.Getenv("NIGHTWRIGHT_KILLS")
	if text == "" {
		return 20
	}
	n, err := strconv.Atoi(text)
	if err != nil || n < 1 {
		t.Fatalf("NIGHTWRIGHT_KILLS is %q; want a number from 1", text)
	}
	return n
}

// killRows is how many exposures each file of the test of kills has: enough
// for the writing to take a good part of the run.
const killRows = 2000

// killFile writes the k-th file of rows: exposures of 300 s, 400 s apart, years
// before the period, each file at its own time.
func killFile(t *testing.T, dir string, k int) string {
	t.Helper()
	var b strings.Builder
	b.WriteString("field,telescope,filter,start_utc,end_utc,quality\n")
	from := time.Date(1980, 1, 1, 0, 0, 0, 0, time.UTC).Add(time.Duration(k) * killRows * 400 * time.Second)
	for i := range killRows {
		at := from.Add(time.Duration(i) * 400 * time.Second)
		fmt.Fprintf(&b, "A%d,C1,r,%s,%s,0.5\n", i%5+1, at.Format(time.RFC3339), at.Add(300*time.Second).Format(time.RFC3339))
	}
	path := filepath.Join(dir, fmt.Sprintf("night%d.csv", k))
	if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// asChild makes a command line of the program that runs as a process.
func asChild(t *testing.T, args ...string) *exec.Cmd {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(self, args...)
	c.Env = append(os.Environ(), asProgram+"=1", "XDG_CONFIG_HOME="+t.TempDir())
	return c
}

// smallCopy copies the small survey into a folder of its own.
func smallCopy(t *testing.T) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "s")
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	return dir
}

// holds counts what a ledger holds, and has it checked from inside and by the
// sqlite3 command.
func holds(t *testing.T, dir string) (exposures, losses int) {
	t.Helper()
	path := filepath.Join(dir, ledger.FileName)
	l, err := ledger.Open(path) // a reader is enough to take back what was cut off
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if err := l.Check(context.Background()); err != nil {
		t.Fatal(err)
	}
	done, err := l.Done(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	lost, err := l.LossRows(context.Background(), ledger.Now)
	if err != nil {
		t.Fatal(err)
	}
	if program, err := exec.LookPath("sqlite3"); err == nil {
		out, err := exec.Command(program, path, "PRAGMA integrity_check").CombinedOutput()
		if err != nil || strings.TrimSpace(string(out)) != "ok" {
			t.Fatalf("sqlite3's integrity_check: %v, %s", err, out)
		}
	} else if os.Getenv(requireAll) == "1" {
		t.Fatal(err)
	}
	return len(done), len(lost)
}

// TestKilledWritersLeaveAllOrNothing kills record and lose with SIGKILL, which
// no program can answer, at random moments of their run: each time the ledger
// opens, is sound, and holds all or nothing of what was being written.
func TestKilledWritersLeaveAllOrNothing(t *testing.T) {
	if testing.Short() && os.Getenv(requireAll) != "1" {
		t.Skip("40 processes and more")
	}
	const seed = 11
	rng := rand.New(rand.NewPCG(seed, 0))
	dir, files := smallCopy(t), t.TempDir()
	args := func(k int) []string {
		if k%4 == 3 {
			day := time.Date(1980, 1, 1, 0, 0, 0, 0, time.UTC).AddDate(0, 0, k).Format(time.DateOnly)
			return []string{"lose", dir, "--telescope", "S1", "--from", day + "T01:00:00Z", "--to", day + "T02:00:00Z", "--cause", "other", "--quiet"}
		}
		return []string{"record", dir, killFile(t, files, k), "--quiet"}
	}
	// How long a whole run takes; kills fall anywhere in it and a little after.
	var whole [2]time.Duration
	began := time.Now()
	if out, err := asChild(t, args(0)...).CombinedOutput(); err != nil {
		t.Fatalf("record: %v: %s", err, out)
	}
	whole[0], began = time.Since(began), time.Now()
	if out, err := asChild(t, args(3)...).CombinedOutput(); err != nil {
		t.Fatalf("lose: %v: %s", err, out)
	}
	whole[1] = time.Since(began)
	shots, lost := holds(t, dir)
	if shots != killRows || lost != 1 {
		t.Fatalf("%d exposures and %d losses before any kill", shots, lost)
	}
	kept, gone, amid := 0, 0, 0
	for k := 4; k < 4+killsAsked(t); k++ {
		if k%10 == 0 { // a new survey: kills strike the making of a ledger too
			dir, shots, lost = smallCopy(t), 0, 0
		}
		c := asChild(t, args(k)...)
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		length := whole[0]
		if k%4 == 3 {
			length = whole[1]
		}
		time.Sleep(time.Duration(rng.Float64() * 1.1 * float64(length)))
		if err := c.Process.Kill(); err != nil && !strings.Contains(err.Error(), "finished") {
			t.Fatal(err)
		}
		c.Wait() // its end is a signal's, or it was done before
		if _, err := os.Stat(filepath.Join(dir, ledger.FileName+"-journal")); err == nil {
			amid++ // the writing was cut off half-way
		}
		nowShots, nowLost := holds(t, dir)
		switch more := [2]int{nowShots - shots, nowLost - lost}; more {
		case [2]int{0, 0}:
			gone++
		case [2]int{killRows, 0}, [2]int{0, 1}:
			kept++
		default:
			t.Fatalf("seed %d, kill %d of %v: %d more exposures and %d more losses; want all of it or nothing", seed, k, c.Args[1:], more[0], more[1])
		}
		// The same again goes through, whatever became of it.
		if out, err := asChild(t, args(k)...).CombinedOutput(); err != nil {
			t.Fatalf("after kill %d: %v: %s", k, err, out)
		}
		if k%4 == 3 {
			lost++
		} else {
			shots += killRows
		}
	}
	if nowShots, nowLost := holds(t, dir); nowShots != shots || nowLost != lost {
		t.Errorf("%d exposures and %d losses in the end; want %d and %d", nowShots, nowLost, shots, lost)
	}
	if gone == 0 {
		t.Errorf("none of %d kills struck before the end; the moments are wrong", kept)
	}
	t.Logf("%d kills: %d left nothing (%d struck amid the writing), %d left all", kept+gone, gone, amid, kept)
}

// TestTwoProcessesRecordAtOnce: one waits for the other, and both go in.
func TestTwoProcessesRecordAtOnce(t *testing.T) {
	dir, files := smallCopy(t), t.TempDir()
	var running []*exec.Cmd
	for k := range 3 {
		c := asChild(t, "record", dir, killFile(t, files, k), "--quiet")
		c.Stderr = new(strings.Builder)
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		running = append(running, c)
	}
	for _, c := range running {
		if err := c.Wait(); err != nil {
			t.Errorf("%v: %v: %s", c.Args[1:], err, c.Stderr)
		}
	}
	if shots, _ := holds(t, dir); shots != 3*killRows {
		t.Errorf("%d exposures; want %d", shots, 3*killRows)
	}
}

// TestARefusedLedgerSaysWhoWroteIt: the exit code and the words of a ledger
// from a later version of the program.
func TestARefusedLedgerSaysWhoWroteIt(t *testing.T) {
	dir := smallCopy(t)
	if _, err := exec.LookPath("sqlite3"); err != nil {
		if os.Getenv(requireAll) == "1" {
			t.Fatal(err)
		}
		t.Skip("the sqlite3 command makes the later ledger, and isn't installed")
	}
	session(t, exitDone, "lose", dir, "--telescope", "S1", "--from", "2027-03-08", "--to", "2027-03-08", "--cause", "other")
	change := "UPDATE about SET value = '12' WHERE key = 'schema_version'; UPDATE about SET value = '4.1.0' WHERE key = 'written_by'"
	if out, err := exec.Command("sqlite3", filepath.Join(dir, ledger.FileName), change).CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	for _, args := range [][]string{{"ledger", dir}, {"plan", dir}, {"lose", dir, "--telescope", "S1", "--from", "2027-03-09", "--to", "2027-03-09", "--cause", "other"}} {
		_, told := session(t, exitInput, args...)
		if !strings.Contains(told, "it was written by nightwright 4.1.0 and has schema_version 12, newer than the 2 that this version knows; want nightwright 4.1.0 or later") {
			t.Errorf("%v: %s", args, told)
		}
	}
}
