package page

import (
	"bytes"
	"fmt"
	"math"
	"net/http"
	"slices"
	"strings"

	"nightwright/cmd/nightwright/work"
	"nightwright/constraints/survey"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

const degree = math.Pi / 180

// rounded keeps JSON short: a number with so many decimals.
func rounded(x float64, decimals int) float64 {
	p := math.Pow(10, float64(decimals))
	return math.Round(x*p) / p
}

type siteJSON struct {
	Name      string  `json:"name"`
	Latitude  float64 `json:"latitude_deg"`
	Longitude float64 `json:"longitude_deg"`
	TimeZone  string  `json:"time_zone"`
}

type telescopeJSON struct {
	Name        string  `json:"name"`
	Site        int     `json:"site"`
	AltitudeMin float64 `json:"altitude_min_deg"`
}

type planJSON struct {
	Folder         string  `json:"folder"`
	Coverage       float64 `json:"coverage"`
	Ceiling        float64 `json:"ceiling"`
	Gap            float64 `json:"gap"`
	VisitsGot      int64   `json:"visits_got"`
	VisitsWanted   int64   `json:"visits_wanted"`
	FieldsFinished int64   `json:"fields_finished"`
	FieldsWanted   int64   `json:"fields_wanted"`
	UsedHours      float64 `json:"used_hours"`
	OpenHours      float64 `json:"open_hours"`
	Effort         string  `json:"effort"`
	Seed           uint64  `json:"seed"`
	Checksum       string  `json:"checksum"`
}

func planOf(v *view) planJSON {
	m := &v.plan.Summary
	return planJSON{
		Folder: v.planDir, Coverage: m.Coverage, Ceiling: m.Ceiling, Gap: m.Gap, VisitsGot: m.VisitsGot, VisitsWanted: m.VisitsWanted,
		FieldsFinished: m.FieldsFinished, FieldsWanted: m.FieldsWanted, UsedHours: m.Hours.Used, OpenHours: m.Hours.Open, Effort: m.Effort, Seed: m.Seed, Checksum: m.Checksum,
	}
}

type surveyJSON struct {
	Survey     string          `json:"survey"`
	FirstNight string          `json:"first_night"`
	LastNight  string          `json:"last_night"`
	Sites      []siteJSON      `json:"sites"`
	Telescopes []telescopeJSON `json:"telescopes"`
	Programs   []string        `json:"programs"`
	Filters    []string        `json:"filters"`
	Causes     []string        `json:"causes"`
	Plan       planJSON        `json:"plan"`
	Trial      *trialJSON      `json:"trial"`
	Version    string          `json:"version"`
}

// getSurvey tells what the survey is and what its plan reaches.
func getSurvey(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.books.view(r.Context())
	if err != nil {
		return err
	}
	out := surveyJSON{Survey: v.Name, FirstNight: v.FirstNight.String(), LastNight: v.LastNight.String(), Causes: ledger.Causes(), Plan: planOf(v), Version: s.cfg.Version}
	for i := range v.Sites {
		x := &v.Sites[i]
		out.Sites = append(out.Sites, siteJSON{x.Name, x.Latitude / degree, x.Longitude / degree, x.TimeZone})
	}
	for i := range v.Telescopes {
		x := &v.Telescopes[i]
		out.Telescopes = append(out.Telescopes, telescopeJSON{x.Name, x.Site, x.AltitudeMin / degree})
	}
	for i := range v.Programs {
		out.Programs = append(out.Programs, v.Programs[i].Name)
	}
	for i := range v.Filters {
		out.Filters = append(out.Filters, v.Filters[i].Name)
	}
	out.Trial = s.trialNow()
	return sendJSON(w, r, out)
}

type nightsJSON struct {
	Nights     []string         `json:"nights"`
	Moon       []float64        `json:"moon_illumination"`
	Telescopes []telescopeNight `json:"telescopes"`
}

type telescopeNight struct {
	Telescope string    `json:"telescope"`
	Open      []float64 `json:"open_hours"`
	Used      []float64 `json:"used_hours"`
	Price     []float64 `json:"price_millionths"`
	Visits    []int64   `json:"visits"`
}

// getNights tells of every night what the calendar shows.
func getNights(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.pick(r)
	if err != nil {
		return err
	}
	n := v.Survey.Nights()
	out := nightsJSON{Moon: make([]float64, n)}
	at := map[string]int{}
	for t := range v.Telescopes {
		at[v.Telescopes[t].Name] = t
		out.Telescopes = append(out.Telescopes, telescopeNight{v.Telescopes[t].Name, make([]float64, n), make([]float64, n), make([]float64, n), make([]int64, n)})
	}
	for k := range n {
		out.Nights = append(out.Nights, (v.FirstNight + survey.Day(k)).String())
	}
	for i := range v.plan.Nights {
		x := &v.plan.Nights[i]
		t, ok := at[x.Telescope]
		if k := int(x.Night) - int(v.FirstNight); ok && k >= 0 && k < n {
			o := &out.Telescopes[t]
			o.Open[k], o.Used[k], o.Price[k], o.Visits[k] = rounded(x.OpenHours, 3), rounded(x.UsedHours, 3), rounded(x.PricePerHour*1e6, 3), x.Visits
			out.Moon[k] = rounded(x.MoonIllumination, 3)
		}
	}
	return sendJSON(w, r, out)
}

// getFields lists all fields, in the order of the field list.
func getFields(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.pick(r)
	if err != nil {
		return err
	}
	out := make([]fieldJSON, len(v.rows))
	for i, x := range v.rows {
		out[i] = v.field(i, x)
	}
	return sendJSON(w, r, out)
}

type fieldJSON struct {
	Field    string  `json:"field"`
	Program  int     `json:"program"`
	RA       float64 `json:"ra_deg"`
	Dec      float64 `json:"dec_deg"`
	Weight   float64 `json:"weight"`
	Wanted   int64   `json:"wanted"`
	Planned  int64   `json:"planned"`
	Done     int64   `json:"done"`
	Coverage float64 `json:"coverage"`
	Limited  string  `json:"limited_by"`
}

func (v *view) field(i int, x *tables.FieldRow) fieldJSON {
	return fieldJSON{x.Field, v.Fields[i].Program, rounded(x.RA, 5), rounded(x.Dec, 5), x.Weight, x.VisitsWanted, x.VisitsPlanned, x.VisitsDone, rounded(x.Coverage, 4), x.LimitedBy}
}

type visitJSON struct {
	Visit     int64   `json:"visit"`
	Set       int64   `json:"set"`
	Field     int     `json:"field"`
	Name      string  `json:"name"`
	Program   int     `json:"program"`
	Demand    string  `json:"demand"`
	Filter    string  `json:"filter"`
	Telescope string  `json:"telescope"`
	Night     string  `json:"night"`
	Start     float64 `json:"start"`
	End       float64 `json:"end"`
	Altitude  float64 `json:"altitude_deg"`
	Airmass   float64 `json:"airmass"`
	Moon      float64 `json:"moon_separation_deg"`
	Quality   float64 `json:"quality"`
	State     string  `json:"state"`
}

func (v *view) visit(i int32) visitJSON {
	x := &v.plan.Visits[i]
	f := v.fieldID[x.Field]
	return visitJSON{x.Visit, x.Set, f, x.Field, v.Fields[f].Program, x.Demand, x.Filter, x.Telescope, tables.Date(x.Night), float64(x.Start) / 1e6, float64(x.End) / 1e6,
		rounded(x.Altitude, 2), rounded(x.Airmass, 3), rounded(x.MoonSeparation, 1), rounded(x.Quality, 4), x.State}
}

type storyJSON struct {
	fieldJSON
	UsableHours float64     `json:"usable_hours"`
	Why         string      `json:"why"`
	Visits      []visitJSON `json:"visits"`
}

// getField tells a field's story.
func getField(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.pick(r)
	if err != nil {
		return err
	}
	id, err := v.FieldID(r.URL.Query().Get("name"))
	if err != nil {
		return &statusError{http.StatusNotFound, strings.TrimPrefix(err.Error(), "nightwright: ")}
	}
	row := v.rows[id]
	out := storyJSON{fieldJSON: v.field(id, row), UsableHours: rounded(row.UsableHours, 2), Why: whyWords[row.LimitedBy], Visits: []visitJSON{}}
	for _, k := range v.fields[id] {
		out.Visits = append(out.Visits, v.visit(k))
	}
	return sendJSON(w, r, out)
}

// whyWords says what a word of limited_by means.
var whyWords = map[string]string{
	tables.LimitNothing:     "It gets all its visits.",
	tables.LimitTelescope:   "No telescope may serve one of its demands.",
	tables.LimitWindows:     "The rules leave no open time into which an exposure fits.",
	tables.LimitQuality:     "In the middle of no window is quality as high as the least that is asked.",
	tables.LimitCadence:     "The spacing that is asked for leaves room for fewer visits than are wanted.",
	tables.LimitCompetition: "There was room, but the time was worth more to other fields.",
}

// getSheet gives one telescope's list for one night to keep or print.
func getSheet(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.books.view(r.Context())
	if err != nil {
		return err
	}
	q := r.URL.Query()
	if _, err := v.night(q.Get("night")); err != nil {
		return err
	}
	form := q.Get("form")
	if form == "" {
		form = "html"
	}
	if !slices.Contains(work.SheetForms(), form) {
		return wrong(fmt.Sprintf("form is %q; want %s", form, strings.Join(work.SheetForms(), ", ")))
	}
	sv, err := s.books.sheets(r.Context(), v)
	if err != nil {
		return err
	}
	list, err := work.Sheet(r.Context(), sv, v.plan, q.Get("telescope"), q.Get("night"), work.Options{})
	if err != nil {
		return err
	}
	var b bytes.Buffer
	kind := "text/plain; charset=utf-8"
	switch form {
	case "txt":
		err = list.WriteText(&b)
	case "csv":
		kind, err = "text/csv; charset=utf-8", list.WriteCSV(&b)
	case "html":
		kind, err = "text/html; charset=utf-8", list.WriteHTML(&b)
	}
	if err != nil {
		return err
	}
	w.Header().Set("Content-Security-Policy", paperPolicy)
	if form != "html" {
		w.Header().Set("Content-Disposition", fmt.Sprintf(`attachment; filename="%s-%s.%s"`, safeName(list.Telescope), list.Night, form))
	}
	send(w, r, kind, b.Bytes())
	return nil
}

// safeName leaves of a name what can stand in a header.
func safeName(name string) string {
	return strings.Map(func(r rune) rune {
		if r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == '-' || r == '_' {
			return r
		}
		return '-'
	}, name)
}

// getReport gives the report of the plan.
func getReport(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.books.view(r.Context())
	if err != nil {
		return err
	}
	text, err := work.ReportPage(r.Context(), v.Survey, v.plan, work.ReportAsk{Night: r.URL.Query().Get("night")}, work.Options{Workers: s.cfg.Workers})
	if err != nil {
		return err
	}
	w.Header().Set("Content-Security-Policy", paperPolicy)
	send(w, r, "text/html; charset=utf-8", text)
	return nil
}

// explained returns the survey and the plan that an explanation is about; the
// lost time is that which the plan knew of.
func (s *Server) explained(r *http.Request) (*work.Survey, *tables.PlanTables, error) {
	if r.URL.Query().Get("plan") == "trial" {
		s.tryMu.Lock()
		defer s.tryMu.Unlock()
		if s.try == nil {
			return nil, nil, noTrial
		}
		return s.try.trial.Survey, s.try.view.plan, nil
	}
	v, err := s.pick(r)
	if err != nil {
		return nil, nil, err
	}
	sv, err := s.books.sheets(r.Context(), v)
	return sv, v.plan, err
}

// getExplain says why a field is where it is, or isn't.
func getExplain(s *Server, w http.ResponseWriter, r *http.Request) error {
	sv, plan, err := s.explained(r)
	if err != nil {
		return err
	}
	f, err := work.ExplainField(r.Context(), sv, plan, r.URL.Query().Get("name"), work.Options{Workers: s.cfg.Workers})
	if err != nil {
		return err
	}
	return sendJSON(w, r, f)
}

// getExplainNight says why a telescope's night looks as it does.
func getExplainNight(s *Server, w http.ResponseWriter, r *http.Request) error {
	sv, plan, err := s.explained(r)
	if err != nil {
		return err
	}
	n, err := work.ExplainNight(r.Context(), sv, plan, r.URL.Query().Get("telescope"), r.PathValue("night"), work.Options{Workers: s.cfg.Workers})
	if err != nil {
		return err
	}
	return sendJSON(w, r, n)
}
