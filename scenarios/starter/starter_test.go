package starter

import (
	"crypto/sha256"
	"encoding/hex"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/surveyfile"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// load writes a starter and reads it back.
func load(t *testing.T, like string, demand float64) *survey.Survey {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "deep", like)
	if err := Write(dir, like, demand); err != nil {
		t.Fatal(err)
	}
	sv, _, issues := surveyfile.Load(dir)
	for _, i := range issues {
		t.Error(i)
	}
	if sv == nil {
		t.FailNow()
	}
	return sv
}

// wants sums up the visits of a survey and the time they take with the given
// overhead a exposure, s.
func wants(sv *survey.Survey, overhead float64) (visits int, seconds float64) {
	for i := range sv.Fields {
		for _, d := range sv.Programs[sv.Fields[i].Program].Demands {
			visits += d.Visits
			for _, e := range d.Exposures {
				seconds += float64(d.Visits) * (e.Duration + overhead)
			}
		}
	}
	return visits, seconds
}

func TestDemoIsSmallAndWhole(t *testing.T) {
	sv := load(t, "demo", 0)
	if sv.Nights() != 30 || len(sv.Sites) != 3 || len(sv.Fields) != 300 || len(sv.Programs) != 2 || len(sv.Networks) != 3 {
		t.Errorf("%d nights, %d sites, %d fields, %d programs, %d networks; want 30, 3, 300, 2, 3",
			sv.Nights(), len(sv.Sites), len(sv.Fields), len(sv.Programs), len(sv.Networks))
	}
	visits, seconds := wants(sv, 12)
	t.Logf("%d visits, %.0f h", visits, seconds/3600)
}

func TestSeasonIsTheSizeThatIsMeasured(t *testing.T) {
	supply := SeasonSupply()
	for _, demand := range []float64{0.7, 1, 1.5, 3} {
		sv := load(t, "season", demand)
		if sv.Nights() != 182 || len(sv.Sites) != 6 || len(sv.Telescopes) != 6 || len(sv.Fields) != 6000 || len(sv.Programs) != 3 {
			t.Fatalf("%d nights, %d sites, %d telescopes, %d fields, %d programs; want 182, 6, 6, 6000, 3",
				sv.Nights(), len(sv.Sites), len(sv.Telescopes), len(sv.Fields), len(sv.Programs))
		}
		visits, seconds := wants(sv, 12)
		got := seconds / supply
		t.Logf("demand %g: %d visits, %.0f h of %.0f h, %.3f", demand, visits, seconds/3600, supply/3600, got)
		if math.Abs(got/demand-1) > 0.01 {
			t.Errorf("demand %g came out as %.3f of the supply; want it within 1 %%", demand, got)
		}
		if demand == 1.5 && (visits < 285_000 || visits > 305_000) {
			t.Errorf("%d visits; want about 295,000", visits)
		}
		tiers := map[float64]int{}
		for i := range sv.Fields {
			f := &sv.Fields[i]
			tiers[sv.WeightOf(f)]++
			if dec := f.Dec / degree; dec < -75 || dec > 60 {
				t.Fatalf("field %s at declination %g; want -75 to 60", f.Name, dec)
			}
		}
		if len(tiers) != 3 || tiers[1] == 0 || tiers[2] == 0 || tiers[4] == 0 {
			t.Errorf("weights and fields %v; want three tiers 1, 2, 4", tiers)
		}
	}
}

// The season is frozen: measurements made on it stay comparable. A change of
// these sums is a change of every number that was measured.
func TestSeasonIsFrozen(t *testing.T) {
	files, err := Files("season", 1.5)
	if err != nil {
		t.Fatal(err)
	}
	for name, want := range map[string]string{
		"survey.yaml": "b9435280891e1cb9d1d8deea8269948afa88c1a6dfdfcaca009bf3a50396accf",
		"fields.csv":  "69caacc7952f054588c0a497c31828734b78a2b613f3d4dab3cf0cf46b571621",
	} {
		sum := sha256.Sum256(files[name])
		if got := hex.EncodeToString(sum[:]); got != want {
			t.Errorf("%s has sha256 %s; want %s", name, got, want)
		}
	}
}

func TestWriteTakesAnEmptyFolderAndNoOther(t *testing.T) {
	dir := t.TempDir()
	if err := Write(dir, "demo", 1); err != nil {
		t.Fatal(err)
	}
	info, err := os.Stat(dir)
	if err != nil || info.Mode().Perm() != 0o755 {
		t.Errorf("folder mode %v, %v; want 0755", info.Mode(), err)
	}
	err = Write(dir, "demo", 1)
	if err == nil || !strings.Contains(err.Error(), "is not empty; want a new or an empty folder") {
		t.Errorf("got %v; want it told that the folder is not empty", err)
	}
	entries, err := os.ReadDir(filepath.Dir(dir))
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if strings.HasPrefix(e.Name(), ".") {
			t.Errorf("%s was left behind", e.Name())
		}
	}
}

func TestWriteRefusesWhatItDoesNotKnow(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "x")
	for _, c := range []struct {
		like   string
		demand float64
		want   string
	}{
		{"autumn", 1, `there is no starter "autumn"; want one of demo, season`},
		{"demo", -1, "the demand is -1; want more than 0 and at most 100"},
		{"demo", math.NaN(), "the demand is NaN; want more than 0 and at most 100"},
		{"season", 101, "the demand is 101; want more than 0 and at most 100"},
	} {
		if err := Write(dir, c.like, c.demand); err == nil || err.Error() != c.want {
			t.Errorf("%s, %g: got %v; want %s", c.like, c.demand, err, c.want)
		}
	}
	if _, err := os.Stat(dir); err == nil {
		t.Error("a folder was written")
	}
}

// common practice: about 12 hours of night at the equinox at any latitude,
// for the Sun's centre and no refraction.
func TestOpenHoursAtTheEquinox(t *testing.T) {
	day, err := survey.ParseDay("2027-03-20")
	if err != nil {
		t.Fatal(err)
	}
	for _, latitude := range []float64{-60, -30, 0, 45} {
		if got := openHours(latitude*degree, 0, float64(day)-epochDay+0.5); math.Abs(got-12) > 0.1 {
			t.Errorf("latitude %g: %g h; want 12", latitude, got)
		}
	}
	if got := openHours(80*degree, -18*degree, 171+8*365+2); got != 0 {
		t.Errorf("%g dark hours at 80 north at midsummer; want 0", got)
	}
}

// The supply that demand is measured by is a plain formula; the calendar of
// the exact sky, with every transit and block, must agree with it.
func TestSupplyIsWhatTheCalendarHas(t *testing.T) {
	season := load(t, "season", 1.5)
	got, want := SeasonSupply()/3600, budget(season)
	t.Logf("%.1f h by the formula, %.1f h by the calendar", got, want)
	if math.Abs(got/want-1) > 0.01 {
		t.Errorf("the supply is %.1f h; the calendar has %.1f h", got, want)
	}
	demo := load(t, "demo", 0)
	_, seconds := wants(demo, 12)
	t.Logf("the demo wants %.3f of its supply", seconds/3600/budget(demo))
	if got := seconds / 3600 / budget(demo); math.Abs(got-1) > 0.03 {
		t.Errorf("the demo wants %.3f of its supply; want 1", got)
	}
}

// budget is the open time of all telescopes, h, less what is kept free.
func budget(sv *survey.Survey) float64 {
	exact := visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation))
	calendar := constraints.NewCalendar(sv, exact, nil)
	var hours float64
	for telescope := range sv.Telescopes {
		for night := range sv.Nights() {
			hours += calendar.Budget(telescope, night) / 3600
		}
	}
	return hours
}
