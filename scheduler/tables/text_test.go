package tables

import (
	"bytes"
	"encoding/csv"
	"math"
	"strconv"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"
)

func TestTextForms(t *testing.T) {
	tests := []struct{ got, want string }{
		{Float(0), "0"}, {Float(1), "1"}, {Float(0.1), "0.1"}, {Float(-12.5), "-12.5"}, {Float(1e-7), "1e-07"}, {Float(123456789), "123456789"},
		{Float(1e21), "1e+21"}, {Float(math.Pi), "3.141592653589793"}, {Float(math.Nextafter(0.3, 1)), "0.30000000000000004"},
		// 1800000000 is 2027-01-15 08:00:00 UTC (GNU date -u -d @1800000000).
		{Instant(1800000000000000), "2027-01-15T08:00:00Z"}, {Instant(1800000000500000), "2027-01-15T08:00:00.5Z"}, {Instant(1800000000000001), "2027-01-15T08:00:00.000001Z"},
		{Instant(-1), "1969-12-31T23:59:59.999999Z"}, {Date(0), "1970-01-01"}, {Date(20878), "2027-03-01"}, {Date(-1), "1969-12-31"},
	}
	for i, tt := range tests {
		if tt.got != tt.want {
			t.Errorf("%d: %s; want %s", i, tt.got, tt.want)
		}
	}
}

func TestTextReadsBackTheSame(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		x := rapid.Float64().Draw(rt, "x")
		if y, err := strconv.ParseFloat(Float(x), 64); err != nil || y != x {
			rt.Errorf("%g written %s reads %g (%v)", x, Float(x), y, err)
		}
		m := rapid.Int64Range(-1e15, 4e15).Draw(rt, "micros")
		if at, err := time.Parse(time.RFC3339Nano, Instant(m)); err != nil || at.UnixMicro() != m {
			rt.Errorf("%d written %s reads %d (%v)", m, Instant(m), at.UnixMicro(), err)
		}
	})
}

func TestCSV(t *testing.T) {
	gap := 1.5
	var b bytes.Buffer
	err := Fields.WriteCSV(&b, []FieldRow{
		{Field: "b, the 2nd", Program: "wide", Weight: 2, RA: 10.5, VisitsWanted: 3, First: 1800000000000000, Last: 1800000000000000, LongestGap: &gap, LimitedBy: LimitCadence},
		{Field: "a", Program: "wide", LimitedBy: LimitNothing},
	})
	want := `field,program,weight,ra_deg,dec_deg,visits_wanted,visits_planned,visits_done,coverage,bonus,usable_hours,first_utc,last_utc,longest_gap_d,limited_by
a,wide,0,0,0,0,0,0,0,0,0,,,,nothing
"b, the 2nd",wide,2,10.5,0,3,0,0,0,0,0,2027-01-15T08:00:00Z,2027-01-15T08:00:00Z,1.5,cadence
`
	if err != nil || b.String() != want {
		t.Errorf("%v\n%s; want\n%s", err, b.String(), want)
	}
	b.Reset()
	if err := Visits.WriteCSV(&b, []VisitRow{{Visit: 1, Night: 20878, Start: 1}}); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(&b).ReadAll()
	if err != nil || len(rows) != 2 || rows[1][1] != "" || rows[1][8] != "2027-03-01" || rows[1][9] != "1970-01-01T00:00:00.000001Z" {
		t.Errorf("%v, %v", rows, err)
	}
	if strings.Join(rows[0], ",") != strings.Join(Visits.Columns(), ",") {
		t.Errorf("header %v; want %v", rows[0], Visits.Columns())
	}
	b.Reset()
	if err := Grid.WriteCSV(&b, []GridRow{{Site: "s", Usable: true}}); err != nil || !strings.Contains(b.String(), "s,,1970-01-01T00:00:00Z,0,0,,0,0,0,,true,\n") {
		t.Errorf("%v %s", err, b.String())
	}
}
