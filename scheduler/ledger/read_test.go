package ledger

import (
	"bytes"
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

const (
	t0400 = 1804564800_000000 // 2027-03-09T04:00:00Z (date -u -d ... +%s)
	t0405 = t0400 + 300_000000
)

func TestReadForms(t *testing.T) {
	shot := Row{Line: 2, What: Done, Field: "A1", Telescope: "C1", Start: t0400, End: t0405, Quality: math.NaN(), Night: noNight}
	with := func(f func(*Row)) Row { r := shot; f(&r); return r }
	lost := Row{Line: 2, What: Lost, Site: "Salt Mesa", Start: t0400, End: t0405, Cause: "weather", Quality: math.NaN(), Night: noNight}
	for _, tt := range []struct {
		msg, telescope, give string
		want                 []Row
		skipped              int
		ignored              []string
	}{
		{"exposures", "", "field,telescope,start_utc,end_utc\nA1,C1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z\n", []Row{shot}, 0, nil},
		{"byte-order mark, CRLF, capitals, spaces, no last line end", "", "\ufeffField, Telescope,Start_UTC,end_utc\r\nA1 , C1,2027-03-09T04:00:00Z, 2027-03-09T04:05:00.0Z", []Row{shot}, 0, nil},
		{"exposure_s instead of an end", "", "field,telescope,start_utc,exposure_s\nA1,C1,2027-03-09T04:00:00Z,300\n", []Row{with(func(r *Row) { r.Exposure = 300 })}, 0, nil},
		{"the rest of an exposure", "", "field,telescope,start_utc,end_utc,quality,set,visit,night,program,demand,filter,site,note\nA1,C1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.25,3,17,2027-03-08,wide,r,r,Cinder Ridge,\"clouds, thin\"\n",
			[]Row{with(func(r *Row) {
				r.Quality, r.Set, r.Visit, r.Program, r.Demand, r.Filter, r.Site, r.Note = 0.25, 3, 17, "wide", "r", "r", "Cinder Ridge", "clouds, thin"
				r.Night = 20885 // 1970-01-01 and so many days: 2027-03-08
			})}, 0, nil},
		{"a sheet, one line of it done", "C1", "kind,start_utc,end_utc,field,latest_by,sidereal_time\nreserved,2027-03-09T03:00:00Z,2027-03-09T03:15:00Z,,,\nDone,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,A1,next,08:00:00\nplanned,2027-03-09T04:10:00Z,2027-03-09T04:15:00Z,A2,,08:10:00\n",
			[]Row{with(func(r *Row) { r.Line = 3 })}, 2, nil},
		{"lost time", "", "site,start_utc,end_utc,cause\nSalt Mesa,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,Weather\n", []Row{lost}, 0, nil},
		{"both", "", "kind,site,telescope,field,start_utc,end_utc,cause,seeing\nDONE,,C1,A1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,,1.2\nlost,Salt Mesa,,,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,weather,\n\n,,,,,,,\n",
			[]Row{shot, func() Row { r := lost; r.Line = 3; return r }()}, 0, []string{"seeing"}},
		{"nothing but a head", "", "field,telescope,start_utc,end_utc\n", nil, 0, nil},
	} {
		b, faults := Read(strings.NewReader(tt.give), "n.csv", tt.telescope)
		if faults != nil {
			t.Errorf("%s: %v", tt.msg, faults)
			continue
		}
		if d := cmp.Diff(tt.want, b.Rows, cmpopts.EquateNaNs()); d != "" || b.Skipped != tt.skipped || fmt.Sprint(b.Ignored) != fmt.Sprint(tt.ignored) {
			t.Errorf("%s: skipped %d, ignored %v (-want +got)\n%s", tt.msg, b.Skipped, b.Ignored, d)
		}
	}
}

func TestReadFaults(t *testing.T) {
	const good = ",C1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z"
	for _, tt := range []struct{ msg, give, want string }{
		{"empty", "", "n.csv:1: there is no head line; want a head line with the names of columns, such as field,telescope,filter,start_utc,end_utc"},
		{"UTF-16", "\xff\xfef\x00", "n.csv:1: the file is UTF-16; save it as CSV in UTF-8"},
		{"semicolons", "field;telescope\n", "n.csv:1: the columns stand apart by other signs than commas; want commas between"},
		{"a slip in a column's name", "field,telescope,start_utc,end_utc,qualty\n", `n.csv:1: there is no column "qualty"; did you mean quality?`},
		{"a column twice", "field,telescope,start_utc,end_utc,Field\n", `n.csv:1: the column "field" is there twice; want it once`},
		{"what rows?", "telescope,start_utc\n", "n.csv:1: it can't be told what the rows are: there is no column kind, field or cause; want such as field,telescope,filter,start_utc,end_utc"},
		{"field and cause", "field,cause,telescope,start_utc,end_utc\n", "n.csv:1: there are both a column field, of exposures, and a column cause, of lost time; want a column kind with done or lost in each row"},
		{"no telescope", "field,start_utc,end_utc\n", "n.csv:1: there is no column telescope; want it, or the option --telescope for all rows"},
		{"no end", "field,telescope,start_utc\n", "n.csv:1: there is no column end_utc or exposure_s; want when the exposure ended, or how long it was"},
		{"no UTC", "field,telescope,start_utc,end_utc\nA1,C1,2027-03-09 04:00,2027-03-09T04:05:00+01:00\n",
			"n.csv:2: start_utc is \"2027-03-09 04:00\"; want UTC such as 2027-03-09T03:00:00Z, from 1972 to 2099\n" +
				"n.csv:2: end_utc is \"2027-03-09T04:05:00+01:00\"; want UTC such as 2027-03-09T03:00:00Z, from 1972 to 2099"},
		{"year 27", "field,telescope,start_utc,end_utc\nA1,C1,0027-03-09T04:00:00Z,2027-03-09T04:05:00Z\n",
			`n.csv:2: start_utc is "0027-03-09T04:00:00Z"; want UTC such as 2027-03-09T03:00:00Z, from 1972 to 2099`},
		{"backwards", "field,telescope,start_utc,end_utc\nA1,C1,2027-03-09T04:05:00Z,2027-03-09T04:00:00Z\n",
			"n.csv:2: it ends at 2027-03-09T04:00:00Z, and starts at 2027-03-09T04:05:00Z; want end_utc after start_utc"},
		{"too long", "field,telescope,start_utc,end_utc\nA1,C1,2027-03-09T04:05:00Z,2027-03-11T04:05:00Z\n",
			"n.csv:2: it lasts 48.0 h; want an exposure, of a day at most"},
		{"quality over 1, empty cells", "field,telescope,start_utc,end_utc,quality\n" + good + ",1.2\n,,,,1\n",
			"n.csv:2: quality is \"1.2\"; want 0 to 1, or nothing where the telescope gives none\nn.csv:2: field is empty; want the field's name\n" +
				"n.csv:3: telescope is empty; want its name, or the option --telescope for all rows\nn.csv:3: start_utc is empty; want an instant such as 2027-03-09T03:00:00Z\n" +
				"n.csv:3: field is empty; want the field's name\nn.csv:3: it can't be told when the exposure ended; want an instant such as 2027-03-09T03:00:00Z in end_utc, or seconds in exposure_s"},
		{"cells", "field,telescope,start_utc,end_utc\nA1" + good + ",9\n\"A1" + good + "\n",
			"n.csv:2: the row has 5 cells; want 4, as many as there are columns\nn.csv:3: the row is no CSV: extraneous or missing \" in quoted-field; want cells with commas between, quoted whole or not at all"},
		{"no text", "field,telescope,start_utc,end_utc\nA\xff" + good + "\nA\x00" + good + "\n",
			"n.csv:2: cell 1 has bytes that are no text; want text in UTF-8\nn.csv:3: cell 1 has bytes that are no text; want text in UTF-8"},
		{"ids", "field,telescope,start_utc,end_utc,set,visit,night\nA1" + good + ",0,two,8 March\n",
			"n.csv:2: night is \"8 March\"; want the date of its evening, such as 2027-03-08\nn.csv:2: set is \"0\"; want the plan's whole number, from 1, or nothing\nn.csv:2: visit is \"two\"; want the plan's whole number, from 1, or nothing"},
		{"kind", "kind,field,telescope,start_utc,end_utc\nDne,A1" + good + "\n,A1" + good + "\n", "n.csv:2: kind is \"Dne\"; want done or lost\nn.csv:3: kind is \"\"; want done or lost"},
		{"lost", "site,start_utc,end_utc,cause,night\nSalt Mesa,2027-03-09T04:00:00Z,,clouds,\n,,,other,2027-03-08\n",
			"n.csv:2: cause is \"clouds\"; want weather, technical, people, other\nn.csv:2: it can't be told when the time was lost; want start_utc and end_utc, or neither and a night\n" +
				"n.csv:3: neither site nor telescope is given; want a site, or one telescope"},
	} {
		b, faults := Read(strings.NewReader(tt.give), "n.csv", "")
		var told []string
		for _, f := range faults {
			told = append(told, f.String())
		}
		head := len(faults) > 0 && faults[0].Line == 1
		if d := cmp.Diff(tt.want, strings.Join(told, "\n")); d != "" || (b == nil) != head {
			t.Errorf("%s (-want +got):\n%s", tt.msg, d)
		}
	}
}

func TestReadCountsEndlessFaults(t *testing.T) {
	_, faults := Read(strings.NewReader("field,telescope,start_utc,end_utc\n"+strings.Repeat("A1,C1,now,then\n", 900)), "n.csv", "")
	if len(faults) != MaxFaults+1 || faults[MaxFaults].String() != "n.csv:501: there are 800 more faults; mend those above first" {
		t.Errorf("%d faults, the last: %v", len(faults), faults[len(faults)-1])
	}
}

// FuzzRead: whatever the bytes, it's rows or faults with lines, and rows are
// such that the ledger can hold them.
func FuzzRead(f *testing.F) {
	f.Add([]byte("\ufefffield,telescope,start_utc,end_utc,quality\r\nA1,C1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.5\r\n"), "")
	f.Add([]byte("kind,site,telescope,field,start_utc,end_utc,cause,night,note\nlost,Salt Mesa,,,,,weather,2027-03-08,\"a\"\"b\"\nplanned,,C1,,2027-03-09T04:00:00Z,,,,\n"), "")
	f.Add([]byte("kind,start_utc,exposure_s,field,set,visit\ndone,2027-03-09T04:00:00Z,1e3,A1,1,2\nreserved,,,,,\n"), "C1")
	f.Fuzz(func(t *testing.T, text []byte, telescope string) {
		b, faults := Read(bytes.NewReader(text), "n.csv", telescope)
		if b == nil && len(faults) == 0 {
			t.Fatal("neither rows nor faults")
		}
		for i, x := range faults {
			if x.Line < 1 || x.What == "" || x.Want == "" || i > 0 && x.Line < faults[i-1].Line {
				t.Fatalf("fault %d: %+v", i, x)
			}
		}
		if len(faults) > 0 {
			return
		}
		for _, r := range b.Rows {
			timed := r.Start != 0 || r.What.ofTime() && r.Night != noNight
			ended := r.End > r.Start || r.Start == 0
			quality := math.IsNaN(r.Quality) || r.Quality >= 0 && r.Quality <= 1
			if r.Line < 2 || !timed || !ended || !quality || r.Set < 0 || r.Visit < 0 || r.Telescope == "" && r.Site == "" {
				t.Fatalf("row %+v", r)
			}
		}
	})
}
