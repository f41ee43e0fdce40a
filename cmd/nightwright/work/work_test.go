package work

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/scheduler/tables"
)

// small reads the survey that the command's tests share.
func small(t *testing.T) *Survey {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "small") // a copy: planning writes to the ledger beside it
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("..", "testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	s, err := ReadSurvey(dir)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestInstantsNeedZ(t *testing.T) {
	got, err := ParseInstant("--from", "2027-03-09T03:00:00.5Z")
	if err != nil || got != 1804561200.5 { // date -u -d 2027-03-09T03:00:00Z +%s
		t.Errorf("got %v, %v; want 1804561200.5", got, err)
	}
	for _, bad := range []string{"", "2027-03-09", "2027-03-09T03:00:00", "2027-03-09T03:00:00+01:00", "2027-02-30T00:00:00Z"} {
		if _, err := ParseInstant("--from", bad); err == nil || !strings.Contains(err.Error(), "--from") {
			t.Errorf("%q: %v; want an error that names --from", bad, err)
		}
	}
}

func TestNamesThatAreNotThere(t *testing.T) {
	s := small(t)
	if i, err := s.SiteID("Salt Mesa"); err != nil || i != 1 {
		t.Errorf("Salt Mesa is site %d, %v; want 1", i, err)
	}
	_, err := s.TelescopeID("c1")
	var fault *InputError
	if !errors.As(err, &fault) || !strings.Contains(err.Error(), `did you mean "C1"`) {
		t.Errorf("c1: %v; want a suggestion", err)
	}
	if _, err := s.NightIndex("2027-03-12"); err == nil || !strings.Contains(err.Error(), "2027-03-08 to 2027-03-11") {
		t.Errorf("a night outside: %v; want the period", err)
	}
}

func TestJSONRows(t *testing.T) {
	x := 1.25
	rows := []tables.GridRow{
		{Site: `Salt "Mesa"`, Field: "A", SlotStart: 1804561200_000000, Altitude: -3, Usable: false, BlockedBy: "sun,altitude"},
		{Site: "Salt Mesa", Field: "B", SlotStart: 1804561200_000000, Altitude: 53.5, Airmass: &x, SkyMagnitude: &x, Usable: true},
	}
	var out bytes.Buffer
	if err := WriteJSONRows(&out, tables.Grid, rows); err != nil {
		t.Fatal(err)
	}
	var got []map[string]any
	if err := json.Unmarshal(out.Bytes(), &got); err != nil {
		t.Fatalf("%v in %s", err, out.String())
	}
	// The table's order is by site: a quote comes before M.
	low, high := got[0], got[1]
	if low["site"] != `Salt "Mesa"` || low["airmass"] != nil || low["usable"] != false || low["slot_start_utc"] != "2027-03-09T03:00:00Z" {
		t.Errorf("first row %v", low)
	}
	if high["airmass"] != 1.25 || high["blocked_by"] != "" || high["altitude_deg"] != 53.5 {
		t.Errorf("second row %v", high)
	}
	out.Reset()
	if err := WriteJSONRows(&out, tables.Grid, nil); err != nil || json.Unmarshal(out.Bytes(), &got) != nil || len(got) != 0 {
		t.Errorf("no rows: %v, %q", err, out.String())
	}
}

// TestGridAgreesWithAlmanac: two jobs, two paths through the ephemeris. The
// Sun's altitude in the grid passes -18 deg where the almanac has dusk.
func TestGridAgreesWithAlmanac(t *testing.T) {
	s := small(t)
	o := Options{Workers: 2}
	days, err := Almanac(t.Context(), s, []string{"Salt Mesa"}, o)
	if err != nil {
		t.Fatal(err)
	}
	rows, err := Grid(t.Context(), s, GridAsk{Sites: []string{"Salt Mesa"}, Fields: []string{"A5"}, Nights: []string{"2027-03-08"}}, o)
	if err != nil {
		t.Fatal(err)
	}
	seen := false
	for i := 1; i < len(rows); i++ {
		a, b := &rows[i-1], &rows[i]
		if a.SunAltitude > -18 && b.SunAltitude <= -18 {
			at := float64(a.SlotStart) + (a.SunAltitude+18)/(a.SunAltitude-b.SunAltitude)*float64(b.SlotStart-a.SlotStart)
			// Straight between slots 10 minutes apart: good to a few seconds.
			if off := (at - float64(days[0].DuskAstronomical)) / 1e6; math.Abs(off) > 10 {
				t.Errorf("dusk in the grid is %.1f s after the almanac's", off)
			}
			seen = true
		}
	}
	if !seen {
		t.Error("the grid has no dusk")
	}
	if n := len(rows); n < 143 || n > 145 {
		t.Errorf("%d slots from transit to transit; want 144, give or take one", n)
	}
}

func TestGridDoesNotDependOnWorkers(t *testing.T) {
	ask := GridAsk{From: "2027-03-09T00:00:00Z", To: "2027-03-09T12:00:00Z"}
	var text [2]bytes.Buffer
	for i, workers := range []int{1, 7} {
		rows, err := Grid(t.Context(), small(t), ask, Options{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if err := tables.Grid.WriteCSV(&text[i], rows); err != nil {
			t.Fatal(err)
		}
	}
	if text[0].Len() == 0 || !bytes.Equal(text[0].Bytes(), text[1].Bytes()) {
		t.Error("1 and 7 workers give different grids")
	}
}

func TestCheckAddsUp(t *testing.T) {
	c, err := Check(t.Context(), small(t), Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	if c.VisitsWanted != 18 || c.Fields != 8 || len(c.Programs) != 2 || c.Programs[1].Visits != 3 {
		t.Errorf("sizes: %d visits, %d fields, programs %+v", c.VisitsWanted, c.Fields, c.Programs)
	}
	open := 0.0
	for _, x := range c.Telescopes {
		open += x.Free
	}
	if math.Abs(open-c.HoursOpen) > 1e-9 {
		t.Errorf("telescopes have %.6f h, the survey %.6f", open, c.HoursOpen)
	}
	// Fifteen visits of 300 s and three pairs of 120 s, with 8 s of readout each.
	if want := (15*308 + 3*2*128) / 3600.0; math.Abs(c.HoursAsked-want) > 1e-9 {
		t.Errorf("%.6f h are asked; want %.6f", c.HoursAsked, want)
	}
}
