package surveyfile

import (
	"os"
	"path/filepath"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// FuzzLoad reads any survey file with any field list: nothing may panic,
// every issue has a place and words, the issues are in order, and the same
// bytes give the same survey.
func FuzzLoad(f *testing.F) {
	survey, fields := good(f, "survey.yaml"), good(f, "fields.csv")
	f.Add(survey, fields)
	f.Add("survey: x\nperiod: {first_night: 2027-02-01}\n", "field,ra_deg\n1,2\n")
	f.Add("fields: {file: fields.csv, columns: {ra_deg: x}}\nprograms: &a [*a]\n", "x,\"y\n")
	f.Add("a: &x {b: *x}\n---\n", "\ufeff")
	dir := f.TempDir()
	f.Fuzz(func(t *testing.T, survey, fields string) {
		// A worker runs one input at a time; workers have their own folders.
		mine := filepath.Join(dir, "survey")
		if err := os.MkdirAll(mine, 0o755); err != nil {
			t.Fatal(err)
		}
		for name, text := range map[string]string{"survey.yaml": survey, "fields.csv": fields} {
			if err := os.WriteFile(filepath.Join(mine, name), []byte(text), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		sv, _, issues := Load(mine)
		if (sv == nil) != (Faults(issues) > 0) {
			t.Errorf("survey %v with %d faults", sv != nil, Faults(issues))
		}
		for i, is := range issues {
			if is.File == "" || is.Line < 1 || is.What == "" || is.Want == "" {
				t.Errorf("the issue %#v lacks something", is)
			}
			if i > 0 && issues[i-1].File == is.File && issues[i-1].Line > is.Line {
				t.Errorf("line %d is told after line %d", is.Line, issues[i-1].Line)
			}
		}
		again, _, _ := Load(mine)
		if d := cmp.Diff(sv, again); d != "" {
			t.Errorf("read twice: %s", d)
		}
	})
}
