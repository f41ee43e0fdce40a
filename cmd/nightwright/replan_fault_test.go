package main

import (
	"encoding/csv"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightwright/cmd/nightwright/work"
)

// seasonBegun plans a copy of the small survey, and has its first night done at
// Cinder Ridge and lost at Salt Mesa.
func seasonBegun(t *testing.T, dir string) {
	t.Helper()
	session(t, exitDone, "plan", dir, "--quiet")
	text, _ := session(t, exitDone, "sheet", dir, filepath.Join(dir, "plan"), "--telescope", "C1", "--night", "2027-03-08", "--csv", "--quiet")
	rows, err := csv.NewReader(strings.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	w := csv.NewWriter(&b)
	for _, r := range rows {
		if r[0] == "planned" {
			r[0] = "done"
		}
		if err := w.Write(r); err != nil {
			t.Fatal(err)
		}
	}
	w.Flush()
	file := filepath.Join(t.TempDir(), "night.csv")
	if err := os.WriteFile(file, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	session(t, exitDone, "record", dir, file, "--quiet")
	session(t, exitDone, "lose", dir, "--site", "Salt Mesa", "--from", "2027-03-08", "--to", "2027-03-08", "--cause", "weather", "--quiet")
}

const afterTheFirst = "2027-03-09T16:45:00Z"

// TestKilledPlannersLeaveAWholePlan kills plan and replan, which put their plan in
// the place of the last one, with SIGKILL at random moments: each time the folder
// holds a whole plan, the old or the new, the ledger is sound, and the next run
// goes through.
func TestKilledPlannersLeaveAWholePlan(t *testing.T) {
	if testing.Short() && os.Getenv(requireAll) != "1" {
		t.Skip("20 processes and more")
	}
	rng := rand.New(rand.NewPCG(12, 0))
	dir := smallCopy(t)
	seasonBegun(t, dir)
	now := filepath.Join(dir, "now")
	commands := [][]string{
		{"replan", dir, filepath.Join(dir, "plan"), "--now", afterTheFirst, "--out", now, "--quiet"},
		{"replan", dir, filepath.Join(dir, "plan"), "--now", afterTheFirst, "--stability", "0", "--out", now, "--quiet"},
		{"plan", dir, "--now", afterTheFirst, "--out", now, "--quiet"},
	}
	began := time.Now()
	if out, err := asChild(t, commands[0]...).CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	whole := time.Since(began)
	gone := 0
	for k := range killsAsked(t) / 2 {
		c := asChild(t, commands[k%len(commands)]...)
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		time.Sleep(time.Duration(rng.Float64() * 1.1 * float64(whole)))
		if err := c.Process.Kill(); err != nil && !strings.Contains(err.Error(), "finished") {
			t.Fatal(err)
		}
		if c.Wait() != nil {
			gone++
		}
		if _, err := work.ReadPlan(now); err != nil {
			t.Fatalf("kill %d of %v: %v", k, c.Args[1:], err)
		}
		holds(t, dir)
	}
	if gone == 0 {
		t.Error("no kill struck before the end; the moments are wrong")
	}
	if out, err := asChild(t, commands[0]...).CombinedOutput(); err != nil {
		t.Errorf("after %d kills: %v: %s", gone, err, out)
	}
	session(t, exitDone, "audit", dir, now, "--quiet")
	t.Logf("%d of %d kills struck before the end", gone, killsAsked(t)/2)
}

// smallDisk mounts a memory disk of a size, which takes root.
func smallDisk(t *testing.T, size string) string {
	t.Helper()
	dir := t.TempDir()
	if out, err := exec.Command("mount", "-t", "tmpfs", "-o", "size="+size, "tmpfs", dir).CombinedOutput(); err != nil {
		if os.Getenv(requireAll) == "1" {
			t.Fatalf("no small disk can be mounted here; the test needs root: %v: %s", err, out)
		}
		t.Skipf("no small disk can be mounted here: %v: %s", err, out)
	}
	t.Cleanup(func() {
		if out, err := exec.Command("umount", dir).CombinedOutput(); err != nil {
			t.Errorf("umount: %v: %s", err, out)
		}
	})
	return dir
}

// TestAFullDiskLeavesTheLastPlan: a re-plan that finds no room for its folder says
// so, and the plan that stood there stands.
func TestAFullDiskLeavesTheLastPlan(t *testing.T) {
	disk := smallDisk(t, "512k")
	dir := filepath.Join(disk, "s")
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	seasonBegun(t, dir)
	plan := filepath.Join(dir, "plan")
	before, err := os.ReadFile(filepath.Join(plan, "plan.json"))
	if err != nil {
		t.Fatal(err)
	}
	// Fill the disk but for a little.
	ballast, err := os.Create(filepath.Join(disk, "ballast"))
	if err != nil {
		t.Fatal(err)
	}
	for n := 0; ; n += 4096 {
		if _, err := ballast.Write(make([]byte, 4096)); err != nil {
			if err := ballast.Truncate(int64(max(0, n-16384))); err != nil {
				t.Fatal(err)
			}
			break
		}
	}
	if err := ballast.Close(); err != nil {
		t.Fatal(err)
	}
	_, told := session(t, 1, "replan", dir, plan, "--now", afterTheFirst, "--out", plan, "--quiet")
	if !strings.Contains(told, "no space left on device") {
		t.Errorf("told %q", told)
	}
	after, err := os.ReadFile(filepath.Join(plan, "plan.json"))
	if err != nil || string(after) != string(before) {
		t.Errorf("the plan is another: %v", err)
	}
	if _, err := work.ReadPlan(plan); err != nil {
		t.Error(err)
	}
	if left, err := filepath.Glob(filepath.Join(dir, ".plan*")); err != nil || len(left) > 0 {
		t.Errorf("%v was left behind, %v", left, err)
	}
	holds(t, dir)
}

// TestAReadOnlySurveyIsPlannedAgain: the plan goes where it is asked to; that the
// ledger can't be told of it is said and is no failure.
func TestAReadOnlySurveyIsPlannedAgain(t *testing.T) {
	dir := smallCopy(t)
	seasonBegun(t, dir)
	if os.Geteuid() == 0 { // root may write anywhere: it needs a disk for it
		disk := smallDisk(t, "4m")
		if err := os.CopyFS(filepath.Join(disk, "s"), os.DirFS(dir)); err != nil {
			t.Fatal(err)
		}
		if out, err := exec.Command("mount", "-o", "remount,ro", disk).CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
		dir = filepath.Join(disk, "s")
	} else {
		if err := errors.Join(os.Chmod(filepath.Join(dir, "ledger.db"), 0o444), os.Chmod(dir, 0o555)); err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() { os.Chmod(dir, 0o755) })
	}
	out := filepath.Join(t.TempDir(), "again")
	_, told := session(t, exitDone, "replan", dir, filepath.Join(dir, "plan"), "--now", afterTheFirst, "--out", out)
	if !strings.Contains(told, "warning: the ledger doesn't have this plan: ") || !strings.Contains(told, "read-only") {
		t.Errorf("told %q", told)
	}
	if _, err := work.ReadPlan(out); err != nil {
		t.Error(err)
	}
	session(t, exitDone, "explain", dir, out, "A1", "--quiet")
	// Its own folder can't be written to.
	_, told = session(t, exitInput, "replan", dir, out, "--now", afterTheFirst)
	if !strings.Contains(told, "read-only") && !strings.Contains(told, "permission denied") {
		t.Errorf("told %q", told)
	}
}

// TestTwoPlannersAtOnce: each leaves a whole plan, and the ledger has both.
func TestTwoPlannersAtOnce(t *testing.T) {
	dir := smallCopy(t)
	seasonBegun(t, dir)
	var running []*exec.Cmd
	for k := range 3 {
		c := asChild(t, "replan", dir, filepath.Join(dir, "plan"), "--now", afterTheFirst, "--out", filepath.Join(dir, fmt.Sprint("plan", k)), "--quiet")
		c.Stderr = new(strings.Builder)
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		running = append(running, c)
	}
	for k, c := range running {
		if err := c.Wait(); err != nil {
			t.Errorf("%v: %s", err, c.Stderr)
		}
		session(t, exitDone, "audit", dir, filepath.Join(dir, fmt.Sprint("plan", k)), "--quiet")
	}
	holds(t, dir)
}
