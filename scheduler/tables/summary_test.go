package tables

import (
	"encoding/json"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestSummaryText(t *testing.T) {
	s := tinyPlan().Summary
	text, err := s.Encode()
	if err != nil {
		t.Fatal(err)
	}
	var names map[string]any
	if err := json.Unmarshal(text, &names); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"coverage", "ceiling", "gap", "visits_got", "visits_wanted", "fields_finished", "fields_wanted", "hours", "programs", "sites", "seed", "effort", "survey_files", "tables", "program_version"} {
		if _, ok := names[name]; !ok {
			t.Errorf("plan.json has no %q:\n%s", name, text)
		}
	}
	if !strings.Contains(string(text), `"program": "wide <&>"`) || !strings.HasSuffix(string(text), "\n}\n") {
		t.Errorf("text:\n%s", text)
	}
	got, err := DecodeSummary("plan.json", text)
	if err != nil {
		t.Fatal(err)
	}
	again, err := got.Encode()
	if d := cmp.Diff(string(text), string(again)); d != "" || err != nil {
		t.Errorf("%v:\n%s", err, d)
	}
	s.Gap = math.NaN()
	if _, err := s.Encode(); err == nil {
		t.Error("NaN was written")
	}
}

func TestSummaryRefuses(t *testing.T) {
	text, err := tinyPlan().Summary.Encode()
	if err != nil {
		t.Fatal(err)
	}
	swap := func(old, new string) string {
		if !strings.Contains(string(text), old) {
			t.Fatalf("no %q in\n%s", old, text)
		}
		return strings.Replace(string(text), old, new, 1)
	}
	tests := []struct{ name, text, want string }{
		{"number", swap(`"coverage": 0.25`, `"coverage": 0.75`), "it was changed"},
		{"dropped", swap("  \"gap\": 0.5,\n", ""), "it was changed"},
		{"unknown", swap(`"gap": 0.5`, `"gap": 0.5, "hint": 1`), `unknown field "hint"`},
		{"type", swap(`"seed": 7`, `"seed": "7"`), "want the summary as it was written"},
		{"version", swap(`"schema_version": "1"`, `"schema_version": "2"`), `its schema_version is "2"; want "1"`},
		{"kind", swap(SummaryKind, "floor plan"), `its kind is "floor plan"`},
		{"case", swap(`"gap"`, `"GAP"`), "it was changed"},
		{"more", string(text) + "{}", "it is no JSON"},
		{"half", string(text[:len(text)/2]), "it is no JSON"},
		{"empty", "", "it is no JSON"},
		{"list", "[]", "it is no JSON"},
	}
	for _, tt := range tests {
		if _, err := DecodeSummary("x/plan.json", []byte(tt.text)); err == nil || !strings.Contains(err.Error(), tt.want) || !strings.HasPrefix(err.Error(), "x/plan.json: ") {
			t.Errorf("%s: %v; want %q", tt.name, err, tt.want)
		}
	}
}
