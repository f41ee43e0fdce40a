package surveyfile

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// good returns a file of the sound survey that the tests vary.
func good(t testing.TB, name string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("testdata", "good", name))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// folderOf writes files, by name and text in turn, into a new folder.
func folderOf(t testing.TB, files ...string) string {
	t.Helper()
	dir := t.TempDir()
	for i := 0; i+1 < len(files); i += 2 {
		if err := os.WriteFile(filepath.Join(dir, files[i]), []byte(files[i+1]), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// told lists issues as text, without the folder's name.
func told(dir string, issues []Issue) []string {
	var all []string
	for _, i := range issues {
		all = append(all, strings.ReplaceAll(i.String(), dir+string(filepath.Separator), ""))
	}
	return all
}

// mustLoad loads a survey that must have no issues.
func mustLoad(t testing.TB, path string) (*survey.Survey, *Source) {
	t.Helper()
	sv, source, issues := Load(path)
	for _, i := range issues {
		t.Error(i)
	}
	if sv == nil {
		t.Fatal("no survey")
	}
	return sv, source
}

// goodSurvey is what testdata/good says, worked out by hand.
func goodSurvey() *survey.Survey {
	const deg = math.Pi / 180
	base := survey.Rules{AltitudeMin: 30 * deg, AirmassMax: 2, SunAltitudeMax: -15 * deg, MoonSeparationMin: 25 * deg, MoonIlluminationMax: 1, HourAngleMax: 75 * deg}
	wideG, wideR := base, base
	wideG.AirmassMax, wideG.MinQuality = 1.9, 0.2
	wideR.AirmassMax, wideR.MinQuality, wideR.MoonSeparationMin = math.Inf(1), 0.2, 40*deg
	tight := base
	tight.AirmassMax = 1.5
	freeG, freeR := wideG, wideR
	freeG.AirmassMax = math.Inf(1)
	const feb10, mar20 = 1802217600, 1805500800 // 00:00Z, by date -u -d
	return &survey.Survey{
		Name:        "Ember Arc",
		FirstNight:  20850, // days from 1970-01-01, by date -u -d 2027-02-01
		LastNight:   20908,
		Slot:        600,
		Seed:        7,
		FinishBonus: 0.1,
		Orientation: ephemeris.Orientation{DUT1: 0.1},
		Filters: []visibility.Filter{
			{Name: "g", Band: visibility.BandV, Extinction: 0.17, DarkSky: 22.1, Moonlight: 1},
			{Name: "r", Band: visibility.BandR, Extinction: 0.10, DarkSky: 21.2, Moonlight: 1},
		},
		Programs: []survey.Program{
			{Name: "wide", Weight: 1, ShareMax: 1, Demands: []survey.Demand{
				{Name: "g", Visits: 6, GapMin: 3 * 86400, GapMax: 10 * 86400, PerNight: 1, Exposures: []survey.Exposure{{Filter: 0, Duration: 60}}},
				{Name: "r", Visits: 6, GapMax: math.Inf(1), Exposures: []survey.Exposure{{Filter: 1, Duration: 90}}},
			}},
			{Name: "movers", Weight: 2, ShareMin: 0.1, ShareMax: 0.3, Telescopes: []int{0}, Demands: []survey.Demand{
				{Name: "triplet", Visits: 4, GapMax: math.Inf(1), Exposures: []survey.Exposure{
					{Filter: 1, Duration: 45}, {Filter: 1, Duration: 45, After: 1200, Tolerance: 300}, {Filter: 1, Duration: 45, After: 1200, Tolerance: 300}}},
				{Name: "colour", Visits: 1, GapMax: math.Inf(1), Exposures: []survey.Exposure{
					{Filter: 0, Duration: 60}, {Filter: 1, Duration: 70, After: 600, Tolerance: 300}}},
			}},
		},
		Sites: []survey.Site{
			{Name: "Cinder Ridge", Latitude: 33.2 * deg, Longitude: -106.8 * deg, Elevation: 2140, TimeZone: "Etc/GMT+7",
				Horizon:     []survey.HorizonPoint{{Azimuth: 0, Altitude: 12 * deg}, {Azimuth: 90 * deg, Altitude: 20 * deg}, {Azimuth: 180 * deg, Altitude: 10 * deg}, {Azimuth: 270 * deg, Altitude: 15 * deg}},
				Clear:       []float64{0.62, 0.6, 0.65, 0.7, 0.72, 0.7, 0.5, 0.48, 0.6, 0.7, 0.68, 0.63},
				Persistence: 14 * 3600,
				Closures:    []survey.Closure{{ByNight: true, FirstNight: 20887, LastNight: 20889, Why: "mirror work"}},
				Cost:        1.5, Telescopes: []int{0}},
			{Name: "Salt Mesa", Latitude: -26.3 * deg, Longitude: -67.9 * deg, TimeZone: "UTC", Cost: 1, Telescopes: []int{1}},
		},
		Telescopes: []survey.Telescope{
			{Name: "C1", Site: 0, Mount: survey.Altazimuth, FieldOfView: survey.FieldOfView{Diameter: 1.5 * deg}, AltitudeMin: 20 * deg, AltitudeMax: 87 * deg,
				AzimuthRange: &survey.AzimuthRange{From: -90 * deg, To: 270 * deg},
				Slew:         survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3},
				Readout:      8, Filters: []int{0, 1}, FilterChange: 45, DuringSlew: true, ExposureScale: 1.2,
				Reserved: []survey.Reserved{{At: survey.AtOpening, Takes: 900, Why: "standards"}, {At: survey.AtEvery, Every: 7200, Takes: 180, Why: "focus"}, {At: survey.AtClosing, Takes: 300}},
				KeepFree: 0.05,
				Closures: []survey.Closure{{From: 1803956400, To: 1803972600, Why: "instrument work"}}},
			{Name: "S1", Site: 1, Mount: survey.Equatorial, FieldOfView: survey.FieldOfView{Width: 1.5 * deg, Height: 2 * deg}, AltitudeMax: 90 * deg,
				Slew: survey.Slew{Rate: 2 * deg, Acceleration: 1 * deg},
				Flip: &survey.Flip{Time: 60, PastMeridian: 5 * deg}, Filters: []int{1, 0}, ExposureScale: 1},
		},
		Fields: []survey.Field{
			{Name: "a", RA: 150.5 * deg, Dec: 20 * deg, Program: 0, Weight: 1, NotBefore: math.Inf(-1), NotAfter: math.Inf(1), Rules: []survey.Rules{wideG, wideR}},
			{Name: `b, the "second"`, RA: 188.73625 * deg, Dec: 20.5 * deg, PMRA: -3.77575 / 3600 * deg, PMDec: 0.76554 / 3600 * deg, Program: 1, Weight: 2,
				NotBefore: feb10, NotAfter: mar20 + 6*3600, Tile: 1.2 * deg, Telescopes: []int{0}, Rules: []survey.Rules{tight, tight}},
			{Name: "c", RA: 150 * deg, Dec: -5.5 * deg, Program: 0, Weight: 0.5, NotBefore: feb10, NotAfter: mar20 + 86400, Tile: 1.5 * deg, Telescopes: []int{1, 0}, Rules: []survey.Rules{freeG, freeR}},
		},
		Networks: []survey.Network{{Name: "both", Sites: []int{0, 1}}, {Name: "without the mesa", Sites: []int{0}}},
	}
}

// closely compares numbers to a few units in the last place: degrees become
// radians by another path in the test.
var closely = []cmp.Option{cmpopts.EquateApprox(1e-14, 0), cmpopts.EquateEmpty()}

func TestLoadFillsEveryMember(t *testing.T) {
	sv, source := mustLoad(t, filepath.Join("testdata", "good"))
	if d := cmp.Diff(goodSurvey(), sv, closely...); d != "" {
		t.Errorf("want -, got +:\n%s", d)
	}
	var want []SourceFile
	for _, name := range []string{"survey.yaml", "fields.csv"} {
		text := good(t, name)
		sum := sha256.Sum256([]byte(text))
		want = append(want, SourceFile{name, int64(len(text)), hex.EncodeToString(sum[:])})
	}
	if d := cmp.Diff(&Source{Root: filepath.Join("testdata", "good"), Files: want}, source); d != "" {
		t.Errorf("source, want -, got +:\n%s", d)
	}
}

func TestLoadTakesTheFileToo(t *testing.T) {
	byFolder, _ := mustLoad(t, filepath.Join("testdata", "good"))
	byFile, _ := mustLoad(t, filepath.Join("testdata", "good", "survey.yaml"))
	if d := cmp.Diff(byFolder, byFile); d != "" {
		t.Error(d)
	}
	dir := folderOf(t, "autumn.yaml", good(t, "survey.yaml"), "fields.csv", good(t, "fields.csv"))
	_, source := mustLoad(t, filepath.Join(dir, "autumn.yaml"))
	if source.Files[0].Name != "autumn.yaml" {
		t.Errorf("the survey file is %s; want autumn.yaml", source.Files[0].Name)
	}
}

// Byte-order marks and CRLF, as other systems' editors write them, change
// nothing.
func TestLoadTakesMarksAndCRLF(t *testing.T) {
	want, _ := mustLoad(t, filepath.Join("testdata", "good"))
	crlf := func(s string) string { return strings.ReplaceAll(s, "\n", "\r\n") }
	const mark = "\ufeff"
	for _, c := range []struct{ name, survey, fields string }{
		{"marks", mark + good(t, "survey.yaml"), mark + good(t, "fields.csv")},
		{"CRLF", crlf(good(t, "survey.yaml")), crlf(good(t, "fields.csv"))},
		{"both", mark + crlf(good(t, "survey.yaml")), mark + crlf(good(t, "fields.csv"))},
		{"no newline at the end", strings.TrimSpace(good(t, "survey.yaml")), strings.TrimSpace(good(t, "fields.csv"))},
	} {
		t.Run(c.name, func(t *testing.T) {
			sv, _ := mustLoad(t, folderOf(t, "survey.yaml", c.survey, "fields.csv", c.fields))
			if d := cmp.Diff(want, sv); d != "" {
				t.Error(d)
			}
		})
	}
}

// Keys may be in any case; so may the columns. Names may not.
func TestCaseCountsInNamesOnly(t *testing.T) {
	want, _ := mustLoad(t, filepath.Join("testdata", "good"))
	text := strings.NewReplacer("survey:", "SURVEY:", "first_night", "First_Night", "readout", "ReadOut", "airmass_max", "AIRMASS_MAX").Replace(good(t, "survey.yaml"))
	fields := strings.Replace(good(t, "fields.csv"), "ra_deg", "RA_Deg", 1)
	sv, _ := mustLoad(t, folderOf(t, "survey.yaml", text, "fields.csv", fields))
	if d := cmp.Diff(want, sv); d != "" {
		t.Error(d)
	}
}

func TestAliasesStandForWhatTheyName(t *testing.T) {
	want, _ := mustLoad(t, filepath.Join("testdata", "good"))
	text := good(t, "survey.yaml")
	text = strings.Replace(text, "sites: [Cinder Ridge, Salt Mesa]", "sites: [&ridge Cinder Ridge, Salt Mesa]", 1)
	text = strings.Replace(text, "sites: [Cinder Ridge]", "sites: [*ridge]", 1)
	sv, _ := mustLoad(t, folderOf(t, "survey.yaml", text, "fields.csv", good(t, "fields.csv")))
	if d := cmp.Diff(want, sv); d != "" {
		t.Error(d)
	}
}

func TestAliasesThatGrowAreRefused(t *testing.T) {
	var text bytes.Buffer
	text.WriteString("survey: &a [x, x, x, x, x, x, x, x, x, x]\n")
	for c := 'b'; c < 'k'; c++ {
		text.WriteString("slot: &" + string(c) + " [" + strings.Repeat("*"+string(c-1)+", ", 10) + "]\n")
	}
	dir := folderOf(t, "survey.yaml", text.String())
	_, _, issues := Load(dir)
	want := []string{"survey.yaml:1: with its aliases written out the file is too large; want at most 1000000 keys and values"}
	if d := cmp.Diff(want, told(dir, issues)); d != "" {
		t.Error(d)
	}
}

// A column map reads a list from elsewhere and leaves its other columns alone.
func TestColumnMap(t *testing.T) {
	fields := "id,RAJ2000,DEJ2000,prog,Bmag,note\nx,150.5,20,wide,12.3,bright\n"
	text := strings.Replace(good(t, "survey.yaml"), "fields: fields.csv",
		"fields: {file: list.csv, columns: {field: id, ra_deg: RAJ2000, dec_deg: DEJ2000, program: prog}}", 1)
	dir := folderOf(t, "survey.yaml", text, "list.csv", fields)
	sv, source, issues := Load(dir)
	want := []string{`survey.yaml:24: warning: no field is of the program movers; want its name in the field list's program column`}
	if d := cmp.Diff(want, told(dir, issues)); d != "" {
		t.Error(d)
	}
	if sv == nil || len(sv.Fields) != 1 || sv.Fields[0].Name != "x" || source.Files[1].Name != "list.csv" {
		t.Errorf("got %+v", sv)
	}
}

func TestDefaultsAreThoseThatHold(t *testing.T) {
	text := `
survey: Bare
period: {first_night: 2027-02-01, last_night: 2027-02-02}
fields: fields.csv
filters: [{name: g, band: V, extinction: 0.17, dark_sky: 22.1}]
programs: [{name: p, demands: [{filter: g, visits: 1, exposure: 60s}]}]
sites:
  - {name: S, latitude_deg: 0, longitude_deg: 0, telescopes: [{name: T, mount: altazimuth, field_of_view_deg: 1, slew: {rate_deg_s: 1, acceleration_deg_s2: 1}, filters: [g]}]}
`
	const fields = "field,ra_deg,dec_deg,program\na,150,0,p\n"
	bare, _ := mustLoad(t, folderOf(t, "survey.yaml", text, "fields.csv", fields))
	// Spelling every default out must change nothing.
	spelt := map[string]string{}
	for _, s := range Defaults() {
		if s.Default != "" && s.Name() != "programs.demands.name" {
			spelt[s.Path] += ", " + s.Key + ": " + s.Default
		}
	}
	inside := func(path string) string { return "{" + strings.TrimPrefix(spelt[path], ", ") + "}" }
	full := strings.NewReplacer(
		"fields: fields.csv", "fields: fields.csv\nrules: "+inside("rules")+"\nearth_orientation: "+inside("earth_orientation")+strings.ReplaceAll(spelt[""], ", ", "\n"),
		"dark_sky: 22.1", "dark_sky: 22.1"+spelt["filters"],
		"{name: p", "{name: p, share: "+inside("programs.share")+spelt["programs"],
		"exposure: 60s", "exposure: 60s, gap: "+inside("programs.demands.gap")+spelt["programs.demands"],
		"{name: S", "{name: S"+spelt["sites"],
		"{name: T", "{name: T, altitude_deg: "+inside("sites.telescopes.altitude_deg")+spelt["sites.telescopes"],
		"acceleration_deg_s2: 1", "acceleration_deg_s2: 1"+spelt["sites.telescopes.slew"],
	).Replace(text)
	whole, _ := mustLoad(t, folderOf(t, "survey.yaml", full, "fields.csv", fields))
	if d := cmp.Diff(bare, whole); d != "" {
		t.Errorf("left out -, spelt out +:\n%s\n%s", d, full)
	}
	rules := bare.Fields[0].Rules[0]
	want := survey.Rules{AirmassMax: math.Inf(1), SunAltitudeMax: -18 * degree, MoonIlluminationMax: 1, HourAngleMax: math.Inf(1)}
	if rules != want {
		t.Errorf("rules %+v; want %+v", rules, want)
	}
}

func TestNoSuchSurvey(t *testing.T) {
	empty := t.TempDir()
	for _, c := range []struct{ path, want string }{
		{filepath.Join(empty, "gone"), "gone:1: it can't be read: no such file or directory; want a survey folder with survey.yaml, or that file"},
		{filepath.Join(empty, "gone", "survey.yaml"), "gone/survey.yaml:1: the folder gone/ can't be opened: no such file or directory; want a survey folder or its survey.yaml"},
		{empty, "survey.yaml:1: it can't be read: no such file or directory; want a survey folder with survey.yaml, or that file"},
	} {
		sv, source, issues := Load(c.path)
		if sv != nil || source != nil {
			t.Errorf("%s: a survey came out", c.path)
		}
		if d := cmp.Diff([]string{c.want}, told(empty, issues)); d != "" {
			t.Errorf("%s: %s", c.path, d)
		}
	}
}
