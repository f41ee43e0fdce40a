package formats

import (
	"bytes"
	"math"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"nightwright/scenarios/footprint"
	"nightwright/scheduler/tables"
)

// TestMJD: 1970-01-01 is MJD 40587 and 2000-01-01 12:00 is 51544.5 (common
// practice).
func TestMJD(t *testing.T) {
	for _, tt := range []struct {
		micros int64
		want   float64
	}{{0, 40587}, {946728000 * 1e6, 51544.5}, {-1, 40587 - 1.0/86400e6}, {946728000*1e6 + 1, 51544.5 + 1.0/86400e6}} {
		if got := MJD(tt.micros); math.Abs(got-tt.want) > 8e-12 {
			t.Errorf("MJD(%d) = %.15g, want %.15g", tt.micros, got, tt.want)
		}
	}
}

// TestObsPlanColumns: the columns of ObsLocTAP 1.0 (2021-07-24), section 3.1,
// in turn, with the values that may not be null there.
func TestObsPlanColumns(t *testing.T) {
	p := fixture(t)
	table := ObsPlan(p)
	var names []string
	for _, c := range table.Columns {
		names = append(names, c.Name)
	}
	want := strings.Fields(`t_planning target_name obs_id obs_collection s_ra s_dec s_fov s_region s_resolution t_min t_max
		t_exptime t_resolution em_min em_max em_res_power o_ucd pol_states pol_xel facility_name instrument_name t_plan_exptime
		category priority execution_status tracking_type`)
	if !slices.Equal(names, want) || len(names) != 26 {
		t.Fatalf("columns %v", names)
	}
	at := func(row int, name string) any { return table.Rows[row][slices.Index(names, name)] }
	for r := range table.Rows {
		for _, name := range []string{"t_planning", "obs_id", "t_min", "t_max", "t_exptime", "facility_name", "category", "priority", "execution_status", "tracking_type"} {
			if at(r, name) == nil {
				t.Errorf("row %d: %s is null", r, name)
			}
		}
		for _, name := range []string{"em_min", "em_max"} {
			if at(r, name) != nil {
				t.Errorf("row %d: %s is known", r, name)
			}
		}
		if at(r, "t_planning") != MJD(p.Stamp) || at(r, "t_min").(float64) >= at(r, "t_max").(float64) {
			t.Errorf("row %d: times %v, %v, %v", r, at(r, "t_planning"), at(r, "t_min"), at(r, "t_max"))
		}
	}
	// Rows stand by start: 1 (done), 5 (planned), 2 (held), 3 and 4 (a set).
	for r, want := range []struct {
		id, status string
		priority   int64
		view       float64
	}{{"1", "Performed", 2, 1.5}, {"5", "Planned", 0, 5}, {"2", "Scheduled", 2, 1.5}, {"3", "Planned", 1, 1.5}, {"4", "Planned", 1, 1.5}} {
		ring := at(r, "s_region").([]float64)
		if at(r, "obs_id") != want.id || at(r, "execution_status") != want.status || at(r, "priority") != want.priority || at(r, "s_fov") != want.view || ring[2] != want.view/2 {
			t.Errorf("row %d: %v", r, table.Rows[r])
		}
	}
}

func TestSameBytes(t *testing.T) {
	write := func(p Plan) string {
		var b bytes.Buffer
		docs := documents(p)
		for _, name := range []string{"visits", "ivoa.obsplan"} {
			if err := WriteVOTable(&b, docs[name]); err != nil {
				t.Fatal(err)
			}
		}
		if err := WriteECSV(&b, docs["visits"].Table, docs["visits"].Infos); err != nil {
			t.Fatal(err)
		}
		if err := WriteCalendar(&b, p); err != nil {
			t.Fatal(err)
		}
		b.Write(Coverage(p).ASCII())
		return b.String()
	}
	a, b := fixture(t), fixture(t)
	slices.Reverse(b.Tables.Visits)
	if write(a) != write(b) {
		t.Error("the order in which rows come changes the bytes")
	}
	b.Stamp++
	if write(a) == write(b) {
		t.Error("the stamp changes nothing")
	}
}

// TestCalendarLines: RFC 5545, 3.1: CRLF, at most 75 octets, no character cut.
func TestCalendarLines(t *testing.T) {
	p := fixture(t)
	for i := range p.Tables.Visits {
		p.Tables.Visits[i].Site = strings.Repeat("Hügel€", 40)
	}
	var b bytes.Buffer
	if err := WriteCalendar(&b, p); err != nil {
		t.Fatal(err)
	}
	text := b.String()
	if !strings.HasSuffix(text, "END:VCALENDAR\r\n") || strings.Count(text, "\n") != strings.Count(text, "\r\n") {
		t.Error("lines don't end with CRLF")
	}
	for _, line := range strings.Split(text, "\r\n") {
		if len(line) > 75 || !utf8.ValidString(line) {
			t.Errorf("%d octets: %q", len(line), line)
		}
	}
	if whole := strings.ReplaceAll(text, "\r\n ", ""); !strings.Contains(whole, "LOCATION:"+p.Tables.Visits[0].Site+"\r\n") {
		t.Error("unfolding doesn't give the name back")
	}
}

// TestSlugsDiffer: names that differ give UIDs that differ.
func TestSlugsDiffer(t *testing.T) {
	seen := map[string]string{}
	for _, name := range []string{"C1", "C 1", "C-1", "C+1", "C+2b.1", "c1", "Ç1", "C_1", "C.1"} {
		s := slug(name)
		if other, ok := seen[s]; ok {
			t.Errorf("%q and %q are both %q", name, other, s)
		}
		seen[s] = name
	}
}

func TestCoverageOfAPlan(t *testing.T) {
	p := fixture(t)
	m := Coverage(p)
	// A1 has a tile of 1 deg, the others lie at the same place: S1's view
	// holds a circle of 3 deg, which holds the rest.
	want := 2 * math.Pi * (1 - math.Cos(1.5*math.Pi/180))
	if math.Abs(m.Area()/want-1) > 0.02 {
		t.Errorf("area %g sr, want %g", m.Area(), want)
	}
	if size := footprint.CellSize(m.Order()); size > math.Pi/180/8 {
		t.Errorf("cells of %g deg for a tile of 1 deg", size*180/math.Pi)
	}
	p.Tables.Visits = nil
	if m := Coverage(p); !m.Empty() {
		t.Error("no visit covers the sky")
	}
}

func TestSpecialFloats(t *testing.T) {
	table := Table{Name: "x", Columns: []Column{{Name: "v", Kind: Real}, {Name: "b", Kind: Truth}}, Rows: [][]any{{math.NaN(), true}, {math.Inf(1), false}, {math.Inf(-1), nil}, {nil, nil}}}
	var vot, ecsv bytes.Buffer
	if err := WriteVOTable(&vot, Document{Table: table}); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(vot.String(), "<TR><TD>NaN</TD><TD>true</TD></TR>\n<TR><TD>+Inf</TD><TD>false</TD></TR>\n<TR><TD>-Inf</TD><TD></TD></TR>\n<TR><TD></TD><TD></TD></TR>") {
		t.Errorf("%s", vot.String())
	}
	if err := WriteECSV(&ecsv, table, nil); err != nil {
		t.Fatal(err)
	}
	if !strings.HasSuffix(ecsv.String(), "v,b\nnan,True\ninf,False\n-inf,\n,\n") {
		t.Errorf("%s", ecsv.String())
	}
	if err := WriteECSV(&ecsv, ObsPlan(fixture(t)), nil); err == nil {
		t.Error("circles go into ECSV")
	}
}

func TestEveryColumnIsKnown(t *testing.T) {
	p := fixture(t)
	for _, name := range []string{"visits", "fields", "demands", "nights", "prices"} {
		doc := documents(p)[name]
		for _, c := range doc.Table.Columns {
			if c.UCD == "" || c.About == "" {
				t.Errorf("%s: the column %s has no UCD or description", name, c.Name)
			}
			if strings.HasSuffix(c.Name, "_deg") && c.Unit != "deg" || strings.HasSuffix(c.Name, "_s") && c.Unit != "s" || strings.HasSuffix(c.Name, "_hours") && c.Unit != "h" {
				t.Errorf("%s: the column %s is in %q", name, c.Name, c.Unit)
			}
		}
		if doc.Table.About == "" {
			t.Errorf("%s has no description", name)
		}
	}
	if got := FromRows(tables.Visits, nil); len(got.Columns) != len(tables.Visits.Columns()) {
		t.Errorf("%d columns of %d", len(got.Columns), len(tables.Visits.Columns()))
	}
}
