package tables

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

var surveyFiles = []SurveyFile{
	{"survey.yaml", []byte("survey: Ember Arc\n")},
	{"lists/fields.csv", []byte("field,ra_deg,dec_deg,program\n")},
}

// tinyPlan has a few rows in each table.
func tinyPlan() *PlanTables {
	return &PlanTables{
		Summary: Summary{
			Program: "0.1.0", Survey: "Ember Arc", FirstNight: "2027-02-01", LastNight: "2027-02-03", Seed: 7, Effort: "quick", Status: "steps_done",
			Score: Score{0.25, 3, 12, 1, 4}, Ceiling: 0.5, Gap: 0.5, Programs: []ProgramSummary{{Program: "wide <&>", Share: 1}}, Search: []Counter{},
		},
		Visits: sampleRows[VisitRow](5), Fields: sampleRows[FieldRow](4), Demands: sampleRows[DemandRow](4), Nights: sampleRows[NightRow](3), Prices: sampleRows[PriceRow](6),
	}
}

func writePlan(t *testing.T, dir string, pt *PlanTables) {
	t.Helper()
	if err := WriteFolder(dir, pt, surveyFiles); err != nil {
		t.Fatal(err)
	}
}

// sortPlan brings rows into the order in which they are read.
func sortPlan(pt *PlanTables) *PlanTables {
	Visits.Sort(pt.Visits)
	Fields.Sort(pt.Fields)
	Demands.Sort(pt.Demands)
	Nights.Sort(pt.Nights)
	Prices.Sort(pt.Prices)
	return pt
}

// snapshot reads a folder's files.
func snapshot(t *testing.T, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	err := fs.WalkDir(os.DirFS(dir), ".", func(name string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		data, err := os.ReadFile(filepath.Join(dir, name))
		out[name] = string(data)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func TestFolderRoundTrip(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "plan")
	for _, changes := range [][]ChangeRow{nil, {}, sampleRows[ChangeRow](2)} {
		pt := sortPlan(tinyPlan())
		pt.Changes = changes
		writePlan(t, dir, pt)
		got, err := ReadFolder(dir)
		if err != nil {
			t.Fatal(err)
		}
		got.Summary.Checksum = "" // WriteFolder's own is in the file alone
		pt.Summary.SchemaVersion, pt.Summary.Kind = SchemaVersion, SummaryKind
		if d := cmp.Diff(pt, got); d != "" {
			t.Errorf("(-written +read):\n%s", d)
		}
		if (got.Changes == nil) != (changes == nil) {
			t.Errorf("changes %v; want nil to mean no such table", got.Changes)
		}
	}
	files, err := ReadSurvey(dir)
	if err != nil || len(files) != 2 || files[0].Name != "lists/fields.csv" || !bytes.Equal(files[1].Data, surveyFiles[0].Data) {
		t.Errorf("survey files: %q, %v", files, err)
	}
}

func TestFolderIsTheSameEachTime(t *testing.T) {
	a, b := filepath.Join(t.TempDir(), "plan"), filepath.Join(t.TempDir(), "other")
	writePlan(t, a, tinyPlan())
	writePlan(t, b, tinyPlan())
	writePlan(t, b, tinyPlan()) // replacing leaves nothing behind
	if d := cmp.Diff(snapshot(t, a), snapshot(t, b)); d != "" {
		t.Errorf("two writes differ:\n%s", d)
	}
	if names, _ := os.ReadDir(filepath.Dir(b)); len(names) != 1 {
		t.Errorf("left beside the plan: %v", names)
	}
}

// TestFolderIsReplacedWhole goes both ways of replacing, and breaks the
// second way off between its two renames.
func TestFolderIsReplacedWhole(t *testing.T) {
	defer func(old func(a, b string) error) { swap = old }(swap)
	for name, way := range map[string]func(a, b string) error{
		"in one step": exchange, "by renames": func(a, b string) error { return errors.ErrUnsupported },
	} {
		if err := way("", ""); name == "in one step" && errors.Is(err, errors.ErrUnsupported) {
			continue
		}
		swap = way
		dir := filepath.Join(t.TempDir(), "plan")
		writePlan(t, dir, tinyPlan())
		second := tinyPlan()
		second.Summary.Seed, second.Prices = 8, nil
		writePlan(t, dir, second)
		if got, err := ReadFolder(dir); err != nil || got.Summary.Seed != 8 || len(got.Prices) != 0 {
			t.Errorf("%s: %v", name, err)
		}
		if names, _ := os.ReadDir(filepath.Dir(dir)); len(names) != 1 {
			t.Errorf("%s: left beside the plan: %v", name, names)
		}
		// As if the program had been killed between the renames.
		if err := os.Rename(dir, asideName(dir)); err != nil {
			t.Fatal(err)
		}
		if got, err := ReadFolder(dir); err != nil || got.Summary.Seed != 8 {
			t.Errorf("%s, cut short: %v; want the old plan", name, err)
		}
		writePlan(t, dir, tinyPlan())
		if got, err := ReadFolder(dir); err != nil || got.Summary.Seed != 7 {
			t.Errorf("%s, after a cut: %v", name, err)
		}
		if names, _ := os.ReadDir(filepath.Dir(dir)); len(names) != 1 {
			t.Errorf("%s: left beside the plan after a cut: %v", name, names)
		}
	}
}

func TestFolderLeavesAllElseAlone(t *testing.T) {
	top := t.TempDir()
	file, full, empty := filepath.Join(top, "file"), filepath.Join(top, "full"), filepath.Join(top, "empty")
	for _, d := range []string{full, empty} {
		if err := os.Mkdir(d, 0o755); err != nil {
			t.Fatal(err)
		}
	}
	for _, f := range []string{file, filepath.Join(full, "thesis.tex"), filepath.Join(full, "plan.json")} {
		if err := os.WriteFile(f, []byte("{\"kind\": \"floor plan\"}"), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	before := snapshot(t, top)
	for _, dir := range []string{file, full, filepath.Join(top, "no", "such")} {
		if err := WriteFolder(dir, tinyPlan(), surveyFiles); err == nil {
			t.Errorf("%s was written over", dir)
		}
	}
	for _, name := range []string{"../up.yaml", "/etc/x", "", ".", "a//b", `a\b`} {
		if err := WriteFolder(empty, tinyPlan(), []SurveyFile{{name, nil}}); err == nil || !strings.Contains(err.Error(), "inside the survey folder") {
			t.Errorf("survey file %q: %v; want it refused", name, err)
		}
	}
	if err := WriteFolder(empty, tinyPlan(), append(surveyFiles, surveyFiles[0])); err == nil || !strings.Contains(err.Error(), "twice") {
		t.Errorf("a file twice: %v", err)
	}
	if d := cmp.Diff(before, snapshot(t, top)); d != "" {
		t.Errorf("something was touched:\n%s", d)
	}
	writePlan(t, empty, tinyPlan())
	if _, err := ReadFolder(empty); err != nil {
		t.Error(err)
	}
}

// TestFlippedBytesAreFound flips one byte at many places of every file of a
// plan folder.
func TestFlippedBytesAreFound(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "plan")
	pt := tinyPlan()
	pt.Changes = sampleRows[ChangeRow](3)
	writePlan(t, dir, pt)
	flips := 0
	for name, text := range snapshot(t, dir) {
		at := filepath.Join(dir, name)
		for i := 0; i < len(text); i += 1 + len(text)/200 {
			bad := []byte(text)
			bad[i] ^= 1 << (flips % 8)
			flips++
			if err := os.WriteFile(at, bad, 0o644); err != nil {
				t.Fatal(err)
			}
			if _, err := ReadFolder(dir); err == nil || !strings.Contains(err.Error(), filepath.Base(name)) && !strings.Contains(err.Error(), summaryName) {
				t.Errorf("%s, byte %d: %v; want an error that names it", name, i, err)
			}
		}
		for _, cut := range []string{"", text[:len(text)/2], text + " "} {
			if err := os.WriteFile(at, []byte(cut), 0o644); err != nil {
				t.Fatal(err)
			}
			if _, err := ReadFolder(dir); err == nil {
				t.Errorf("%s with %d bytes for %d was read", name, len(cut), len(text))
			}
		}
		if err := os.Remove(at); err != nil {
			t.Fatal(err)
		}
		if _, err := ReadFolder(dir); err == nil {
			t.Errorf("the folder was read without %s", name)
		}
		if err := os.WriteFile(at, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	if _, err := ReadFolder(dir); err != nil || flips < 1200 {
		t.Errorf("%d flips; at the end %v", flips, err)
	}
}

// rewrite puts a changed summary, checksum and all, into a plan folder.
func rewrite(t *testing.T, dir string, change func(*Summary)) {
	t.Helper()
	pt, err := ReadFolder(dir)
	if err != nil {
		t.Fatal(err)
	}
	change(&pt.Summary)
	text, err := pt.Summary.Encode()
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, summaryName), text, 0o644); err != nil {
		t.Fatal(err)
	}
}

func TestFolderWithOtherNamesIsRefused(t *testing.T) {
	tests := map[string]struct {
		change func(*Summary)
		want   string
	}{
		"missing table": {func(s *Summary) { s.Tables = s.Tables[1:] }, "visits.parquet is not listed"},
		"other order":   {func(s *Summary) { slices.Reverse(s.Tables) }, "visits.parquet is not listed"},
		"other table":   {func(s *Summary) { s.Tables = append(s.Tables, TableSum{Name: "../secret.parquet"}) }, `"../secret.parquet", which is no table`},
		"row count":     {func(s *Summary) { s.Tables[4].Rows++ }, "it has 6 rows; want 7"},
		"survey file":   {func(s *Summary) { s.Files[0].Name = "../../passwd" }, "want a name inside the survey folder"},
		"a gone file":   {func(s *Summary) { s.Files[0].Name = "gone.csv" }, "it is missing"},
	}
	for name, tt := range tests {
		dir := filepath.Join(t.TempDir(), "plan")
		writePlan(t, dir, tinyPlan())
		rewrite(t, dir, tt.change)
		if _, err := ReadFolder(dir); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: %v; want %q", name, err, tt.want)
		}
	}
	if _, err := ReadFolder(filepath.Join(t.TempDir(), "not")); err == nil || !strings.Contains(err.Error(), "no such folder") {
		t.Errorf("no folder: %v", err)
	}
	if _, err := ReadFolder(t.TempDir()); err == nil || !strings.Contains(err.Error(), "there is no plan.json") {
		t.Errorf("empty folder: %v", err)
	}
}
