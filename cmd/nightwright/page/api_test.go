package page

import (
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/constraints"
	"nightwright/scheduler/explain"
	"nightwright/visibility"
)

// TestNightsAddUp holds what the page gets against the plan's tables.
func TestNightsAddUp(t *testing.T) {
	d := newDesk(t)
	v, err := d.s.books.view(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	var all nightsJSON
	d.get("/api/nights", &all)
	visits := 0
	for _, label := range all.Nights {
		var n nightJSON
		d.get("/api/nights/"+label, &n)
		for _, l := range n.Lanes {
			visits += len(l.Visits)
			for _, x := range l.Visits {
				inside := false
				for _, o := range l.Open {
					inside = inside || x.Start >= o[0]-1 && x.End <= o[1]+1
				}
				if !inside {
					t.Errorf("%s %s: an exposure outside open time", label, l.Telescope)
				}
			}
		}
	}
	if visits != len(v.plan.Visits) {
		t.Errorf("the nights have %d exposures; want %d", visits, len(v.plan.Visits))
	}
	var fields []fieldJSON
	d.get("/api/fields", &fields)
	for i, f := range fields {
		var s storyJSON
		d.get("/api/field?name="+f.Field, &s)
		if s.Field != f.Field || len(s.Visits) == 0 != (f.Planned+f.Done == 0) {
			t.Errorf("field %d: story of %s with %d exposures, %d planned", i, s.Field, len(s.Visits), f.Planned)
		}
	}
}

// TestPlacesOnTheSky: the page's formula from hour angle and declination gives
// the altitude of the exact path to well under a pixel of its dome.
func TestPlacesOnTheSky(t *testing.T) {
	d := newDesk(t)
	v, err := d.s.books.view(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	var n nightJSON
	d.get("/api/nights/2027-03-09", &n)
	worst := 0.0
	for i := range v.Survey.Fields {
		f := &v.Survey.Fields[i]
		for s := range v.Sites {
			place := constraints.Place(&v.Sites[s])
			for at := n.From; at < n.To; at += 3600 {
				h := n.HourAng[i] + place.Longitude + n.Rate*(at-n.At)
				got := math.Asin(math.Sin(place.Latitude)*math.Sin(n.Declin[i]) + math.Cos(place.Latitude)*math.Cos(n.Declin[i])*math.Cos(h))
				want := v.Exact.Star(place, visibility.Position{RA: f.RA, Dec: f.Dec}, at).Altitude
				worst = max(worst, math.Abs(got-want))
			}
		}
	}
	if worst > 0.0003 { // 1 arc minute: a twentieth of a pixel
		t.Errorf("off by %.5f rad", worst)
	}
}

// TestSheetsAreTheCommands: the page's sheet is the one of the command.
func TestSheets(t *testing.T) {
	d := newDesk(t)
	code, head, text := d.ask("GET", "/sheet?telescope=C1&night=2027-03-09&form=txt", "")
	if code != 200 || !strings.Contains(head.Get("Content-Disposition"), `"C1-2027-03-09.txt"`) || !strings.Contains(text, "Cinder Ridge") {
		t.Errorf("%d %v %s", code, head, text)
	}
	if code, _, text := d.ask("GET", "/sheet?telescope=Q9&night=2027-03-09", ""); code != 422 || !strings.Contains(text, "there is no telescope") {
		t.Errorf("no such telescope: %d %s", code, text)
	}
}

// TestExplanations: the page's reasons are those of the command, of the plan
// that holds and of the one on trial.
func TestExplanations(t *testing.T) {
	d := newDesk(t)
	var f explain.Field
	d.get("/api/explain?name=A1", &f)
	if f.Name != "A1" || len(f.Demands) == 0 || f.Got != len(f.Visits) || len(f.Demands[0].Months) == 0 {
		t.Errorf("%+v", f)
	}
	var n explain.Night
	d.get("/api/explain/2027-03-09?telescope=C1", &n)
	if code, _, text := d.ask("GET", "/api/explain?name=nobody", ""); code != 422 || !strings.Contains(text, "there is no field") {
		t.Errorf("no such field: %d %s", code, text)
	}
	if code, _, _ := d.ask("GET", "/api/explain?name=A1&plan=trial", ""); code != 404 {
		t.Errorf("without a trial: %d", code)
	}
	d.run(`{"losses":[{"site":"Cinder Ridge","from":"2027-03-08","to":"2027-03-11","cause":"technical"},{"site":"Salt Mesa","from":"2027-03-08","to":"2027-03-11","cause":"technical"}]}`)
	d.get("/api/explain?name=A1&plan=trial", &f)
	if f.Got != 0 || len(f.Demands[0].Rules) == 0 {
		t.Errorf("on trial, with every night lost: %+v", f)
	}
}

// TestPlanThatChanges: the page sees a plan that another program wrote, and
// says when the survey doesn't fit it.
func TestPlanThatChanges(t *testing.T) {
	d := newDesk(t)
	first, err := d.s.books.view(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	again, err := d.s.books.view(t.Context())
	if err != nil || again != first {
		t.Errorf("an unchanged plan was read again: %v", err)
	}
	file := filepath.Join(d.dir, "survey.yaml")
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(file, []byte(strings.Replace(string(text), "seed: 3", "seed: 4", 1)), 0o644); err != nil {
		t.Fatal(err)
	}
	if code, _, text := d.ask("GET", "/api/survey", ""); code != 422 || !strings.Contains(text, "survey.yaml") || !strings.Contains(text, "nightwright plan") {
		t.Errorf("%d %s; want what differs and what to do", code, text)
	}
}

// TestDescription: every address is described, and no other.
func TestDescription(t *testing.T) {
	d := newDesk(t)
	var doc struct {
		OpenAPI    string                                `json:"openapi"`
		Paths      map[string]map[string]json.RawMessage `json:"paths"`
		Components struct {
			Schemas map[string]json.RawMessage `json:"schemas"`
		} `json:"components"`
	}
	d.get("/openapi.json", &doc)
	if doc.OpenAPI != "3.1.0" {
		t.Errorf("version %q", doc.OpenAPI)
	}
	n := 0
	for _, m := range doc.Paths {
		n += len(m)
	}
	if n != len(routes()) {
		t.Errorf("%d operations are described; there are %d", n, len(routes()))
	}
	for _, rt := range routes() {
		op, ok := doc.Paths[rt.Path][lower(rt.Method)]
		if !ok {
			t.Errorf("%s %s isn't described", rt.Method, rt.Path)
		}
		if rt.Change != strings.Contains(string(op), `"security"`) || rt.Change == (rt.Method == "GET") {
			t.Errorf("%s %s: change %v; GET changes nothing, and what changes wants the key", rt.Method, rt.Path, rt.Change)
		}
		if rt.Body != "" && doc.Components.Schemas[rt.Body] == nil {
			t.Errorf("%s %s: there is no schema %s", rt.Method, rt.Path, rt.Body)
		}
	}
}

// TestDescriptionIsOpenAPI holds the description against the schema of OpenAPI
// 3.1 that its authors publish, by an outside validator (npm
// @seriousme/openapi-schema-validator, pinned in .ci/node).
func TestDescriptionIsOpenAPI(t *testing.T) {
	absent := func(why string) {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("%s, and NIGHTWRIGHT_REQUIRE_ALL is 1", why)
		}
		t.Skip(why)
	}
	node, err := exec.LookPath("node")
	if err != nil {
		absent("node is not installed")
	}
	folder := os.Getenv("NIGHTWRIGHT_NODE")
	if folder == "" {
		folder = filepath.Join("..", "..", "..", ".ci", "node")
	}
	if _, err := os.Stat(filepath.Join(folder, "node_modules", "@seriousme", "openapi-schema-validator")); err != nil {
		absent("the validator is not installed: run npm ci in .ci/node")
	}
	d := newDesk(t)
	_, _, text := d.ask("GET", "/openapi.json", "")
	for name, tt := range map[string]struct{ text, want string }{
		"ours":     {text, "valid 3.1"},
		"a faulty": {strings.Replace(text, `"in":"query"`, `"in":"nowhere"`, 1), "["},
	} {
		cmd := exec.CommandContext(t.Context(), node, filepath.Join("testdata", "openapi.mjs"), folder)
		cmd.Stdin = strings.NewReader(tt.text)
		out, err := cmd.CombinedOutput()
		if err != nil || !strings.HasPrefix(string(out), tt.want) {
			t.Errorf("%s: %v: %.2000s; want %q", name, err, out, tt.want)
		}
	}
}
