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

	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(self, "plan", dir, "--effort", "thorough", "--seed", "99")
	c.Env = append(os.Environ(), asProgram+"=1")
	stderr, err := c.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	var told []string
	for lines := bufio.NewScanner(stderr); lines.Scan(); {
		told = append(told, lines.Text())
		if strings.HasPrefix(lines.Text(), "prices") { // the search has begun
			if err := c.Process.Signal(syscall.SIGINT); err != nil && !errors.Is(err, os.ErrProcessDone) {
				t.Fatal(err)
			}
		}
	}
	var exit *exec.ExitError
	if err := c.Wait(); !errors.As(err, &exit) || exit.ExitCode() != exitInterrupted {
		t.Fatalf("interrupted: %v; want exit code %d; it told\n%s", err, exitInterrupted, strings.Join(told, "\n"))
	}
	if last := told[len(told)-1]; !strings.Contains(last, "what stood before still stands") {
		t.Errorf("the last line is %q; want it to say what became of the plan", last)
	}
	if after := folderBytes(t, plan); after != before {
		t.Error("the old plan was changed by an interrupted run")
	}
	if _, err := tables.ReadFolder(plan); err != nil {
		t.Errorf("the old plan can't be read any more: %v", err)
	}
	if left, _ := filepath.Glob(filepath.Join(dir, ".*")); len(left) > 0 {
		t.Errorf("an interrupted run left %v", left)
	}
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
