package report

import (
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"math"
	"strconv"
	"strings"

	"nightwright/cmd/nightwright/draw"
	"nightwright/scheduler/tables"
)

//go:embed report.html.tmpl
var pageText string

var pageTemplate = template.Must(template.New("report").Parse(pageText))

// page is what the template shows; texts are ready to stand there.
type page struct {
	Title, Nights, Lead string
	Style               template.CSS
	Facts               []fact
	Limits              []string
	Warnings            []string
	Programs, Scopes    [][]string
	Short               [][]string
	ShortMore           int
	Wishes              string
	Forecast            []string
	Chances             [][]string
	NetworkRows         [][]string
	NetworkLead, Replan string
	Gap                 [][]string
	Ways, Worths        [][]string
	Origin              []fact
	Files               [][]string
	Night               string

	Sky, Balance, Calendar, Lanes, Progress, Cadence, Networks template.HTML
}

type fact struct{ Name, Text, Note string }

// inline makes a picture part of the page. Its texts are escaped where it is
// written.
func inline(c *draw.Canvas) template.HTML {
	return template.HTML(c.Inline()) //nolint:gosec // our own SVG; every text in it went through Escape
}

// WriteHTML writes the report as one page.
func (r *Report) WriteHTML(w io.Writer) error {
	if err := pageTemplate.Execute(w, &r.model); err != nil {
		return fmt.Errorf("report: %w", err)
	}
	return nil
}

func percent(x float64, decimals int) string {
	return strconv.FormatFloat(100*x, 'f', decimals, 64) + " %"
}

func part(a, b float64) string {
	if b == 0 {
		return "-"
	}
	return percent(a/b, 1)
}

func hours(x float64) string { return group(strconv.FormatFloat(x, 'f', 1, 64)) }

func whole(n int64) string { return group(strconv.FormatInt(n, 10)) }

// group puts a comma between thousands.
func group(text string) string {
	head, tail, dot := strings.Cut(text, ".")
	for k := len(head) - 3; k > 0 && head[k-1] != '-'; k -= 3 {
		head = head[:k] + "," + head[k:]
	}
	if dot {
		return head + "." + tail
	}
	return head
}

func decimals4(x float64) string { return strconv.FormatFloat(x, 'f', 4, 64) }

// millionths writes a price in 1e-6 of coverage an hour.
func millionths(x float64) string { return group(strconv.FormatFloat(math.Round(x*1e6), 'f', 0, 64)) }

// head fills in all but the pictures.
func (m *page) head(in *Input, g *gathered) {
	s := &in.Tables.Summary
	m.Title, m.Nights = s.Survey, s.FirstNight+" to "+s.LastNight
	m.Style = template.CSS(draw.StyleSheet()) //nolint:gosec // constants of package draw
	m.Lead = fmt.Sprintf("The plan covers %s of what is wanted. No legal plan can cover more than %s: at most %s of that is left to find.",
		percent(s.Coverage, 1), percent(s.Ceiling, 1), percent(s.Gap, 1))
	m.Facts = []fact{
		{"Coverage", decimals4(s.Coverage), "weighted quality got, of all that is wanted"},
		{"Ceiling", decimals4(s.Ceiling), "proven: no legal plan exceeds it"},
		{"Gap", percent(s.Gap, 1), "what the plan is from the ceiling, at most"},
		{"Visits", whole(s.VisitsGot), "of " + whole(s.VisitsWanted) + " wanted"},
		{"Fields finished", whole(s.FieldsFinished), "of " + whole(s.FieldsWanted)},
		{"Hours used", hours(s.Hours.Used), "of " + hours(s.Hours.Open) + " open (" + part(s.Hours.Used, s.Hours.Open) + "); dark " + hours(s.Hours.Dark)},
	}
	if s.Expected > 0 {
		m.Facts = append(m.Facts, fact{"Expected ceiling", decimals4(s.Expected), "no way of acting exceeds it on average, under the expected weather"})
	}
	m.replanned(s.Replan)
	for _, g := range s.GapParts {
		m.Gap = append(m.Gap, []string{gapWords[g.Name], decimals4(g.Coverage), part(g.Coverage, s.Ceiling-s.Coverage)})
	}
	if s.Status != "steps_done" {
		m.Warnings = append(m.Warnings, "The search was cut short ("+s.Status+"): a longer one may do better.")
	}
	m.limits(in)
	for _, p := range s.Programs {
		bounds := ""
		if p.ShareMin > 0 || p.ShareMax < 1 {
			bounds = percent(p.ShareMin, 0) + " to " + percent(p.ShareMax, 0)
		}
		m.Programs = append(m.Programs, []string{p.Program, whole(p.VisitsGot), whole(p.VisitsWanted), whole(p.FieldsFinished), whole(p.FieldsWanted),
			decimals4(p.Coverage), hours(p.ExposureHours), percent(p.Share, 1), bounds})
		if p.ShareBreach != 0 {
			m.Warnings = append(m.Warnings, fmt.Sprintf("%s misses its share by %s: %s", p.Program, percent(math.Abs(p.ShareBreach), 1), p.ShareWhy))
		}
	}
	m.telescopes(in)
	m.short(in)
	m.origin(in)
	m.outside(in)
}

// gapWords says what the parts of the gap are.
var gapWords = map[string]string{
	"slews":          "slews longer than a readout",
	"filter_changes": "filter changes",
	"idle":           "idle time",
	"moment":         "better moments in the visits' own nights",
	"choice":         "other nights and fields, what the search missed, and how far the ceiling is too high",
}

// replanned tells of a plan that came out of an earlier one.
func (m *page) replanned(r *tables.Replan) {
	if r == nil {
		return
	}
	m.Replan = fmt.Sprintf("This is a re-plan from %s on: of what was planned %s visits are done, %s kept (%s of them held), %s moved, %s dropped to make room and %s lost; %s are new. What was lost was worth %s of coverage, %s was won back.",
		r.Now, whole(int64(r.VisitsDone)), whole(int64(r.VisitsKept)), whole(int64(r.VisitsHeld)), whole(int64(r.VisitsMoved)), whole(int64(r.VisitsDropped)), whole(int64(r.VisitsLost)), whole(int64(r.VisitsNew)),
		decimals4(r.CreditLost), decimals4(r.CreditWon))
	m.Facts = append(m.Facts, fact{"Ceiling with the hold", decimals4(r.CeilingHeld), "of all plans that keep what is held, too"})
}

// limits says what keeps the plan from covering more.
func (m *page) limits(in *Input) {
	s := &in.Tables.Summary
	missing := unfinished(in.Tables.Fields)
	m.Limits = append(m.Limits, fmt.Sprintf("%s of the open time is used; the rest is idle, kept free, or too short for a visit.", part(s.Hours.Used, s.Hours.Open)))
	count, lost := map[string]int{}, map[string]float64{}
	total := 0.0
	for i := range in.Tables.Fields {
		f := &in.Tables.Fields[i]
		total += f.Weight
		if f.VisitsPlanned+f.VisitsDone < f.VisitsWanted {
			count[f.LimitedBy]++
			lost[f.LimitedBy] += f.Weight * float64(f.VisitsWanted-f.VisitsPlanned-f.VisitsDone) / float64(f.VisitsWanted)
		}
	}
	if len(missing) == 0 {
		m.Limits = append(m.Limits, "Every field gets all its visits; what coverage lacks is quality: airmass, moonlight and twilight.")
		return
	}
	for _, word := range tables.Limits() {
		if n := count[word]; n > 0 && limitWords[word] != "" {
			m.Limits = append(m.Limits, fmt.Sprintf("%s of %s fields miss visits because %s (%s of all weight).",
				whole(int64(n)), whole(int64(len(in.Tables.Fields))), limitWords[word], part(lost[word], total)))
		}
	}
	got, quality := 0.0, 0.0
	for i := range in.Tables.Fields {
		f := &in.Tables.Fields[i]
		got += f.Weight * float64(f.VisitsPlanned+f.VisitsDone) / math.Max(1, float64(f.VisitsWanted))
		quality += f.Weight * f.Coverage
	}
	if got > 0 {
		m.Limits = append(m.Limits, fmt.Sprintf("The visits that are got have a mean quality of %s: the rest goes to airmass, moonlight and twilight.", strconv.FormatFloat(quality/got, 'f', 2, 64)))
	}
}

func (m *page) telescopes(in *Input) {
	for _, t := range in.Tables.Summary.Telescopes {
		sum, open := 0.0, 0.0
		for i := range in.Tables.Nights {
			if n := &in.Tables.Nights[i]; n.Telescope == t.Telescope {
				sum += n.PricePerHour * n.OpenHours
				open += n.OpenHours
			}
		}
		price := "-"
		if open > 0 {
			price = millionths(sum / open)
		}
		m.Scopes = append(m.Scopes, []string{t.Site, t.Telescope, whole(t.Visits), hours(t.Hours.Dark), hours(t.Hours.Open), hours(t.Hours.Used), part(t.Hours.Used, t.Hours.Open), price})
	}
}

// shortShown is how many unfinished fields the page lists.
const shortShown = 60

func (m *page) short(in *Input) {
	missing := unfinished(in.Tables.Fields)
	for k, f := range missing {
		if k == shortShown {
			m.ShortMore = len(missing) - shortShown
			break
		}
		m.Short = append(m.Short, []string{f.Field, f.Program, strconv.FormatFloat(f.Weight, 'g', 4, 64), whole(f.VisitsPlanned + f.VisitsDone), whole(f.VisitsWanted),
			strconv.FormatFloat(f.Coverage, 'f', 3, 64), hours(f.UsableHours), f.LimitedBy})
	}
	breaches, demands := int64(0), 0
	for i := range in.Tables.Demands {
		if n := in.Tables.Demands[i].GapMaxBreaches; n > 0 {
			breaches += n
			demands++
		}
	}
	switch {
	case breaches == 0:
		m.Wishes = "No wish for a longest gap between visits is broken."
	default:
		m.Wishes = fmt.Sprintf("The wish for a longest gap between visits is broken %s times, for %s demands of fields; it is a wish, not a rule.", whole(breaches), whole(int64(demands)))
	}
}

func (m *page) origin(in *Input) {
	s := &in.Tables.Summary
	m.Origin = []fact{
		{"Made by", "nightwright " + s.Program, ""},
		{"Command", command(s), ""},
		{"Search", s.Status, ""},
		{"plan.json", in.PlanSum, ""},
	}
	for _, f := range s.Files {
		m.Files = append(m.Files, []string{"survey/" + f.Name, whole(f.Bytes), f.SHA256})
	}
	for _, t := range s.Tables {
		m.Files = append(m.Files, []string{t.Name, whole(t.Bytes), t.SHA256})
	}
}

// command is what makes the plan again.
func command(s *tables.Summary) string {
	if r := s.Replan; r != nil {
		return fmt.Sprintf("nightwright replan SURVEY PLAN --now %s --hold %gh --stability %g (PLAN: plan.json with SHA-256 %s)", r.Now, r.HoldHours, r.Stability, r.From)
	}
	text := fmt.Sprintf("nightwright plan SURVEY --effort %s --seed %d", s.Effort, s.Seed)
	if s.Expected > 0 {
		text += " --weather expected"
	}
	return text
}

// outside fills in what other jobs found out.
func (m *page) outside(in *Input) {
	if f := in.Forecast; f != nil && len(f.Ways) > 0 {
		best := &f.Ways[0]
		m.Forecast = append(m.Forecast, fmt.Sprintf("On clear nights the plan promises %s. Over %s simulated seasons of weather the best way of acting, %s, reaches %s on average; nine seasons of ten lie between %s and %s.",
			decimals4(f.Promised), whole(int64(f.Seasons)), best.Name, decimals4(best.Mean), decimals4(best.P05), decimals4(best.P95)))
		m.Forecast = append(m.Forecast, fmt.Sprintf("%s of %s fields finish in at least half of the seasons.", whole(int64(f.Likely)), whole(int64(len(f.Finish)))))
		for i := range f.Ways {
			w := &f.Ways[i]
			m.Ways = append(m.Ways, []string{w.Name, decimals4(w.Mean), decimals4(w.Low) + " to " + decimals4(w.High), decimals4(w.P05), decimals4(w.P95), hours(w.FieldsFinished)})
		}
		m.Chances = chances(f.Finish)
	}
	for _, n := range in.Networks {
		m.NetworkRows = append(m.NetworkRows, []string{n.Name, n.Sites, decimals4(n.Mean), decimals4(n.Low) + " to " + decimals4(n.High), n.Note})
	}
	if len(in.Networks) > 0 {
		m.NetworkLead = fmt.Sprintf("Each network acts under the same %s simulated seasons, so that differences are the networks' own.", whole(int64(in.Seasons)))
	}
	for _, w := range in.Worths {
		m.Worths = append(m.Worths, []string{w.Site, decimals4(w.Alone), decimals4(w.Adds), decimals4(w.AddsLow) + " to " + decimals4(w.AddsHigh), decimals4(w.Share), decimals4(w.ShareLow) + " to " + decimals4(w.ShareHigh)})
	}
}

// chances counts fields by their chance to finish.
func chances(all []ChanceRow) [][]string {
	bands := []struct {
		from float64
		text string
		n    int64
	}{{0.95, "95 % or more", 0}, {0.5, "50 to 95 %", 0}, {0.05, "5 to 50 %", 0}, {math.Inf(-1), "under 5 %", 0}}
	for _, c := range all {
		for k := range bands {
			if c.Chance >= bands[k].from {
				bands[k].n++
				break
			}
		}
	}
	var out [][]string
	for _, b := range bands {
		out = append(out, []string{b.text, whole(b.n)})
	}
	return out
}
