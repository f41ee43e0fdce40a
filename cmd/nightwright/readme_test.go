package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// TestReadmeSessionsAreReal runs the terminal sessions that the README shows
// and compares: what stands there is what the program prints. With -update it
// writes them anew.
func TestReadmeSessionsAreReal(t *testing.T) {
	readme, err := filepath.Abs(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	small, err := filepath.Abs(filepath.Join("testdata", "small"))
	if err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(readme)
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	demo, _ := session(t, exitDone, "demo", "--quiet")
	demo, _, ok := strings.Cut(demo, "\nCheapest nights")
	if !ok {
		t.Fatalf("the demo's summary has no cheapest nights: %s", demo)
	}
	if err := os.CopyFS("mysurvey", os.DirFS(small)); err != nil {
		t.Fatal(err)
	}
	spoil(t, "mysurvey/survey.yaml", "exposure: 300s", "exposuer: 300s", "latitude_deg: 33.2", "latitude_deg: 91")
	_, faults := session(t, exitInput, "check", "mysurvey")
	blocks := map[string]string{
		"$ go run ./cmd/nightwright demo\n": demo + "[...]\n",
		"$ nightwright check mysurvey\n":    faults,
	}
	got := string(text)
	for command, want := range blocks {
		before, rest, ok := strings.Cut(got, "```text\n"+command)
		if !ok {
			t.Errorf("the README has no block that begins with %q", command)
			continue
		}
		block, after, _ := strings.Cut(rest, "```\n")
		if d := cmp.Diff(want, block); d != "" && !*update {
			t.Errorf("the README's session %q differs from what the program prints (-program +README); if that is meant, run the test with -update:\n%s", command, d)
		}
		got = before + "```text\n" + command + want + "```\n" + after
	}
	if *update {
		if err := os.WriteFile(readme, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// session runs the program and returns what it printed.
func session(t *testing.T, want int, args ...string) (stdout, stderr string) {
	t.Helper()
	t.Setenv("XDG_CONFIG_HOME", t.TempDir()) // no settings of whoever runs the test
	var out, msg bytes.Buffer
	if code := Run(args, strings.NewReader(""), &out, &msg); code != want {
		t.Fatalf("%q: exit %d; want %d: %s", args, code, want, msg.String())
	}
	return out.String(), msg.String()
}

// spoil replaces texts in a file, each old one followed by its new one.
func spoil(t *testing.T, file string, pairs ...string) {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	for i := 0; i < len(pairs); i += 2 {
		if !bytes.Contains(text, []byte(pairs[i])) {
			t.Fatalf("%s has no %q", file, pairs[i])
		}
		text = bytes.Replace(text, []byte(pairs[i]), []byte(pairs[i+1]), 1)
	}
	if err := os.WriteFile(file, text, 0o644); err != nil {
		t.Fatal(err)
	}
}
