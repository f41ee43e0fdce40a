package work

import (
	"strings"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// TestSheetOfAnotherSurveysPlanIsRefused: an empty list from the wrong plan
// looks like a night off.
func TestSheetOfAnotherSurveysPlanIsRefused(t *testing.T) {
	s := &Survey{Survey: &survey.Survey{Name: "Copper Month"}}
	pt := &tables.PlanTables{}
	pt.Summary.Survey = "Polar Loom"
	_, err := Sheet(t.Context(), s, pt, "C1", "2027-03-01", Options{})
	if err == nil || !strings.Contains(err.Error(), `"Polar Loom"`) {
		t.Errorf("error %v; want one that names the plan's survey", err)
	}
}
