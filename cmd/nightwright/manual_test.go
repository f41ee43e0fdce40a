package main

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// TestManualPagesAreSound: mandoc, which knows man(7) and says what is wrong,
// has no error and no warning for any page, and shows the whole text.
func TestManualPagesAreSound(t *testing.T) {
	if _, err := exec.LookPath("mandoc"); err != nil {
		if os.Getenv(requireAll) == "1" {
			t.Fatal("mandoc is missing")
		}
		t.Skip("mandoc is missing")
	}
	root := (&app{}).root()
	dir := t.TempDir()
	for _, c := range append(pagesOf(root), root) {
		file := filepath.Join(dir, pageName(c)+".1")
		if err := os.WriteFile(file, manPage(c), 0o644); err != nil {
			t.Fatal(err)
		}
		out, _ := exec.Command("mandoc", "-T", "lint", "-W", "warning", file).CombinedOutput()
		for _, line := range strings.Split(strings.TrimSpace(string(out)), "\n") {
			if line != "" && !strings.Contains(line, "missing date") { // none, so that pages are the same each day
				t.Errorf("%s", line)
			}
		}
		shown, err := exec.Command("mandoc", "-T", "ascii", "-O", "width=160", file).Output()
		if err != nil {
			t.Errorf("%s: %v", c.Name(), err)
			continue
		}
		plain := overstrike(string(shown))
		for _, want := range []string{"NAME", "EXAMPLES", "EXIT STATUS", c.Short} {
			if !strings.Contains(plain, want) {
				t.Errorf("%s: the page shows no %q", c.Name(), want)
			}
		}
		for _, line := range strings.Split(strings.TrimSpace(c.Long), "\n") {
			if !strings.Contains(plain, strings.TrimSpace(line)) {
				t.Errorf("%s: the page loses the line %q", c.Name(), line)
			}
		}
	}
}

// overstrike takes bold and underline of terminals away: a letter, a
// backspace, the letter.
func overstrike(text string) string {
	var out []rune
	for _, r := range text {
		if r == '\b' && len(out) > 0 {
			out = out[:len(out)-1]
			continue
		}
		out = append(out, r)
	}
	return string(out)
}
