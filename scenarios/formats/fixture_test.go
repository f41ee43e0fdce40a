package formats

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// fixture is a small plan with every state, a set, nulls, and names that
// formats trip over.
func fixture(t testing.TB) Plan {
	t.Helper()
	const degree = 3.141592653589793 / 180
	night, err := survey.ParseDay("2027-03-08")
	if err != nil {
		t.Fatal(err)
	}
	start := int64(1804564200_123456) // 2027-03-09 03:50:00.123456 UTC
	visit := func(n, set int64, field, telescope, site, filter, state string, after, seconds float64) tables.VisitRow {
		from := start + int64(after*1e6)
		return tables.VisitRow{
			Visit: n, Set: set, Field: field, Program: "wide, \"old\"", Demand: "r", Filter: filter, Site: site, Telescope: telescope,
			Night: int32(night), Start: from, End: from + int64(seconds*1e6), Exposure: seconds, GapBefore: 8.25,
			RA: 150.123456789012, Dec: -0.1, Altitude: 61.5, Azimuth: 359.999, Airmass: 1.137, SunAltitude: -30, MoonAltitude: -12.5,
			MoonSeparation: 100.25, SkyMagnitude: 21.5, Quality: 0.9, Credit: 1e-7, State: state,
		}
	}
	gap := 3.5
	pt := &tables.PlanTables{
		Visits: []tables.VisitRow{
			visit(1, 0, "A1", "C1", "Cinder Ridge", "r", "done", 0, 300),
			visit(2, 0, "B,2", "C1", "Cinder Ridge", "g", "held", 400, 120.5),
			visit(3, 3, "Ember & <Ash>", "C1", "Cinder Ridge", "g", "planned", 700, 120),
			visit(4, 3, "Ember & <Ash>", "C1", "Cinder Ridge", "r", "planned", 1300, 120),
			visit(5, 0, "Füchse ½", "S1", "Salt; Mesa, north", "r", "planned", 100, 299.877),
		},
		Fields: []tables.FieldRow{
			{Field: "A1", Program: "wide, \"old\"", Weight: 1, RA: 150, Dec: -0.1, VisitsWanted: 3, VisitsDone: 1, Coverage: 1.0 / 3, UsableHours: 12.3, First: start, Last: start + 1, LongestGap: &gap, LimitedBy: "hours"},
			{Field: "never", Program: "wide, \"old\"", Weight: 2.5e-9, RA: 0, Dec: -90, VisitsWanted: 3, LimitedBy: "airmass"},
		},
		Demands: []tables.DemandRow{{Field: "A1", Demand: "r", Wanted: 3, Done: 1}},
		Nights:  []tables.NightRow{{Site: "Cinder Ridge", Telescope: "C1", Night: int32(night), DarkHours: 9.5, OpenHours: 9, UsedHours: 1, ExposureHours: 0.5, Visits: 4, MoonIllumination: 0.01, PricePerHour: 1e-5}},
		Prices:  []tables.PriceRow{{Telescope: "C1", SlotStart: start, PricePerHour: 1e-5}, {Telescope: "S1", SlotStart: start, PricePerHour: 0}},
	}
	pt.Summary = tables.Summary{Survey: "Small Lantern", FirstNight: "2027-03-08", LastNight: "2027-03-11", Seed: 7, Program: "devel"}
	sv := &survey.Survey{
		Sites: []survey.Site{{Name: "Cinder Ridge", Latitude: 33.2 * degree, Longitude: -106.8 * degree}, {Name: "Salt; Mesa, north", Latitude: -26.3 * degree, Longitude: 292.1 * degree}},
		Telescopes: []survey.Telescope{
			{Name: "C1", FieldOfView: survey.FieldOfView{Diameter: 1.5 * degree}},
			{Name: "S1", Site: 1, FieldOfView: survey.FieldOfView{Width: 4 * degree, Height: 3 * degree}},
		},
		Fields: []survey.Field{{Name: "A1", Tile: 1 * degree}},
	}
	p := Plan{Tables: pt, Survey: sv}
	var ok bool
	if p.Stamp, ok = DefaultStamp(pt); !ok {
		t.Fatal("no stamp")
	}
	return p
}

// documents are all VOTables that can be written of a plan.
func documents(p Plan) map[string]Document {
	out := map[string]Document{}
	for _, t := range []Table{
		FromRows(tables.Visits, p.Tables.Visits), FromRows(tables.Fields, p.Tables.Fields), FromRows(tables.Demands, p.Tables.Demands),
		FromRows(tables.Nights, p.Tables.Nights), FromRows(tables.Prices, p.Tables.Prices), ObsPlan(p),
	} {
		out[t.Name] = Document{About: "a test", Infos: Infos(p.Tables), Table: t}
	}
	return out
}

func writeFile(t *testing.T, name string, write func(b *bytes.Buffer) error) string {
	t.Helper()
	var b bytes.Buffer
	if err := write(&b); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, b.Bytes(), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// python runs a script of Debian's Python that needs a library, with
// arguments; the test is skipped where the library is missing.
func python(t *testing.T, library, script string, args ...string) string {
	t.Helper()
	const interpreter = "/usr/bin/python3"
	if err := exec.Command(interpreter, "-c", "import "+library).Run(); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("%s can't import %s: %v", interpreter, library, err)
		}
		t.Skipf("%s can't import %s; on Debian: apt-get install python3-%s", interpreter, library, library)
	}
	cmd := exec.Command(interpreter, append([]string{"-c", script}, args...)...)
	var out, msg bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &msg
	if err := cmd.Run(); err != nil {
		t.Fatalf("%v\n%s", err, strings.TrimSpace(msg.String()))
	}
	return out.String()
}
