package main

import (
	"bufio"
	"bytes"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/tables"
)

// asProgram makes the test binary behave as the program.
const asProgram = "NIGHTWRIGHT_TEST_AS_PROGRAM"

// TestInterruptLeavesTheOldPlan sends SIGINT, as Ctrl-C does, to a running
// search: exit code 130, and the plan that stood there is whole and the same.
// Before there is a plan nothing is written; after, the best so far stands
// beside the old one.
func TestInterruptLeavesTheOldPlan(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "s")
	if _, err := work.New(dir, "demo", 0); err != nil {
		t.Fatal(err)
	}
	plan := filepath.Join(dir, "plan")
	var out, msg bytes.Buffer
	if code := Run([]string{"plan", dir, "--effort", "quick", "--quiet"}, strings.NewReader(""), &out, &msg); code != exitDone {
		t.Fatalf("plan: exit %d: %s", code, msg.String())
	}
	before := folderBytes(t, plan)
	for _, c := range []struct{ at, tells, beside string }{
		{"prices", "what stood before still stands", ""},
		{"construction", "the plan that stood there before still stands", plan + "-interrupted"},
	} {
		told := interrupted(t, c.at, "plan", dir, "--effort", "quick", "--seed", "99")
		if last := told[len(told)-1]; !strings.Contains(last, c.tells) {
			t.Errorf("interrupted at %s, the last line is %q; want it to say what became of the plan", c.at, last)
		}
		if after := folderBytes(t, plan); after != before {
			t.Errorf("interrupted at %s: the old plan was changed", c.at)
		}
		if left, _ := filepath.Glob(filepath.Join(dir, ".*")); len(left) > 0 {
			t.Errorf("interrupted at %s: it left %v", c.at, left)
		}
		if c.beside == "" {
			continue
		}
		pt, err := tables.ReadFolder(c.beside)
		if err != nil {
			t.Fatalf("the plan kept: %v", err)
		}
		if pt.Summary.Status != "interrupted" || pt.Summary.VisitsGot == 0 {
			t.Errorf("the plan kept has status %q and %d visits", pt.Summary.Status, pt.Summary.VisitsGot)
		}
		out.Reset()
		if code := Run([]string{"audit", dir, c.beside, "--quiet"}, strings.NewReader(""), &out, &msg); code != exitDone {
			t.Errorf("audit of the plan kept: exit %d: %s", code, out.String())
		}
	}
	if _, err := tables.ReadFolder(plan); err != nil {
		t.Errorf("the old plan can't be read any more: %v", err)
	}
}

// interrupted runs a command as a process, sends SIGINT when a line of its
// progress begins with a phase, and returns all lines. The exit code must be 130.
func interrupted(t *testing.T, phase string, args ...string) []string {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(self, args...)
	c.Env = append(os.Environ(), asProgram+"=1")
	stderr, err := c.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	var told []string
	sent := false
	for lines := bufio.NewScanner(stderr); lines.Scan(); {
		told = append(told, lines.Text())
		if !sent && strings.HasPrefix(lines.Text(), phase) {
			sent = true // a second one would end it at once
			if err := c.Process.Signal(syscall.SIGINT); err != nil && !errors.Is(err, os.ErrProcessDone) {
				t.Fatal(err)
			}
		}
	}
	var exit *exec.ExitError
	if err := c.Wait(); !errors.As(err, &exit) || exit.ExitCode() != exitInterrupted {
		t.Fatalf("interrupted: %v; want exit code %d; it told\n%s", err, exitInterrupted, strings.Join(told, "\n"))
	}
	return told
}

// folderBytes joins the names and contents of a folder's files.
func folderBytes(t *testing.T, dir string) string {
	t.Helper()
	var all strings.Builder
	err := filepath.WalkDir(dir, func(p string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		data, err := os.ReadFile(p)
		all.WriteString(p + "\x00" + string(data) + "\x00")
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return all.String()
}
