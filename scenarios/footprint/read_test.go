package footprint

import (
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

const goodRegion = `region: Ember belt
field_of_view_deg: 1.5
overlap: 0.05
program: wide
prefix: E
dithers: {count: 2, step_deg: 0.3}
weights: weights.csv
parts:
  - {name: belt, strip: {along: ecliptic, latitude_deg: [-5, 5], longitude_deg: [300, 20]}, weight: 2, program: movers}
  - band: {dec_deg: [20, 30]}
  - box: {ra_deg: [350, 10], dec_deg: [-10, 0]}
  - circle: {ra_deg: 150, dec_deg: 2, radius_deg: 3}
  - polygon: [[10, 40], [20, 40], [15, 50]]
  - moc: patch.moc
exclude:
  - strip: {along: galaxy, latitude_deg: [-10, 10]}
`

func files(name string, _ int64) ([]byte, error) {
	switch name {
	case "patch.moc":
		return []byte("3/17 20-22"), nil
	case "bad.moc":
		return []byte("3/17\n3/9999"), nil
	case "none.moc":
		return []byte("3/"), nil
	case "weights.csv":
		return []byte("ra_deg,dec_deg,radius_deg,weight\n150,2,2,3\n"), nil
	case "bad.csv":
		return []byte("ra_deg,dec_deg,radius_deg,weight\n150,2,2,3\n150,95,2,3\n1,2\n"), nil
	}
	return nil, errors.New("no such file")
}

func TestReadRegion(t *testing.T) {
	p, issues := Parse("belt.yaml", []byte(goodRegion), files)
	if len(issues) > 0 {
		t.Fatal(issues)
	}
	if p.Name != "Ember belt" || p.Diameter != 1.5*degree || p.Overlap != 0.05 || p.Dithers != 2 || p.Prefix != "E" || len(p.Parts) != 6 || len(p.Exclude) != 1 || len(p.Weights) != 1 {
		t.Errorf("%+v", p)
	}
	if p.Parts[0].Name != "belt" || p.Parts[0].Weight != 2 || p.Parts[0].Program != "movers" || p.Parts[1].Program != "wide" {
		t.Errorf("%+v", p.Parts[:2])
	}
	// 80 degrees of a strip 10 wide, on the sphere.
	if want := 80 * degree * 2 * math.Sin(5*degree); math.Abs(p.Parts[0].Shape.Area()-want) > 1e-12 {
		t.Errorf("the strip has %g sr, want %g", p.Parts[0].Shape.Area(), want)
	}
	if !p.Holds(Direction(150*degree, 2*degree)) || p.Holds(Direction(266.4*degree, -28.9*degree)) {
		t.Error("the circle's centre is in the region, the galaxy's is not")
	}
}

func TestBadRegions(t *testing.T) {
	part := func(s string) string { return "parts:\n  - " + s + "\n" }
	for _, tt := range []struct{ give, want string }{
		{"", "r:1: the file is empty"},
		{"# only a comment\n", "r:1: the file is empty"},
		{"parts: [\n", "it is not YAML here"},
		{"region: x\n", "r:1: the file has no parts"},
		{"parts: []\n", "r:1: the region is empty: parts has no part"},
		{"parts: 7\n", `r:1: parts is "7"; want a list`},
		{"- a\n", "r:1: the file is a list; want its keys"},
		{"shape: 1\nparts: [{sky: all}]\n", `r:1: unknown key "shape" in the file; known keys here: region,`},
		{part("{circle: {ra_deg: 1, dec_deg: 2}}"), "r:2: radius_deg is missing"},
		{part("{circle: {ra_deg: 1, dec_deg: 95, radius_deg: 1}}"), `r:2: dec_deg is "95"; want -90 to 90`},
		{part("{circle: {ra_deg: 1, dec_deg: 2, radius_deg: 0}}"), "r:2: the circle's radius is 0"},
		{part("{circle: {ra_deg: nan, dec_deg: 2, radius_deg: 1}}"), `r:2: ra_deg is "nan"`},
		{part("{band: {dec_deg: [10, -10]}}"), "r:2: dec_deg [10, -10] holds nothing"},
		{part("{band: {dec_deg: [10]}}"), "r:2: dec_deg is a list; want two numbers"},
		{part("{box: {ra_deg: [10, 10], dec_deg: [0, 5]}}"), "r:2: ra_deg [10, 10] holds nothing"},
		{part("{box: {dec_deg: [0, 5]}}"), "r:2: ra_deg is missing"},
		{part("{strip: {along: equator, latitude_deg: [0, 5]}}"), "r:2: the strip doesn't say along what"},
		{part("{sky: half}"), `r:2: sky is "half"; want sky: all`},
		{part("{sky: all, band: {dec_deg: [0, 5]}}"), "r:2: item 1 of parts has 2 shapes; want one of sky,"},
		{part("{weight: 2}"), "r:2: item 1 of parts has 0 shapes"},
		{part("{weight: -2, sky: all}"), `r:2: weight is "-2"`},
		{part("{name: \"a;b\", sky: all}"), `r:2: name is "a;b"`},
		{part("{polygon: [[0, 0], [10, 10], [10, 0], [0, 10]]}"), "r:2: the polygon crosses or touches itself: its sides from corner 1 and from corner 3 meet; want corners in order"},
		{part("{polygon: [[0, 0], [10, 10]]}"), "r:2: the polygon has 2 corners"},
		{part("{polygon: [[0, 0], [10], [1, 1]]}"), "r:2: corner 2 of the polygon is a list"},
		{part("{moc: other.moc}"), `r:2: the map "other.moc" can't be read: no such file`},
		{part("{moc: none.moc}"), `r:2: the map "none.moc" is empty`},
		{part("{moc: bad.moc}"), "bad.moc:2: the cell 9999 is not in order 3"},
		{part("{sky: all}") + "weights: bad.csv\n", `bad.csv:3: dec_deg is "95"`},
		{part("{sky: all}") + "weights: bad.csv\n", "bad.csv:4: the row has 2 cells; want 4"},
		{part("{sky: all}") + "dithers: {count: 3}\n", "r:3: the dithers have no step_deg"},
		{part("{sky: all}") + "dithers: {count: 1.5, step_deg: 1}\n", "r:3: count is 1.5; want a whole number"},
		{part("{sky: all}") + "overlap: 1\n", `r:3: overlap is "1"; want 0 to 0.9`},
		{part("{circle: {ra_deg: 10, dec_deg: 0, radius_deg: 1}}") + "exclude:\n  - circle: {ra_deg: 10, dec_deg: 0, radius_deg: 2}\n", "r:4: the region is empty: the exclusions leave nothing"},
		{part("{sky: all}") + "exclude:\n  - {sky: all, weight: 3}\n", "r:4: item 1 of exclude has a weight"},
		{"parts: &a\n  - *a\n", "r:1: item 1 of parts is a list"},
	} {
		p, issues := Parse("r", []byte(tt.give), files)
		var all []string
		for _, i := range issues {
			all = append(all, i.String())
		}
		if text := strings.Join(all, "\n"); p != nil || !strings.Contains(text, tt.want) {
			t.Errorf("%q:\n%s\nwant %q", tt.give, text, tt.want)
		}
	}
}

func TestLoadRegions(t *testing.T) {
	dir := t.TempDir()
	write := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		return path
	}
	write("patch.moc", "3/17 20-22")
	if p, issues := Load(write("a.yaml", "parts:\n  - moc: patch.moc\n")); len(issues) > 0 || p.Area() != 4*CellArea(3) {
		t.Errorf("%v", issues)
	}
	if p, issues := Load(filepath.Join(dir, "patch.moc")); len(issues) > 0 || p.Area() != 4*CellArea(3) || p.Name != "patch" {
		t.Errorf("%v", issues)
	}
	for path, want := range map[string]string{
		write("up.yaml", "parts:\n  - moc: ../patch.moc\n"): "it lies outside the region file's folder",
		write("dir.yaml", "parts:\n  - moc: .\n"):           "can't be read",
		write("none.moc", "3/"):                             "the map has no cells",
		filepath.Join(dir, "missing.yaml"):                  "missing.yaml:1: it can't be read: no such file",
		filepath.Join(dir, "no", "missing.yaml"):            "can't be opened",
	} {
		if p, issues := Load(path); p != nil || len(issues) != 1 || !strings.Contains(issues[0].String(), want) {
			t.Errorf("%s: %v; want %q", path, issues, want)
		}
	}
}

func FuzzRegion(f *testing.F) {
	f.Add([]byte(goodRegion))
	for _, s := range []string{"parts: [{sky: all}]", "parts: &a [*a]", "parts:\n - polygon: [[0,0],[1,0],[0,1]]", "a: &a {b: *a}", "parts: [{circle: {ra_deg: 1e9}}]", "\xff"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		p, issues := Parse("r", text, files)
		if (p == nil) != (len(issues) > 0) {
			t.Fatalf("plan %v with issues %v", p, issues)
		}
		for _, i := range issues {
			if i.Line < 1 || i.What == "" || i.Want == "" {
				t.Fatalf("%+v lacks a place, or what is wrong, or what is right", i)
			}
		}
		if p != nil {
			v := Direction(1, 0.5)
			if place := p.Place(v, 0.01); place == Within && !p.Holds(v) || place == Apart && p.Holds(v) {
				t.Fatal("a direction is on both sides")
			}
		}
	})
}
