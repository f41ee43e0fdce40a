package report

import (
	"bytes"
	"context"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"nightwright/constraints"
	"nightwright/scenarios/starter"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler"
	"nightwright/scheduler/outlook"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// made is a survey that was planned, with what it took.
type made struct {
	Input
	sky     *visibility.Sky
	windows *constraints.Windows
}

// planned plans the survey in a folder.
func planned(t *testing.T, dir string) *made {
	t.Helper()
	sv, _, issues := surveyfile.Load(dir)
	if sv == nil {
		t.Fatal(issues)
	}
	exact := visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))
	m := &made{Input: Input{Survey: sv, Exact: exact, Calendar: constraints.NewCalendar(sv, exact, nil), Workers: 2, PlanSum: strings.Repeat("ab", 32)}}
	m.sky = constraints.Tables(sv, exact, 2)
	var err error
	ctx := context.Background()
	if m.windows, err = constraints.NewWindows(ctx, sv, m.sky, m.Calendar, 2); err != nil {
		t.Fatal(err)
	}
	out, err := scheduler.Solve(ctx, scheduler.Input{Survey: sv, Sky: m.sky, Calendar: m.Calendar, Windows: m.windows, Workers: 2}, scheduler.Params{Effort: "quick", Seed: sv.Seed})
	if err != nil {
		t.Fatal(err)
	}
	if m.Tables, err = tables.Build(ctx, sv, exact, m.Calendar, m.windows, out, 2); err != nil {
		t.Fatal(err)
	}
	m.Tables.Summary.Program = "test"
	return m
}

// small is the survey that the commands' tests share, with texts replaced,
// each old one followed by its new one.
func small(t *testing.T, pairs ...string) *made {
	t.Helper()
	dir := t.TempDir()
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("..", "testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"survey.yaml", "fields.csv"} {
		text, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, name), []byte(strings.NewReplacer(pairs...).Replace(string(text))), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return planned(t, dir)
}

func (m *made) page(t *testing.T) []byte {
	t.Helper()
	r, err := Build(context.Background(), m.Input)
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := r.WriteHTML(&b); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// TestNumbersAddUp holds what the pictures show against the plan's tables.
func TestNumbersAddUp(t *testing.T) {
	m := small(t)
	g, err := gather(&m.Input)
	if err != nil {
		t.Fatal(err)
	}
	course := g.course()
	if end := course.Planned[len(course.Planned)-1].Value; math.Abs(end-m.Tables.Summary.Coverage) > 1e-12 {
		t.Errorf("progress ends at %v; want the coverage, %v", end, m.Tables.Summary.Coverage)
	}
	for k := 1; k < len(course.Planned); k++ {
		if course.Planned[k].Value < course.Planned[k-1].Value || course.Planned[k].T < course.Planned[k-1].T {
			t.Fatalf("progress falls at step %d", k)
		}
	}
	ascension, months := g.balances()
	var ra, month struct{ asked, planned, has float64 }
	for _, b := range ascension {
		ra.asked, ra.planned, ra.has = ra.asked+b.Asked, ra.planned+b.Planned, ra.has+b.Has
	}
	for _, b := range months {
		month.asked, month.planned, month.has = month.asked+b.Asked, month.planned+b.Planned, month.has+b.Has
	}
	hours := m.Tables.Summary.Hours
	for _, x := range []struct {
		what      string
		got, want float64
	}{
		{"open hours by right ascension", ra.has, hours.Open}, {"by month", month.has, hours.Open},
		{"planned hours by right ascension", ra.planned, hours.Used}, {"by month", month.planned, hours.Used},
		{"asked hours by month", month.asked, ra.asked},
	} {
		if math.Abs(x.got-x.want) > 1e-6*x.want {
			t.Errorf("%s: %.6f h; want %.6f", x.what, x.got, x.want)
		}
	}
	pairs := 0
	for _, b := range g.cadence() {
		for _, n := range b.Count {
			pairs += n
		}
	}
	want := 0
	for _, d := range m.Tables.Demands {
		want += max(0, int(d.Planned+d.Done)-1)
	}
	if pairs != want {
		t.Errorf("%d pairs of visits; want %d", pairs, want)
	}
	blocks := 0
	for day := m.Survey.FirstNight; day <= m.Survey.LastNight; day++ {
		for _, l := range g.lanes(day) {
			blocks += len(l.Blocks)
		}
	}
	if blocks != len(m.Tables.Visits) {
		t.Errorf("the lanes of all nights have %d exposures; want %d", blocks, len(m.Tables.Visits))
	}
}

// TestDemandAgreesWithTheOutlook: the outlook works the same hours out from
// windows of the rules, the report from altitudes alone.
func TestDemandAgreesWithTheOutlook(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "s")
	if err := starter.Write(dir, "demo", 0); err != nil {
		t.Fatal(err)
	}
	sv, _, issues := surveyfile.Load(dir)
	if sv == nil {
		t.Fatal(issues)
	}
	exact := visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))
	cal := constraints.NewCalendar(sv, exact, nil)
	sky := constraints.Tables(sv, exact, 2)
	windows, err := constraints.NewWindows(context.Background(), sv, sky, cal, 2)
	if err != nil {
		t.Fatal(err)
	}
	look, err := outlook.Look(context.Background(), outlook.Input{Survey: sv, Exact: exact, Sky: sky, Calendar: cal, Windows: windows, Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	pt := &tables.PlanTables{}
	for i := range sv.Fields {
		pt.Fields = append(pt.Fields, tables.FieldRow{Field: sv.Fields[i].Name})
	}
	for tel := range sv.Telescopes {
		for n := range sv.Nights() {
			pt.Nights = append(pt.Nights, tables.NightRow{Telescope: sv.Telescopes[tel].Name, Night: int32(sv.FirstNight) + int32(n), OpenHours: cal.OpenHours(tel, n)})
		}
	}
	g, err := gather(&Input{Tables: pt, Survey: sv, Exact: exact, Calendar: cal, Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	ascension, months := g.balances()
	for k := range ascension {
		if w := look.Ascension[k]; math.Abs(ascension[k].Asked-w.Asked) > 0.02*w.Asked+0.1 || math.Abs(ascension[k].Has-w.Open) > 0.02*w.Open+1 {
			t.Errorf("%s: asked %.1f h, open %.1f h; the outlook has %.1f and %.1f", ascension[k].Label, ascension[k].Asked, ascension[k].Has, w.Asked, w.Open)
		}
	}
	for k := range months {
		if w := look.Months[k]; math.Abs(months[k].Asked-w.Asked) > 0.15*w.Asked {
			t.Errorf("%s: asked %.1f h; the outlook has %.1f", months[k].Label, months[k].Asked, w.Asked)
		}
	}
}

const nasty = `<b onclick='x'>&"`

// TestHostileNames: names from the survey never become markup.
func TestHostileNames(t *testing.T) {
	m := small(t, "Small Lantern", `"Small `+strings.ReplaceAll(nasty, `"`, `\"`)+`"`)
	m.Networks = []Network{{Name: nasty, Sites: nasty, Mean: 0.5, Low: 0.4, High: 0.6, Note: nasty, Base: true}, {Name: "two", Mean: 0.6, Low: 0.55, High: 0.7}}
	m.Forecast = &Forecast{Seasons: 100, Ways: []Way{{Name: nasty, Mean: 0.4, Low: 0.39, High: 0.41, P05: 0.3, P95: 0.5}}, Promised: 0.6, Finish: []ChanceRow{{nasty, 0.25}, {"b", 0.97}}, Likely: 3}
	m.Worths = []Worth{{Site: nasty, Alone: 0.2, Adds: 0.1, Share: 0.15}}
	for i := range m.Tables.Fields {
		m.Tables.Fields[i].LimitedBy = nasty
	}
	page := m.page(t)
	if !bytes.Contains(page, []byte("&lt;b onclick")) {
		t.Error("the survey's name isn't there")
	}
	if bytes.Contains(page, []byte("<b ")) {
		t.Error("a name became markup")
	}
	for _, want := range []string{"Networks compared", "Over 100 simulated seasons", "What each site is worth", "5 to 50 %</td><td class=\"n\">1<"} {
		if !bytes.Contains(page, []byte(want)) {
			t.Errorf("the page lacks %q", want)
		}
	}
	parse(t, page)
}

// TestPageIsSelfContained: nothing is fetched, nothing runs, and the same plan
// gives the same page.
func TestPageIsSelfContained(t *testing.T) {
	m := small(t)
	page := m.page(t)
	for _, bad := range []string{"<script", "src=", "url(", "@import", `href="http`, "javascript:", " onload"} {
		if bytes.Contains(page, []byte(bad)) {
			t.Errorf("the page has %q in it", bad)
		}
	}
	ids := map[string]bool{}
	for _, id := range regexp.MustCompile(` id="([^"]*)"`).FindAllSubmatch(page, -1) {
		if ids[string(id[1])] {
			t.Errorf("the id %q stands twice", id[1])
		}
		ids[string(id[1])] = true
	}
	for _, ref := range regexp.MustCompile(`href="#([^"]*)"|aria-labelledby="([^"]*)"`).FindAllSubmatch(page, -1) {
		for _, id := range strings.Fields(string(ref[1]) + " " + string(ref[2])) {
			if !ids[id] {
				t.Errorf("nothing has the id %q", id)
			}
		}
	}
	m.Workers = 1
	if !bytes.Equal(page, m.page(t)) {
		t.Error("one worker makes another page than two")
	}
	parse(t, page)
}

// parse has the page read by html5lib, which follows the HTML standard's
// parser and, in strict mode, refuses what the standard calls a parse error.
func parse(t *testing.T, page []byte) {
	t.Helper()
	const script = `
import sys, html5lib
doc = html5lib.HTMLParser(strict=True).parse(sys.stdin.buffer.read(), transport_encoding="utf-8")
ns = "{http://www.w3.org/1999/xhtml}"
assert doc.find(ns + "head/" + ns + "title").text
svgs = list(doc.iter("{http://www.w3.org/2000/svg}svg"))
assert len(svgs) >= 6, len(svgs)
for s in svgs:
    assert s.get("role") == "img" and s.find("{http://www.w3.org/2000/svg}desc").text
print("ok")
`
	python := "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import html5lib").Run(); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("python3-html5lib is missing: %v", err)
		}
		t.Skipf("python3-html5lib is missing: %v", err)
	}
	cmd := exec.Command(python, "-c", script)
	cmd.Stdin = bytes.NewReader(page)
	if out, err := cmd.CombinedOutput(); err != nil || !bytes.Contains(out, []byte("ok")) {
		t.Errorf("html5lib: %v: %s", err, out)
	}
}

func TestWhatDoesNotFit(t *testing.T) {
	m := small(t)
	m.Night = "2027-05-01"
	if _, err := Build(context.Background(), m.Input); err == nil || !strings.Contains(err.Error(), "2027-03-08 to 2027-03-11") {
		t.Errorf("a night outside: %v; want the period", err)
	}
	m.Night = ""
	m.Tables.Fields[0].Field = "elsewhere"
	if _, err := Build(context.Background(), m.Input); err == nil || !strings.Contains(err.Error(), "elsewhere") {
		t.Errorf("another survey's field: %v; want its name", err)
	}
}

func TestGroups(t *testing.T) {
	for give, want := range map[string]string{"1": "1", "123": "123", "1234": "1,234", "1234567.8": "1,234,567.8", "-123": "-123", "-1234": "-1,234"} {
		if got := group(give); got != want {
			t.Errorf("%s: %s; want %s", give, got, want)
		}
	}
}
