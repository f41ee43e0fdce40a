package main

import (
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		os.Exit(Run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr))
	}
	testscript.Main(m, map[string]func(){
		"nightwright": func() { os.Exit(Run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr)) },
	})
}

// TestScripts runs the command lines of testdata/script: one script for each
// command and for each mistake a user makes. Beside the usual script commands
// there are
//
//	exits N nightwright ...   run it and compare its exit code
//	small DIR [SED]...        write testdata/small there, each OLD=NEW replaced
//	columns FILE NAMES        compare the head line of a CSV file
//	mark FILE OUT WORD [COL]  copy a CSV file with WORD over planned in its column kind, COL emptied
//	worth                     the last stdout, JSON of the ledger, has all of the planned credit
//	width N                   no line of the last stdout is wider, commands to paste apart
func TestScripts(t *testing.T) {
	small, err := filepath.Abs(filepath.Join("testdata", "small"))
	if err != nil {
		t.Fatal(err)
	}
	testscript.Run(t, testscript.Params{
		Dir:                 filepath.Join("testdata", "script"),
		RequireExplicitExec: false,
		RequireUniqueNames:  true,
		Setup: func(env *testscript.Env) error {
			env.Setenv("SMALL", small)
			env.Setenv("XDG_CONFIG_HOME", filepath.Join(env.WorkDir, "config"))
			return nil
		},
		Cmds: map[string]func(ts *testscript.TestScript, neg bool, args []string){
			"exits": scriptExits, "small": scriptSmall, "columns": scriptColumns, "width": scriptWidth,
			"mark": scriptMark, "worth": scriptWorth,
		},
	})
}

func scriptExits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits CODE COMMAND...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	code := 0
	if err := ts.Exec(args[1], args[2:]...); err != nil {
		var exit *exec.ExitError
		if !errors.As(err, &exit) {
			ts.Fatalf("%v", err)
		}
		code = exit.ExitCode()
	}
	if code != want {
		ts.Fatalf("exit code %d; want %d", code, want)
	}
}

func scriptSmall(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 1 {
		ts.Fatalf("usage: small DIR [OLD=NEW]...")
	}
	dir := ts.MkAbs(args[0])
	ts.Check(os.MkdirAll(dir, 0o755))
	left := slices.Clone(args[1:])
	for _, name := range []string{"survey.yaml", "fields.csv"} {
		data, err := os.ReadFile(filepath.Join(ts.Getenv("SMALL"), name))
		ts.Check(err)
		text := string(data)
		left = slices.DeleteFunc(left, func(change string) bool {
			old, fresh, _ := strings.Cut(change, "=")
			if !strings.Contains(text, old) {
				return false
			}
			text = strings.Replace(text, old, fresh, 1)
			return true
		})
		ts.Check(os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644))
	}
	if len(left) > 0 {
		ts.Fatalf("testdata/small has nothing to change for %q", left)
	}
}

func scriptColumns(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: columns FILE NAME,NAME...")
	}
	head, _, _ := strings.Cut(ts.ReadFile(args[0]), "\n")
	if head != args[1] {
		ts.Fatalf("columns\n%s\nwant\n%s", head, args[1])
	}
}

func scriptWidth(ts *testscript.TestScript, neg bool, args []string) {
	most, err := strconv.Atoi(args[0])
	ts.Check(err)
	for line := range strings.SplitSeq(ts.ReadFile("stdout"), "\n") {
		if n := len([]rune(line)); n > most && !strings.HasPrefix(line, "  nightwright ") {
			ts.Fatalf("a line of %d columns; want %d at most:\n%s", n, most, line)
		}
	}
}
