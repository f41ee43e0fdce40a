package work

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"

	"github.com/google/renameio/v2"

	"nightwright/cmd/nightwright/report"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler/tables"
)

// ReportAsk says what to report.
type ReportAsk struct {
	Out      string // the page; "": beside the plan folder, its name with -report.html
	Pictures string // folder for each picture as SVG and PNG; "": none
	Night    string // the night that is drawn; "": the one whose hours are worth most
	Forecast string // folder of a forecast of this plan; "": none
	Compare  string // folder of a comparison of networks; "": none
	// Beside looks for folders forecast and comparison beside the plan when
	// none was named; those that aren't of this plan are left out.
	Beside bool
}

// ReportResult says what was written.
type ReportResult struct {
	Page     string   `json:"report"`
	Bytes    int      `json:"bytes"`
	Pictures []string `json:"pictures"`
	Forecast string   `json:"forecast"` // folders that were used; "": none
	Compare  string   `json:"comparison"`
	LeftOut  []string `json:"left_out"` // what stood beside the plan and isn't of it
}

// pictureScale is how many dots of a PNG stand for a pixel of its picture.
const pictureScale = 2

// Report makes the report of a plan. Nothing but the plan folder is read.
func Report(ctx context.Context, dir string, ask ReportAsk, o Options) (*ReportResult, error) {
	pt, err := ReadPlan(dir)
	if err != nil {
		return nil, err
	}
	s, err := planSurvey(dir)
	if err != nil {
		return nil, err
	}
	if ask.Out == "" {
		ask.Out = reportFile(dir)
	}
	if info, err := os.Stat(ask.Out); err == nil && info.IsDir() {
		return nil, Inputf("the report can't go to %s: it is a folder; want a file name", ask.Out)
	}
	left := nearby(dir, &ask, s, pt)
	r, err := s.report(ctx, pt, ask, o)
	if err != nil {
		return nil, err
	}
	r.Forecast, r.Compare, r.LeftOut = ask.Forecast, ask.Compare, left
	return r, nil
}

// reportFile is where the report of a plan folder goes unless told otherwise.
func reportFile(dir string) string { return filepath.Clean(dir) + "-report.html" }

// report makes the report of a plan of this survey.
func (s *Survey) report(ctx context.Context, pt *tables.PlanTables, ask ReportAsk, o Options) (*ReportResult, error) {
	r, text, err := s.reportPage(ctx, pt, ask, o)
	if err != nil {
		return nil, err
	}
	out := &ReportResult{Page: ask.Out, Bytes: len(text), Pictures: []string{}}
	if ask.Pictures != "" {
		if out.Pictures, err = writePictures(ctx, r, ask.Pictures); err != nil {
			return nil, err
		}
	}
	if err := renameio.WriteFile(ask.Out, text, 0o644); err != nil {
		return nil, err
	}
	o.tell("report", 1, 1)
	return out, nil
}

// ReportPage makes the page of a report and writes nothing.
func ReportPage(ctx context.Context, s *Survey, pt *tables.PlanTables, ask ReportAsk, o Options) ([]byte, error) {
	_, text, err := s.reportPage(ctx, pt, ask, o)
	return text, err
}

func (s *Survey) reportPage(ctx context.Context, pt *tables.PlanTables, ask ReportAsk, o Options) (*report.Report, []byte, error) {
	if err := s.OpenCalendar(ctx, o); err != nil {
		return nil, nil, err
	}
	o.tell("report", 0, 1)
	sum, err := planSum(pt)
	if err != nil {
		return nil, nil, err
	}
	in := report.Input{
		Tables: pt, Survey: s.Survey, Exact: s.Exact, Calendar: s.Calendar, Night: ask.Night, PlanSum: sum, Workers: o.Workers,
	}
	if ask.Forecast != "" {
		if in.Forecast, err = s.forecastOf(ask.Forecast, pt); err != nil {
			return nil, nil, err
		}
	}
	if ask.Compare != "" {
		if err := s.comparisonOf(ask.Compare, &in); err != nil {
			return nil, nil, err
		}
	}
	r, err := report.Build(ctx, in)
	if err != nil {
		if ctx.Err() != nil {
			return nil, nil, ctx.Err()
		}
		return nil, nil, &InputError{What: err.Error()}
	}
	var b bytes.Buffer
	if err := r.WriteHTML(&b); err != nil {
		return nil, nil, err
	}
	return r, b.Bytes(), nil
}

// writePictures writes each picture as SVG and PNG.
func writePictures(ctx context.Context, r *report.Report, dir string) ([]string, error) {
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return nil, err
	}
	var out []string
	for _, c := range r.Pictures {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		var b bytes.Buffer
		if err := c.PNG(&b, pictureScale); err != nil {
			return nil, err
		}
		for suffix, text := range map[string][]byte{".svg": c.SVG(), ".png": b.Bytes()} {
			if err := renameio.WriteFile(filepath.Join(dir, c.Name+suffix), text, 0o644); err != nil {
				return nil, err
			}
		}
		out = append(out, filepath.Join(dir, c.Name+".svg"), filepath.Join(dir, c.Name+".png"))
	}
	return out, nil
}

// planSurvey reads the survey that a plan folder keeps: the same files that
// its plan was made from.
func planSurvey(dir string) (*Survey, error) {
	files, err := tables.ReadSurvey(dir)
	if err != nil {
		return nil, &InputError{What: err.Error()}
	}
	name := surveyFileOf(files)
	if name == "" {
		return nil, Inputf("%s keeps no survey file; want a plan folder as 'nightwright plan SURVEY' writes it", dir)
	}
	return ReadSurvey(filepath.Join(dir, "survey", filepath.FromSlash(name)))
}

// surveyFileOf picks the survey file: survey.yaml, or the only other YAML file
// beside it.
func surveyFileOf(files []tables.SurveyFile) string {
	name := ""
	for _, f := range files {
		if f.Name == surveyfile.FileName || name == "" && (strings.HasSuffix(f.Name, ".yaml") || strings.HasSuffix(f.Name, ".yml")) {
			name = f.Name
		}
	}
	return name
}
