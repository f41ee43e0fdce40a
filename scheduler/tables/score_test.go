package tables

import (
	"strings"
	"testing"

	"nightwright/constraints/survey"
)

// paper is a survey small enough to count on paper: field A (weight 2) wants
// two visits and one set of two exposures, field B (weight 1 x program 3) one
// visit; the bonus is 0.5.
func paper() *survey.Survey {
	rules := survey.Rules{MinQuality: 0.2}
	return &survey.Survey{
		FinishBonus: 0.5,
		Programs: []survey.Program{
			{Name: "p", Weight: 1, Demands: []survey.Demand{
				{Name: "one", Visits: 2, Exposures: make([]survey.Exposure, 1)}, {Name: "set", Visits: 1, Exposures: make([]survey.Exposure, 2)},
			}},
			{Name: "q", Weight: 3, Demands: []survey.Demand{{Name: "one", Visits: 1, Exposures: make([]survey.Exposure, 1)}}},
		},
		Fields: []survey.Field{
			{Name: "A", Program: 0, Weight: 2, Rules: []survey.Rules{rules, rules}}, {Name: "B", Program: 1, Weight: 1, Rules: []survey.Rules{rules}},
		},
	}
}

func row(field, program, demand string, set, start int64, q float64) VisitRow {
	return VisitRow{Field: field, Program: program, Demand: demand, Set: set, Start: start, Quality: q, State: "planned"}
}

// TestCoverageOnPaper writes the expected coverage out as the formula's sum:
// the weights are 2 and 3, A wants 3 visits and B 1, and 1 + b = 1.5.
func TestCoverageOnPaper(t *testing.T) {
	const b, weights = 0.5, 2 + 3.0
	a1, a2 := row("A", "p", "one", 0, 10, 0.5), row("A", "p", "one", 0, 20, 0.75)
	s1, s2 := row("A", "p", "set", 4, 30, 0.5), row("A", "p", "set", 4, 31, 1)
	b1 := row("B", "q", "one", 0, 10, 0.25)
	low := row("B", "q", "one", 0, 5, 0.125)
	tests := []struct {
		name     string
		rows     []VisitRow
		coverage float64
		got      int64
		finished int64
	}{
		{"nothing", nil, 0, 0, 0},
		{"one visit", []VisitRow{a1}, 2 * (0.5 / 3) / ((1 + b) * weights), 1, 0},
		{"two visits", []VisitRow{a2, a1}, 2 * (0.5 + 0.75) / 3 / ((1 + b) * weights), 2, 0},
		{"one too many, the earliest count", []VisitRow{a1, a2, row("A", "p", "one", 0, 25, 1)}, 2 * (0.5 + 0.75) / 3 / ((1 + b) * weights), 2, 0},
		{"half a set earns nothing", []VisitRow{s1}, 0, 0, 0},
		{"a set earns its mean", []VisitRow{s2, s1}, 2 * 0.75 / 3 / ((1 + b) * weights), 1, 0},
		{"two halves are no set", []VisitRow{s1, row("A", "p", "set", 5, 40, 1)}, 0, 0, 0},
		{"finished A", []VisitRow{a1, a2, s1, s2}, 2 * ((0.5+0.75+0.75)/3 + b) / ((1 + b) * weights), 3, 1},
		{"finished B", []VisitRow{b1}, 3 * (0.25 + b) / ((1 + b) * weights), 1, 1},
		{"below min_quality", []VisitRow{low}, 0, 0, 0},
		{"below min_quality, then above", []VisitRow{low, b1}, 3 * (0.25 + b) / ((1 + b) * weights), 1, 1},
		{"all", []VisitRow{a1, b1, a2, s1, s2}, (2*((0.5+0.75+0.75)/3+b) + 3*(0.25+b)) / ((1 + b) * weights), 4, 2},
	}
	for _, tt := range tests {
		s, err := Coverage(paper(), tt.rows)
		if err != nil || !near(s.Coverage, tt.coverage, 1e-15) || s.VisitsGot != tt.got || s.FieldsFinished != tt.finished || s.VisitsWanted != 4 || s.FieldsWanted != 2 {
			t.Errorf("%s: %+v, %v; want coverage %.15g, %d visits, %d finished", tt.name, s, err, tt.coverage, tt.got, tt.finished)
		}
	}
	perfect := []VisitRow{row("A", "p", "one", 0, 1, 1), row("A", "p", "one", 0, 2, 1), row("A", "p", "set", 1, 3, 1), row("A", "p", "set", 1, 4, 1), row("B", "q", "one", 0, 1, 1)}
	if s, err := Coverage(paper(), perfect); err != nil || !near(s.Coverage, 1, 1e-15) {
		t.Errorf("everything at quality 1: %+v, %v; want coverage 1", s, err)
	}
}

func TestCoverageRefusesStrangers(t *testing.T) {
	for _, r := range []VisitRow{row("C", "p", "one", 0, 1, 1), row("A", "p", "two", 0, 1, 1), row("A", "q", "one", 0, 1, 1)} {
		if _, err := Coverage(paper(), []VisitRow{r}); err == nil || !strings.Contains(err.Error(), "want the survey that the plan was made for") {
			t.Errorf("%s %s %s: %v; want an error", r.Field, r.Program, r.Demand, err)
		}
	}
}
