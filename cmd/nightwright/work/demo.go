package work

import (
	"bytes"
	"context"
	"os"
	"path/filepath"

	"nightwright/scenarios/starter"
)

// DemoResult says what a demo wrote.
type DemoResult struct {
	Survey *Survey
	Plan   *PlanResult
	Sheets []string // text files; .csv and .html stand beside them
	Report string   // the page
}

// Demo writes the demo survey into a folder, plans it, audits the plan, and
// writes the sheets of each telescope's first night and the report. A folder that already
// holds the demo, unchanged, is used again; any other that isn't empty is
// refused.
func Demo(ctx context.Context, dir string, ask PlanAsk, o Options) (*DemoResult, error) {
	o.tell("survey", 0, 1)
	if err := demoFolder(dir); err != nil {
		return nil, err
	}
	s, err := ReadSurvey(dir)
	if err != nil {
		return nil, err
	}
	o.tell("survey", 1, 1)
	ask.Out = filepath.Join(dir, "plan")
	plan, err := Plan(ctx, s, ask, o)
	if err != nil {
		return nil, err
	}
	sheets, err := FirstSheets(ctx, s, plan.Tables, filepath.Join(dir, "sheets"), o)
	if err != nil {
		return nil, err
	}
	page, err := s.report(ctx, plan.Tables, ReportAsk{Out: reportFile(plan.Folder)}, o)
	if err != nil {
		return nil, err
	}
	return &DemoResult{s, plan, sheets, page.Page}, nil
}

// demoFolder makes sure that a folder holds the demo survey.
func demoFolder(dir string) error {
	what := occupied(dir)
	if what == "" {
		return starter.Write(dir, "demo", 0)
	}
	files, err := starter.Files("demo", 0)
	if err != nil {
		return err
	}
	for name, want := range files {
		got, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil || !bytes.Equal(got, want) {
			return Inputf("%s %s and not the demo as it comes; give another folder, or run 'nightwright plan %s' if it is your survey", dir, what, dir)
		}
	}
	return nil
}
