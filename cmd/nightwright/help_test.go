package main

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

var update = flag.Bool("update", false, "rewrite the golden help texts; look at the difference before you commit it")

// TestHelpIsGolden compares the help of each command with testdata/help. A
// missing and a left-over file fail.
func TestHelpIsGolden(t *testing.T) {
	root := (&app{}).root()
	want := map[string]string{"nightwright": ""}
	for _, c := range root.Commands() {
		if c.IsAvailableCommand() {
			want[c.Name()] = c.Name()
		}
	}
	dir := filepath.Join("testdata", "help")
	for name, command := range want {
		args := []string{"--help"}
		if command != "" {
			args = []string{command, "--help"}
		}
		var out, msg bytes.Buffer
		if code := Run(args, strings.NewReader(""), &out, &msg); code != exitDone || msg.Len() > 0 {
			t.Errorf("%s --help: exit %d, stderr %q", name, code, msg.String())
		}
		file := filepath.Join(dir, name+".txt")
		if *update {
			if err := os.MkdirAll(dir, 0o755); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(file, out.Bytes(), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		golden, err := os.ReadFile(file)
		if err != nil {
			t.Errorf("%v; run the test with -update and look at it", err)
			continue
		}
		if d := cmp.Diff(string(golden), out.String()); d != "" {
			t.Errorf("help of %s (-golden +got); if it is meant, run the test with -update:\n%s", name, d)
		}
	}
	files, err := filepath.Glob(filepath.Join(dir, "*"))
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range files {
		if _, ok := want[strings.TrimSuffix(filepath.Base(f), ".txt")]; !ok {
			t.Errorf("%s belongs to no command; take it away", f)
		}
	}
}

// TestHelpIsReadable: each command has an example that starts with its name,
// and no line is wider than a plain terminal, flags apart.
func TestHelpIsReadable(t *testing.T) {
	for _, c := range (&app{}).root().Commands() {
		if !c.IsAvailableCommand() {
			continue
		}
		if !strings.HasPrefix(c.Example, "  nightwright "+c.Name()) {
			t.Errorf("%s: the example starts %.30q; want a line with the command", c.Name(), c.Example)
		}
		if c.Long == "" {
			t.Errorf("%s: no long help; say what it does and what it leaves", c.Name())
		}
		for line := range strings.SplitSeq(c.Long, "\n") {
			if len(line) > pageWidth {
				t.Errorf("%s: a help line of %d columns; want %d at most: %s", c.Name(), len(line), pageWidth, line)
			}
		}
	}
}
