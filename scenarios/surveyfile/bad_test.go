package surveyfile

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

var update = flag.Bool("update", false, "rewrite testdata/bad_*.txt with what is told now; inspect the diff")

// badCase is a block of testdata/bad_*.txt: the good survey with one text
// replaced in a file, and every message that must come of it.
//
//	# name of the case
//	- file: old text
//	+ new text
//	messages, one a line
//
// \n in the texts stands for a new line. A block may replace several texts.
type badCase struct {
	name  string
	edits []string // the lines with - and +
	want  []string
}

func readBadCases(t *testing.T, path string) []badCase {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var cases []badCase
	for _, block := range strings.Split(strings.TrimSpace(string(text)), "\n\n") {
		var c badCase
		for _, line := range strings.Split(block, "\n") {
			switch {
			case strings.HasPrefix(line, "# "):
				c.name = line[2:]
			case strings.HasPrefix(line, "- "), strings.HasPrefix(line, "+ "), line == "+":
				c.edits = append(c.edits, line)
			default:
				c.want = append(c.want, line)
			}
		}
		cases = append(cases, c)
	}
	return cases
}

// apply makes the case's files.
func (c *badCase) apply(t *testing.T) string {
	t.Helper()
	files := map[string]string{"survey.yaml": good(t, "survey.yaml"), "fields.csv": good(t, "fields.csv")}
	unescape := strings.NewReplacer(`\n`, "\n", `\t`, "\t", `\0`, "\x00", `\xff`, "\xff")
	for i := 0; i+1 < len(c.edits); i += 2 {
		file, old, ok := strings.Cut(strings.TrimPrefix(c.edits[i], "- "), ": ")
		if !ok || !strings.HasPrefix(c.edits[i], "- ") || !strings.HasPrefix(c.edits[i+1], "+") {
			t.Fatalf("%q and %q are no edit", c.edits[i], c.edits[i+1])
		}
		old, text := unescape.Replace(old), unescape.Replace(strings.TrimPrefix(strings.TrimPrefix(c.edits[i+1], "+"), " "))
		switch old {
		case "NEW", "WHOLE":
			files[file] = text
		default:
			if !strings.Contains(files[file], old) {
				t.Fatalf("%s has no %q", file, old)
			}
			files[file] = strings.Replace(files[file], old, text, 1)
		}
	}
	dir := t.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// Each piece of bad input is told in exactly these words, and nothing else is.
func TestBadInputIsToldWhereAndHow(t *testing.T) {
	paths, err := filepath.Glob("testdata/bad_*.txt")
	if err != nil || len(paths) == 0 {
		t.Fatalf("no cases: %v", err)
	}
	for _, path := range paths {
		cases := readBadCases(t, path)
		for i := range cases {
			c := &cases[i]
			t.Run(c.name, func(t *testing.T) {
				dir := c.apply(t)
				sv, _, issues := Load(dir)
				got := told(dir, issues)
				if *update {
					c.want = got
				} else if d := cmp.Diff(c.want, got); d != "" {
					t.Errorf("want -, got +:\n%s", d)
				}
				if len(issues) == 0 {
					t.Error("nothing is told")
				}
				if (sv == nil) != (Faults(issues) > 0) {
					t.Errorf("a survey came out: %v, with %d faults", sv != nil, Faults(issues))
				}
				for _, i := range issues {
					if i.File == "" || i.Line < 1 || i.What == "" || i.Want == "" {
						t.Errorf("the issue %#v lacks something", i)
					}
				}
			})
		}
		if *update {
			writeBadCases(t, path, cases)
		}
	}
}

func writeBadCases(t *testing.T, path string, cases []badCase) {
	t.Helper()
	var blocks []string
	for _, c := range cases {
		lines := append([]string{"# " + c.name}, c.edits...)
		blocks = append(blocks, strings.Join(append(lines, c.want...), "\n"))
	}
	if err := os.WriteFile(path, []byte(strings.Join(blocks, "\n\n")+"\n"), 0o644); err != nil {
		t.Fatal(err)
	}
}
