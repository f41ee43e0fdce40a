package sheet

import (
	"encoding/csv"
	"flag"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
)

var update = flag.Bool("update", false, "rewrite the golden sheets; look at the difference before you commit it")

func golden(t *testing.T, name, got string) {
	t.Helper()
	file := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(want), got); d != "" {
		t.Errorf("%s (-golden +now):\n%s", name, d)
	}
}

func TestText(t *testing.T) {
	f := busy(t)
	for name, s := range map[string]*Sheet{"busy.txt": f.sheet(t, "C1", 0), "empty.txt": f.sheet(t, "C1", 1)} {
		var b strings.Builder
		if err := s.WriteText(&b); err != nil {
			t.Fatal(err)
		}
		for i, line := range strings.Split(b.String(), "\n") {
			if n := utf8.RuneCountInString(line); n > width || strings.TrimRight(line, " ") != line {
				t.Errorf("%s:%d: %d columns, or blanks at the end: %q", name, i+1, n, line)
			}
		}
		golden(t, name, b.String())
	}
}

func TestTextHasWhatIsNeeded(t *testing.T) {
	var b strings.Builder
	s := busy(t).sheet(t, "C1", 0)
	if err := s.WriteText(&b); err != nil {
		t.Fatal(err)
	}
	text := b.String()
	for _, want := range []string{
		"telescope C1", "2027-03-09", "Cinder Ridge", "04:00:00.0  21:00:00 -07:00", "LST", "E000", "10:00:00.00 -05:00:00.0", "60 s",
		"FILTER g -> r", "standards", "focus", "[1/2]", "airmass", "Moon", "Sun", "emergency stop", "interlock", "UT1-UTC", "come first",
	} {
		if !strings.Contains(text, want) {
			t.Errorf("no %q in\n%s", want, text)
		}
	}
	if !strings.Contains(text, "ümläuts and all") {
		t.Error("a long name was cut")
	}
}

func TestCSV(t *testing.T) {
	s := busy(t).sheet(t, "C1", 0)
	var b strings.Builder
	if err := s.WriteCSV(&b); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(strings.NewReader(b.String())).ReadAll()
	if err != nil || len(rows) != len(s.Lines)+1 {
		t.Fatalf("%d rows of %d lines, %v", len(rows), len(s.Lines), err)
	}
	column := map[string]int{}
	for i, name := range rows[0] {
		column[name] = i
	}
	seen := 0
	for i, r := range rows[1:] {
		l := &s.Lines[i]
		if l.Visit == nil {
			if r[0] != "reserved" || r[column["note"]] == "" || r[column["order"]] != "" {
				t.Errorf("%q", r)
			}
			continue
		}
		seen++
		if r[0] != "planned" || r[column["telescope"]] != "C1" || r[column["field"]] != l.Visit.Field || r[column["order"]] != strconv.Itoa(seen) {
			t.Errorf("%q", r)
		}
		if x, err := strconv.ParseFloat(r[column["altitude_deg"]], 64); err != nil || x != l.Visit.Altitude {
			t.Errorf("altitude %s; want %g", r[column["altitude_deg"]], l.Visit.Altitude)
		}
	}
	first := rows[1+indexOf(s, 1)]
	if first[column["start_utc"]] != "2027-03-10T04:00:00Z" || first[column["start_local"]] != "2027-03-09T21:00:00-07:00" || first[column["ra"]] != "10:00:00.00" {
		t.Errorf("%q", first)
	}
	if fourth := rows[1+indexOf(s, 4)]; fourth[column["filter_change"]] != "g>r" || fourth[column["set_step"]] != "2" {
		t.Errorf("%q", fourth)
	}
}

func indexOf(s *Sheet, order int) int {
	for i := range s.Lines {
		if s.Lines[i].Order == order {
			return i
		}
	}
	return -1
}

func TestHTML(t *testing.T) {
	f := busy(t)
	f.sv.Fields[1].Name = `<script>alert("x")</script>`
	s := f.sheet(t, "C1", 0)
	var b strings.Builder
	if err := s.WriteHTML(&b); err != nil {
		t.Fatal(err)
	}
	page := b.String()
	if strings.Contains(page, "<script") || !strings.Contains(page, "&lt;script&gt;") {
		t.Error("a field's name got into the page as code")
	}
	if m := regexp.MustCompile(`(?i)(src|href)\s*=|url\(|@import|https?:`).FindString(page); m != "" {
		t.Errorf("the page fetches something: %s", m)
	}
	if n := strings.Count(page, `class="box"`); n != 6 {
		t.Errorf("%d boxes to tick; want 6", n)
	}
	for _, want := range []string{"@page", "04:00:00", "21:00:00 -07:00", "FILTER g -&gt; r", "standards", "emergency stop"} {
		if !strings.Contains(page, want) {
			t.Errorf("no %q in the page", want)
		}
	}
	b.Reset()
	if err := f.sheet(t, "C1", 1).WriteHTML(&b); err != nil || strings.Count(b.String(), `class="box"`) != 0 || !strings.Contains(b.String(), "standards") {
		t.Errorf("an empty night: %v\n%s", err, b.String())
	}
}

func TestWrap(t *testing.T) {
	tests := []struct {
		text      string
		n, indent int
		want      []string
	}{
		{"short", 10, 0, []string{"short"}},
		{"one two three", 8, 0, []string{"one two", "three"}},
		{"  one two three", 8, 2, []string{"  one", "  two", "  three"}},
		{"! one two", 6, 2, []string{"! one", "  two"}},
		{"unbreakable", 4, 0, []string{"unbr", "eaka", "ble"}},
		{"unbreakable", 6, 3, []string{"unbrea", "   kab", "   le"}},
		{"ümläüt ümläüt", 6, 0, []string{"ümläüt", "ümläüt"}},
	}
	for _, tt := range tests {
		if d := cmp.Diff(tt.want, wrap(tt.text, tt.n, tt.indent)); d != "" {
			t.Errorf("wrap(%q, %d, %d) (-want +got):\n%s", tt.text, tt.n, tt.indent, d)
		}
	}
}
